"""Each check as a function of arrays, against hand arithmetic, brute force or other libraries."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from surveykit.physics.sun import Sun
from surveykit.quality.checks import (
    end_of_range,
    noise_sd,
    out_of_range,
    saturated,
    spikes,
    steps,
    too_much_light,
)
from surveykit.quality.consistency import (
    far_from_air,
    improbable_albedo,
    longwave_off,
    more_up_than_down,
)
from surveykit.quality.series import inside, medians, slopes
from surveykit.quality.sky import Watch, changed, unsteady

NS = 1_000_000_000
RNG = np.random.default_rng(11)


@pytest.mark.parametrize(("zenith", "possible", "rare", "up_possible", "up_rare"), [
    (0, 2141.5, 1683.2, 1683.2, 1411.0), (30, 1818, 1424, 1424, 1195),
    (60, 989, 761, 761, 642), (75, 503, 373, 373, 319)])
def test_shortwave_limits(zenith, possible, rare, up_possible, up_rare):
    """Long & Shi 2008 with S = 1361 (upward: from memory): the limit passes, half a watt more not.
    """
    sun = Sun(*(np.full(2, v) for v in (zenith, 180.0, np.cos(np.radians(zenith)), 1361.0, 900.0)))
    for limit, quantity, seldom in (
            (possible, "shortwave_down", False), (up_possible, "shortwave_up", False),
            (rare, "shortwave_down", True), (up_rare, "shortwave_up", True)):
        around = np.array([limit - 1, limit + 1])
        assert too_much_light(around, quantity, sun, rare=seldom).tolist() == [False, True]
    assert not too_much_light(np.array([9e3, 9e3]), "red_down", sun, rare=False).any()


def test_a_missing_reading_is_in_no_range_and_at_no_end():
    values = np.array([np.nan, -5.0, 0.5, 50.0, 99.5, 105.0])
    assert out_of_range(values, 0, 100).tolist() == [False, True, False, False, False, True]
    both = end_of_range(values, 0, 100, 0.01, lower=True)
    assert both.tolist() == [False, True, True, False, True, True]
    assert end_of_range(values, 0, 100, 0.01, lower=False).tolist() == [False] * 4 + [True, True]


def test_readings_piled_up_at_the_largest_value_are_saturated():
    values = RNG.normal(20, 1, 500)
    assert not saturated(values, 5, lower=True).any()
    top = np.minimum(values, 21.0)
    assert np.array_equal(saturated(top, 5, lower=True), values >= 21.0)
    low = np.maximum(values, 18.5)
    assert np.array_equal(saturated(low, 5, lower=True), values <= 18.5)
    assert not saturated(low, 5, lower=False).any()


@pytest.mark.parametrize("unit", [0.01, 0.1, 1.0])
def test_the_flat_top_of_a_clear_day_is_not_saturated(unit):
    """Whole steps of a parabola: the top step holds at most 2.4 times the next (sqrt 2 + 1)."""
    t = np.linspace(-1, 1, 5001)
    for offset in (0.0, 0.3, 0.7):
        assert not saturated(np.round((100 - 40 * t**2 + offset) / unit), 5, lower=False).any()


def test_whole_numbers_that_stay_long_are_not_saturated():
    """A station in whole W m-2 whose largest value lasts half an hour and falls away at once."""
    values = np.concatenate([np.repeat(np.arange(280.0, 312), 20), np.full(30, 312.0),
                             np.repeat(np.arange(311.0, 290, -1), 25)])
    assert not saturated(values, 5, lower=True).any()


def test_noise_is_found_under_trend_and_steps():
    """Normal noise of .1 on a ramp with ten steps: known by construction."""
    values = 0.05 * np.arange(5000) + 3.0 * (np.arange(5000) // 500) + RNG.normal(0, 0.1, 5000)
    assert noise_sd(values, float("nan")) == pytest.approx(0.1, rel=0.05)
    assert noise_sd(np.ones(50), 0.1) == pytest.approx(0.1 / np.sqrt(12))


def test_spikes_are_what_a_plain_loop_finds():
    values = np.cumsum(RNG.normal(0, 0.2, 400)) + RNG.normal(0, 0.1, 400)
    values[[50, 51, 200, 399]] += [3, 3, -2.5, 4]
    got = spikes(values, window=11, mad=5, noise=3, resolution=0.01, floor=np.zeros(400))
    padded = np.pad(values, 5, mode="symmetric")
    off = np.array([abs(values[i] - np.median(padded[i:i + 11])) for i in range(400)])
    second = np.diff(values, 2)
    sd = max(1.4826 * np.median(np.abs(second)) / np.sqrt(6), 1.4826 * np.median(off))
    want = []
    for i in range(400):
        near = values[max(0, min(i - 5, 389)):][:11]
        spread = 1.4826 * np.median(np.abs(near - np.median(near)))
        want.append(off[i] > 3 * sd and off[i] > 5 * spread)
    assert np.array_equal(got, want)
    assert got[[50, 51, 200, 399]].all()
    assert got.sum() <= 8


def test_neither_a_step_nor_a_ramp_nor_a_small_deviation_is_a_spike():
    values = np.where(np.arange(200) < 100, 20.0, 40.0) + RNG.normal(0, 0.05, 200)
    values[150:] += np.arange(50)
    limits = {"window": 11, "mad": 5, "noise": 6, "resolution": 0.01}
    assert not spikes(values, floor=np.zeros(200), **limits).any()
    values[60] += 1.0
    assert np.flatnonzero(spikes(values, floor=np.zeros(200), **limits)).tolist() == [60]
    assert not spikes(values, floor=np.full(200, 1.5), **limits).any()


def test_steps_are_per_second_whatever_the_rate():
    """6 K from one second to the next; the same over 3 s, and noise at ten records a second."""
    time = np.arange(100) * NS // 10
    values = np.where(np.arange(100) < 50, 300.0, 306.0)
    hit = steps(time, values, 5.0, 0.1)
    assert np.flatnonzero(hit).tolist() == list(range(50, 60))
    slow = 300 + np.clip((np.arange(100) - 40) / 30, 0, 1) * 6
    assert not steps(time, slow + RNG.normal(0, 0.3, 100), 5.0, 0.1).any()
    assert steps(np.array([0, 4]) * NS, np.array([300.0, 319.0]), 5.0, 4.0).tolist() == [False] * 2
    assert steps(np.array([0, 4]) * NS, np.array([300.0, 321.0]), 5.0, 4.0).tolist() == [False,
                                                                                          True]


def test_up_and_down():
    up, down = np.array([60.0, 40, 180, np.nan]), np.array([50.0, 30, 900, 900])
    assert more_up_than_down(up, down, 50).tolist() == [True, False, False, False]
    up = np.array([5.0, 20, 180, 880, 5])
    limits = {"least_down": 50, "zero": 9}
    odd = improbable_albedo(up, np.array([900.0, 900, 900, 900, 40]), 0.02, 0.95, **limits)
    assert odd.tolist() == [True, False, False, True, False]


def test_longwave_against_air():
    """Hand arithmetic: sigma 300**4 = 459.3 W m-2; .4 of it 183.7, and 25 more 484.3."""
    down = np.array([183.0, 184.5, 483.5, 485.0, 485.0])
    air = np.array([300.0, 300, 300, 300, np.nan])
    assert longwave_off(down, air, 0.4, 25).tolist() == [True, False, False, True, False]


def test_hot_paving_is_not_far_from_the_air():
    """Measured asphalt of 74 degC at 49 degC air (Chestovich 2022) is 25 K above; 46 K is too far.
    """
    reading, air = np.array([74.0, 95.5, 33.5]), np.array([49.0, 49.0, 49.0])
    assert far_from_air(reading, air, 15, 45).tolist() == [False, True, True]
    assert not far_from_air(reading, np.full(3, np.nan), 15, 45).any()


def test_slopes_are_those_of_polyfit():
    time = np.cumsum(RNG.integers(5, 15, 200)) * NS // 10
    values = 300 + np.cumsum(RNG.normal(0, 0.1, 200))
    got = slopes(time, values, 30)
    for i in (0, 7, 100, 199):
        near = np.abs(time - time[i]) <= 15 * NS
        want = np.polyfit((time[near] - time[i]) / NS, values[near], 1)[0]
        assert got[i] == pytest.approx(want, rel=1e-9)
    assert np.isnan(slopes(np.array([0, 100, 200]) * NS, np.ones(3), 30)).all()


def test_medians_are_those_of_pandas():
    time = np.sort(RNG.integers(0, 300 * NS, 900))
    values = RNG.normal(0, 1, 900)
    end, got = medians(time, values, 10, 20)
    want = pd.Series(values).groupby(time // (10 * NS)).agg(["median", "size"])
    want = want[want["size"] >= 20]
    assert np.array_equal(end, (want.index.to_numpy() + 1) * 10 * NS)
    assert np.allclose(got, want["median"])


def test_inside_takes_starts_and_leaves_stops():
    time = np.array([0, 1, 2, 3, 4, 5, np.iinfo(np.int64).min])
    assert np.flatnonzero(inside(time, [(1, 3), (5, 9)])).tolist() == [1, 2, 5]


def watched(light):
    return Watch(np.arange(1, len(light) + 1) * 10 * NS, np.asarray(light, float), 10.0)


def test_a_change_is_remembered_for_two_minutes():
    """A cloud of 20 s that takes 200 W m-2; 140 W m-2 is not enough (150: engineering default)."""
    light = [900.0] * 30
    light[10:12] = [700, 700]
    hit = np.flatnonzero(changed(watched(light), within_s=120, max_w_m2=150))
    assert hit.tolist() == list(range(10, 24))  # as long as the cloud is within the last 120 s
    light[10:12] = [760, 760]
    assert not changed(watched(light), within_s=120, max_w_m2=150).any()


def test_the_sky_is_steady_within_two_per_cent_and_two_watts_a_second():
    limits = {"window_s": 60, "max_sd": 0.02, "max_rate_w_m2_s": 2.0}
    slow = 900 + 0.2 * 10 * np.arange(30)
    assert not unsteady(watched(slow), **limits).any()
    assert unsteady(watched(5000 + 2.1 * 10 * np.arange(30)), **limits).all()
    assert not unsteady(watched(5000 + 1.9 * 10 * np.arange(30)), **limits).any()
    for part, want in ((0.019, False), (0.024, True)):  # relative deviation, to and fro
        light = 900 * (1 + part * np.tile([1, -1], 15))
        assert unsteady(watched(light), **limits)[5:25].all() == want


def test_a_record_belongs_to_the_stretch_that_holds_it():
    sky = watched([900] * 3)
    found = np.array([False, True, False])
    time = np.array([9, 10, 19, 20, 35, 60]) * NS
    assert sky.at(found, time).tolist() == [False, True, True, False, False, False]
