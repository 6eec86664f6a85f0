"""A whole measured day by the physics alone: albedo against the sun's height, ground against air.

Data: SURFRAD network (NOAA), station Alamosa CO, 1 January 2016, one-minute means
(tests/data/valley-winter-day/SOURCE.txt). Reference numbers: plain sums over the published minutes,
apart from this package; temperatures with emissivity .97 and the sky's term.
"""

from __future__ import annotations

import csv

import numpy as np
import pytest
from checks import DATA

from surveykit.physics.shortwave import ratio_of_sums
from surveykit.physics.sun import sun_track
from surveykit.physics.thermal import longwave_temperature_k

NS = 1_000_000_000


@pytest.fixture(scope="module")
def day():
    path = DATA / "valley-winter-day" / "valley_winter_day_1min.csv"
    with path.open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    held = {name: np.array([float(row[name] or "nan") for row in rows])
            for name in rows[0] if name != "time_utc"}
    held["time_ns"] = np.array([row["time_utc"].rstrip("Z") for row in rows],
                               dtype="datetime64[ns]").astype(np.int64)
    return held


@pytest.fixture(scope="module")
def midday(day):
    noon = np.datetime64("2016-01-01T19:07", "ns").astype(np.int64)
    return np.abs(day["time_ns"] - noon) <= 3600 * NS


def test_the_midday_by_sums_and_record_by_record(day, midday):
    """121 minutes: .17573 by sums, .17575 the mean of ratios with sd .0017."""
    assert midday.sum() == 121
    up, down = day["uw_solar"][midday], day["ghi"][midday]
    assert down.mean() == pytest.approx(569.3, abs=0.05)
    assert up.mean() == pytest.approx(100.04, abs=0.005)
    assert ratio_of_sums(up, down) == pytest.approx(0.17573, abs=5e-6)
    assert (up / down).mean() == pytest.approx(0.17575, abs=5e-6)
    assert (up / down).std(ddof=1) == pytest.approx(0.0017, abs=5e-5)


@pytest.mark.parametrize(("emissivity", "celsius"), [(0.97, 3.82), (1.0, 2.88)])
def test_the_grounds_temperature_at_midday(day, midday, emissivity, celsius):
    found = longwave_temperature_k(day["uw_ir"][midday], day["dw_ir"][midday], emissivity)
    assert found.mean() - 273.15 == pytest.approx(celsius, abs=0.005)
    assert day["temp_air"][midday].mean() == pytest.approx(-6.38, abs=0.005)


@pytest.mark.parametrize(("zenith", "morning", "afternoon"), [
    (62, 0.1786, 0.1777), (70, 0.2002, 0.1870), (80, 0.2378, 0.2121)])
def test_albedo_against_the_suns_height(day, zenith, morning, afternoon):
    """Ratio of sums within half a degree; the two halves of the day are not alike."""
    near = np.abs(day["solar_zenith"] - zenith) <= 0.5
    before = day["time_ns"] < np.datetime64("2016-01-01T19:07", "ns").astype(np.int64)
    after = ~before | (day["time_ns"] < np.datetime64("2016-01-01T02:00", "ns").astype(np.int64))
    halves = [ratio_of_sums(day["uw_solar"][near & half], day["ghi"][near & half])
              for half in (before & ~after, after)]
    assert halves == pytest.approx([morning, afternoon], abs=5e-5)


def test_the_night_is_no_warmer_than_its_air_by_much(day):
    """Sun more than 5 degrees below the horizon, 816 minutes: +.40 K, sd .81."""
    night = day["solar_zenith"] > 95
    assert night.sum() == 816
    ground = longwave_temperature_k(day["uw_ir"][night], day["dw_ir"][night], 0.97)
    above = ground - 273.15 - day["temp_air"][night]
    assert above.mean() == pytest.approx(0.40, abs=0.005)
    assert above.std(ddof=1) == pytest.approx(0.81, abs=0.005)


def test_the_sun_of_the_station_all_day(day):
    """Apparent zenith as filed, minute by minute up to 80 degrees (beyond, the refraction taken for
    the air's pressure shows); labels stand 30 s late."""
    track = sun_track(day["time_ns"] - 30 * NS, 37.70, -105.92, 2317.0)
    up = day["solar_zenith"] < 80
    assert up.sum() > 400
    assert np.abs(track.zenith_deg - day["solar_zenith"])[up].max() < 0.05


def test_sums_in_the_dark_are_a_believable_albedo(day):
    """Around 05:00 UTC +- 60 min: -.64 over -2.05 W m-2, .313; refused as a ratio."""
    there = np.abs(day["time_ns"] - np.datetime64("2016-01-01T05:00", "ns").astype(np.int64)) <= (
        3600 * NS)
    up, down = day["uw_solar"][there], day["ghi"][there]
    assert up.sum() / down.sum() == pytest.approx(0.313, abs=5e-4)
    assert np.isnan(ratio_of_sums(up, down))
