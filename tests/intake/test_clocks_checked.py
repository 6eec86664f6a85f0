"""Clocks held against the sun and against each other: an hour, half the world, five minutes.

The winter day is measured (tests/data/valley-winter-day/SOURCE.txt); the clouds are simulated,
for that day is clear.
"""

from __future__ import annotations

import shutil
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from numpy.testing import assert_allclose
from under_sky import START, log, sheet, sky, survey

from surveykit.intake.aligning import align, read_logs
from surveykit.intake.clocks import REFUSED
from surveykit.intake.clocks.checking import sun_shift
from surveykit.intake.params import load
from surveykit.physics.sun import clear_sky_shape

DATA = Path(__file__).parent.parent / "data/valley-winter-day"
SITE = (37.70, -105.92, 2317.0)
GOOD = {"offset_s": 0, "u_s": 0.5}


@pytest.fixture(scope="module")
def winter_day():
    frame = pd.read_csv(DATA / "valley_winter_day_1min.csv")
    time = pd.to_datetime(frame.iloc[:, 0], utc=True).dt.as_unit("ns").astype("int64").to_numpy()
    return time, frame["ghi"].to_numpy(float)


def test_the_sun_agrees_with_the_measured_day(winter_day):
    found = sun_shift(*winter_day, *SITE, small_min=12.5)
    assert abs(found.shift_min) < 10
    assert not (abs(found.shift_min) > 25 and found.telling)


@pytest.mark.parametrize("shift_min", [-60, 60, 30, -30])
def test_half_an_hour_and_an_hour_are_told(winter_day, shift_min):
    time_ns, light = winter_day
    found = sun_shift(time_ns + shift_min * 60 * 10**9, light, *SITE, small_min=12.5)
    assert found.telling
    assert found.shift_min == pytest.approx(shift_min, abs=8)


@pytest.mark.parametrize("hours", [1, 3])
def test_part_of_a_day_is_enough(winter_day, hours):
    # three hours: within 6 min of 60; one hour: within 20 (computed: -9 +- 4 min)
    time_ns, light = winter_day
    middle = np.datetime64("2016-01-01T20:30:00", "ns").astype("int64")
    part = np.abs(time_ns - middle) <= hours * 1800 * 10**9
    found = sun_shift(time_ns[part] + 3600 * 10**9, light[part], *SITE, small_min=12.5)
    assert found.telling
    assert found.shift_min == pytest.approx(60, abs=8 if hours == 3 else 20)


def test_a_stray_minute_of_another_day_does_not_hide_an_hour(winter_day):
    time_ns, light = winter_day
    for far_ns in (-40 * 86400 * 10**9, 40 * 86400 * 10**9):
        late = np.concatenate([time_ns + 3600 * 10**9, [time_ns[0] + far_ns]])
        order = np.argsort(late)
        found = sun_shift(late[order], np.concatenate([light, [500.0]])[order], *SITE,
                          small_min=12.5)
        assert found is not None
        assert found.telling
        assert found.shift_min == pytest.approx(60, abs=8)


def test_too_little_light_says_nothing(winter_day):
    time_ns, light = winter_day
    assert sun_shift(time_ns[:40], light[:40], *SITE, small_min=12.5) is None
    assert sun_shift(time_ns[:0], light[:0], *SITE, small_min=12.5) is None


def valley(tmp_path, **changed):
    """Read the measured day with one thing changed in its files."""
    root = tmp_path / "project"
    shutil.copytree(DATA, root / "tests/data/valley-winter-day")
    for folder in ("params", "notebooks"):
        (root / folder).mkdir()
    folder = root / "tests/data/valley-winter-day"
    log_ = folder / "valley_winter_day_1min.csv"  # offsets taken out: the zone must say it
    log_.write_text(log_.read_text(encoding="utf-8").replace("+00:00", "").replace("Z,", ","),
                    encoding="utf-8")
    for name, (old, new) in changed.items():
        path = folder / f"{name}.yml"
        text = path.read_text(encoding="utf-8")
        assert old in text
        path.write_text(text.replace(old, new), encoding="utf-8")
    parameters = load(folder / "valley-winter-day.yml", root)
    return align(parameters, *read_logs(parameters))


FAULTS = {
    "an hour of zone": {"instruments": ("zone: UTC", "zone: Etc/GMT-1")},
}
FLIPPED = {"valley-winter-day": (
    "longitude: -105.92, elevation_m: 2317, time_zone: America/Denver",
    "longitude: 105.92, elevation_m: 2317, time_zone: UTC")}


