"""Derived quantities and heights, from a small survey of two patches."""

from __future__ import annotations

import numpy as np
import pytest
from small_survey import CONTACT, KIT, SIZE, lines, row, small

from surveykit.evidence.derived import derived
from surveykit.evidence.estimates import estimate_all
from surveykit.evidence.geometry import geometry
from surveykit.evidence.surfaces import groups
from surveykit.physics.energy import solar_reflectance_index
from surveykit.physics.footprint import disc_share, self_shade
from surveykit.statistics.draws import Draws, summarise

N = 760
DRAWS = Draws(1, 4000)


def survey(root, **more):
    sheet, logs = [], {"pair": lines("pair", n=N), "thermal": lines("thermal", n=N),
                       "weather": lines("weather", n=14, step_s=60)}
    for number, minute in enumerate((0, 3, 6, 9)):
        times = {"start": f"12:0{minute}:10", "stop": f"12:{minute + 2:02d}:30",
                 "patch": f"C{number % 2 + 1}"}
        sheet.append(row(quantity="albedo", **(SIZE | {"height_cm": "50"} | times)))
        sheet.append(row(quantity="temperature", mode="stand-off",
                         **(SIZE | {"height_cm": "50"} | times)))
    made = small(root, sheet, logs, **more)
    day = made.day()
    found = estimate_all(day, made.passes)
    return day, found, groups(day.name, found, DRAWS, coverage=0.95)


def rows(root, **more):
    day, _, found = survey(root, **more)
    return derived(day, found, DRAWS, 0.95).set_index(["product", "form"])


def test_nothing_asked_nothing_derived(tmp_path):
    assert rows(tmp_path).empty


def test_sri_by_both_ways(tmp_path):
    day, _, found = survey(tmp_path, derived=["sri"])
    albedo = next(g.value for g in found if g.quantity == "albedo")
    made = derived(day, found, DRAWS, 0.95).set_index(["form"])
    want = solar_reflectance_index(albedo, 0.95, 12.0)
    assert made.value["balance, medium wind"] == pytest.approx(want.balance, abs=1e-6)
    assert made.value["equation, medium wind"] == pytest.approx(want.regression, abs=1e-6)
    # 1.3 per .01 of albedo and .43 per .01 of emissivity (method's slopes, computed)
    u_albedo = summarise(next(g for g in found if g.quantity == "albedo").result, 0.95).u
    assert made.u["balance, medium wind"] == pytest.approx(
        np.hypot(127 * u_albedo, 43 * 0.01), rel=0.1)
    assert "SRI-like" in made.note["balance, medium wind"]


def test_longwave_and_net_radiation_follow_from_the_surface(tmp_path):
    made = rows(tmp_path, derived=["longwave_up", "net_radiation", "surface_minus_air"])
    up = made.loc["longwave_up", "stand-off"]
    above = made.loc["surface_minus_air", "stand-off"]
    surface = above.value + 303.15
    down = 0.807 * 5.670374419e-8 * 303.15**4  # table of the sky model at 30 degC, 30 %
    assert up.value == pytest.approx(0.95 * 5.670374419e-8 * surface**4 + 0.05 * down, rel=2e-3)
    net = made.loc["net_radiation", "stand-off"]
    assert net.value == pytest.approx(0.8 * 900 + down - up.value, abs=4)
    assert net.u > 25  # the modelled sky's 30 W m-2 dominates
    assert "modelled" in net.note


def test_daily_albedo_lies_above_noon(tmp_path):
    day, _, found = survey(tmp_path, derived=["daily_albedo"])
    noon = next(g.value for g in found if g.quantity == "albedo")
    (made,) = derived(day, found, DRAWS, 0.95).to_dict("records")
    assert 1.02 < made["value"] / noon < 1.05  # d .1 in June: 1.036 at 40 N (computed)


def test_what_is_missing_is_named(tmp_path):
    made = rows(tmp_path, derived=["sri"], surfaces={"court": {
        "label": "Court", "emissivity": {"value": 0.95, "u": 0.01, "source": "invented"},
        "around": {"albedo": 0.2, "u": 0.03}}})
    assert made.status.tolist() == ["not evaluated"]
    assert made.note.tolist() == ["surfaces.court.emissivity_broadband is missing"]


@pytest.mark.parametrize(("limit", "word"), [(48.0, "exceeds"), (80.0, "stays below")])
def test_a_caution_holds_the_upper_bound_against_the_users_limit(tmp_path, limit, word):
    made = rows(tmp_path, caution={"temperature_degC": limit, "source": "rule, invented"})
    one = made.loc["caution", "stand-off"]
    assert word in one.note
    assert one.upper > one.value
    assert "safe " not in one.note
    assert "compliant" not in one.note


def test_heights_used_and_best(tmp_path):
    """The best height of a head of 1.2 cm over 4 m is where shade and contamination weigh least."""
    day, found, _ = survey(tmp_path)
    table = geometry(day, found)
    one = table[table["pass"] == "C1-albedo-1"].set_index("role")
    assert one.height_m["used"] == 0.5
    assert one.effect.min() == one.effect["best"]
    assert one.loc["used", "shade"] == pytest.approx(
        float(self_shade(0.012, 0.5, found[0].zenith_deg, 0.85)), rel=1e-6)
    assert "E1918-like" in one.note["used"]
    assert disc_share(2.0, 0.5) == pytest.approx(0.941, abs=5e-4)
    assert KIT["pair"]["head_radius_cm"] == 1.2
    assert CONTACT["mode"] == "contact"
