"""A measured winter day, pass by pass, against plain sums over its published minutes.

Data: SURFRAD network (NOAA), station Alamosa CO, 1 January 2016 (tests/data/valley-winter-day).
"""

from __future__ import annotations

import csv
import shutil
from pathlib import Path

import numpy as np
import pytest
from pass_values import pooled
from small_survey import read

SOURCE = Path(__file__).parents[1] / "data" / "valley-winter-day"
SIGMA = 5.670374419e-8  # W m-2 K-4, CODATA


@pytest.fixture
def valley(tmp_path):
    """Return a function that reads the day with passages of its parameter file replaced."""
    def opened(*changes):
        for folder in ("params", "notebooks"):
            (tmp_path / folder).mkdir(exist_ok=True)
        shutil.copytree(SOURCE, tmp_path / "tests/data/valley-winter-day", dirs_exist_ok=True)
        text = (SOURCE / "valley-winter-day.yml").read_text(encoding="utf-8")
        for old, new in changes:
            assert old in text
            text = text.replace(old, new)
        path = tmp_path / "params" / "valley-winter-day.yml"
        path.write_text(text, encoding="utf-8")
        return read(path)
    return opened


def minutes(first, last):
    """Return columns of the file from minute to minute, both included, as plain lists."""
    with (SOURCE / "valley_winter_day_1min.csv").open(newline="") as file:
        rows = [r for r in csv.DictReader(file) if first <= r["time_utc"][11:16] <= last]
    return {name: [float(r[name]) for r in rows] for name in ("ghi", "uw_solar", "dw_ir", "uw_ir")}


SPANS = (("18:07", "18:36"), ("18:37", "19:06"), ("19:07", "19:36"), ("19:37", "20:07"))


@pytest.mark.parametrize("number", range(4))
def test_each_pass_is_what_plain_sums_give(valley, number):
    held = minutes(*SPANS[number])
    made = valley().by_name()
    albedo = made[f"V1-albedo-{number + 1}"]
    plain = sum(held["uw_solar"]) / sum(held["ghi"])
    assert albedo.steps[0] == ("raw", pytest.approx(plain, abs=1e-9))
    assert albedo.value == pytest.approx(plain, abs=2e-5)  # the mast's head hardly shades its field
    warm = made[f"V1-longwave-{number + 1}"]
    kelvins = [((up - 0.03 * down) / (0.97 * SIGMA)) ** 0.25
               for up, down in zip(held["uw_ir"], held["dw_ir"], strict=True)]
    assert warm.value == pytest.approx(sum(kelvins) / len(kelvins), abs=1e-6)
    assert albedo.n_records == len(kelvins)


def test_the_surface_is_the_published_midday(valley):
    """Albedo .17573 by ratio of sums, 3.82 degC with emissivity .97, over 121 minutes."""
    groups = {g.quantity: g for g in pooled(valley().estimates(), campaign="valley-winter-day")}
    assert groups["albedo"].value == pytest.approx(0.17573, abs=2e-4)
    assert groups["temperature"].value - 273.15 == pytest.approx(3.82, abs=0.02)
    assert sum(p.n_records for p in groups["albedo"].used) == 121


def test_a_flipped_longitude_is_told_with_the_mean_of_its_passes(valley):
    """The pair reads 569.3 W m-2 over the 121 minutes, 559 to 578 in its four passes."""
    survey = valley(("longitude: -105.92", "longitude: 105.92"),
                    ("time_zone: America/Denver", "time_zone: UTC"))
    groups = {g.quantity: g for g in pooled(survey.estimates(), campaign="valley-winter-day")}
    assert groups["albedo"].notes == (
        "computed sun below the horizon while the pair reads 569 W m-2: check longitude, zone or "
        "clock",)
    assert np.isnan(groups["albedo"].value)
    assert groups["temperature"].value - 273.15 == pytest.approx(3.82, abs=0.02)


def test_the_night_gives_no_albedo(valley):
    """Around 05:00 UTC sum(up) / sum(down) is .313, the ratio of two negative offsets."""
    survey = valley(("field_sheet.csv", "field_sheet_night.csv"),
                    ("time_zone: America/Denver", "time_zone: UTC"))
    held = minutes("04:00", "06:00")
    assert sum(held["uw_solar"]) / sum(held["ghi"]) == pytest.approx(0.313, abs=0.0005)
    groups = {g.quantity: g for g in pooled(survey.estimates(), campaign="valley-winter-day")}
    assert groups["albedo"].notes == ("the sun is below the horizon: an albedo read in the dark "
                                      "is the ratio of two offsets",)
    assert np.isnan(groups["albedo"].value)


def test_the_budget_without_darks_names_its_zeros(valley):
    """Shared by every pass of the station: two calibrations, two zeros, and the sky's direction."""
    groups = {g.quantity: g for g in pooled(valley().estimates(), campaign="valley-winter-day")}
    scopes = [row["scope"] for row in groups["albedo"].budget]
    assert {"station-2015:ghi:gain", "station-2015:uw_solar:gain", "station-2015:ghi:offset",
            "station-2015:uw_solar:offset", "station-2015:ghi:gain:direction at 60"} <= set(scopes)