@pytest.mark.parametrize("name", FAULTS)
def test_a_blunder_on_the_measured_day_is_refused(tmp_path, name):
    found = valley(tmp_path, **FAULTS[name])
    (one,) = found.clocks
    assert one.status == "refused"
    assert "follows the clear sky" in one.refusal
    assert "site.longitude" in one.refusal
    assert all(this.refusal for this in found.passes)


def test_light_at_night_is_left_to_the_passes(tmp_path):
    """The longitude's sign: each albedo pass says what its pair read (tests/test_valley_...)."""
    found = valley(tmp_path, **FLIPPED)
    assert [one.status for one in found.clocks] == ["ok"]


def test_the_measured_day_is_taken(tmp_path):
    found = valley(tmp_path)
    assert [one.status for one in found.clocks] == ["ok"]
    assert not any(this.refusal for this in found.passes)


def two(late_s=0.0, *, cloudy=True):
    return {"rednir-sky": log("rednir-sky", covers=(), cloudy=cloudy),
            "rednir-ground": log("rednir-ground", covers=(), cloudy=cloudy, offset_s=late_s)}


def ndvi_rows():
    return [one for one in sheet(()) if one.get("quantity") != "albedo"]


def test_five_minutes_under_broken_cloud_are_caught(tmp_path):
    clocks = {"rednir-sky": GOOD, "rednir-ground": GOOD}
    found = survey(tmp_path / "wrong", two(300.0), clocks, rows=ndvi_rows())
    assert [one.status for one in found.clocks] == ["refused", "refused"]  # which one is not known
    assert "under the same light its readings come 300 s" in found.clocks[1].refusal
    assert all(this.refusal for this in found.passes)
    clean = survey(tmp_path / "right", two(), clocks, rows=ndvi_rows())
    assert [one.status for one in clean.clocks] == ["ok", "ok"]


def test_the_clock_nobody_checked_gives_way(tmp_path):
    clocks = {"rednir-sky": GOOD, "rednir-ground": None}
    found = survey(tmp_path, two(60.0), clocks, rows=ndvi_rows())
    assert [one.status for one in found.clocks] == ["ok", "refused"]
    assert "align_with: rednir-sky" in found.clocks[1].refusal
    assert "come 60 s before" in found.clocks[1].refusal  # its times are too early by 60 s


def test_what_was_aligned_with_a_clock_that_the_sun_refuses_is_refused_with_it(tmp_path):
    clocks = {"pair": GOOD, "rednir-ground": {"align_with": "pair"}}
    for shift_s, status in ((0.0, "ok"), (3600.0, "refused")):
        logs = {"pair": log("pair", n=10800, shift_s=shift_s),
                "rednir-ground": log("rednir-ground", n=10800)}
        found = survey(tmp_path / status, logs, clocks, rows=sheet(ndvi=False))
        assert [one.status for one in found.clocks] == [status, status]
    assert "follows the clear sky" in found.clocks[0].refusal
    assert "it is set by that of pair, which is refused itself" in found.clocks[1].refusal
    assert all(log_.marks[REFUSED].all() for log_ in found.records.values())


def test_a_clear_sky_lets_no_clock_be_judged(tmp_path):
    clocks = {"rednir-sky": GOOD, "rednir-ground": GOOD}
    found = survey(tmp_path, two(300.0, cloudy=False), clocks, rows=ndvi_rows())
    assert [one.status for one in found.clocks] == ["ok", "ok"]


def test_clouds_do_not_look_like_a_wrong_hour():
    time_s = np.arange(0, 10800, 60.0)
    for cloudy in (False, True):
        light = sky(time_s, cloudy=cloudy)
        found = sun_shift(START + (time_s * 1e9).astype("int64"), light, 41.3, -7.75, 120.0,
                          small_min=12.5)
        assert found is None or not (found.telling and abs(found.shift_min) > 25)


def test_the_shape_of_a_clear_sky_is_that_of_an_independent_library():
    from pvlib.clearsky import haurwitz

    zenith = np.array([0.0, 30.0, 60.0, 85.0, 89.0, 91.0, 120.0])
    assert_allclose(clear_sky_shape(np.cos(np.radians(zenith))),
                    haurwitz(pd.Series(zenith))["ghi"].to_numpy(), rtol=1e-12, atol=1e-12)
