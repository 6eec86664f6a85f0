"""Lines through covers, edges, lags: against methods worked with other means, and simulations.

Numbers of u at 0, 4 and 8 h and the shares of false accepts: computed, from the project's methods.
Simulations run at modest counts; SURVEYKIT_FULL=all runs them in full. Seeds are fixed.
"""

from __future__ import annotations

import os

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose
from scipy.signal import lfilter
from scipy.stats import theilslopes

from surveykit.statistics.alignment import (
    change_point,
    edge_u_s,
    find_covers,
    fit_line,
    robust_line,
)
from surveykit.statistics.correlation import correlate

FULL = os.environ.get("SURVEYKIT_FULL") == "all"
RULE = {"min_peak": 0.3, "max_second": 0.5, "max_halves_s": 1.0}
HOUR_S = 3600.0


# ---- the line

def test_u_of_events_at_both_ends_of_a_day():
    # computed: 5 Hz, two edges 10 s apart at 0 and 8 h: .058, .041, .058 s; drift 2.8 ppm
    time_s = np.array([0, 10, 8 * HOUR_S, 8 * HOUR_S + 10])
    line = fit_line(time_s, np.zeros(4), np.full(4, edge_u_s(0.2, 0.2)), max_slope=2e-4)
    assert_allclose(line.u(np.array([0, 4, 8]) * HOUR_S), [0.058, 0.041, 0.058], atol=6e-4)
    assert_allclose(1e6 * np.sqrt(line.var_slope), 2.8, atol=0.05)


def test_three_events_in_two_minutes_cannot_be_extrapolated():
    # computed: events at 0, 1, 2 min: 677 ppm, 19 s at 8 h
    time_s = np.array([0, 10, 60, 70, 120, 130.0])
    line = fit_line(time_s, np.zeros(6), np.full(6, edge_u_s(0.2, 0.2)), max_slope=1.0)
    assert_allclose(1e6 * np.sqrt(line.var_slope), 677, rtol=0.02)
    assert_allclose(line.u(8 * HOUR_S), 19, atol=0.5)
    held = fit_line(time_s, np.zeros(6), np.full(6, edge_u_s(0.2, 0.2)), max_slope=2e-4)
    assert held.slope == 0
    assert_allclose(1e6 * np.sqrt(held.var_slope), 200 / np.sqrt(3))  # rectangular


def test_the_line_is_that_of_weighted_least_squares():
    # numpy.polyfit with weights 1/u: an independent solver
    rng = np.random.default_rng(5)
    time_s, u_s = np.sort(rng.uniform(0, 8 * HOUR_S, 9)), rng.uniform(0.05, 0.5, 9)
    offset_s = 3 + 4e-5 * time_s + u_s * rng.standard_normal(9)
    line = fit_line(time_s, offset_s, u_s, max_slope=2e-4)
    (slope, constant), cov = np.polyfit(time_s, offset_s, 1, w=1 / u_s, cov="unscaled")
    assert_allclose([line.slope, line.at(0.0)], [slope, constant], rtol=1e-9)
    assert_allclose(line.u(0.0), np.sqrt(cov[1, 1]), rtol=1e-9)


def test_the_robust_slope_is_that_of_an_independent_library():
    """scipy.stats.theilslopes, not imported by the package itself because that takes so long."""
    rng = np.random.default_rng(3)
    for n in (2, 3, 7, 40):
        time_s = np.sort(rng.uniform(0, 4e4, n))
        offset_s = 3.0 + 2e-5 * time_s + rng.standard_t(2, n)
        line = robust_line(time_s, offset_s, None)
        assert_allclose((line[-1] - line[0]) / (time_s[-1] - time_s[0]),
                        theilslopes(offset_s, time_s).slope, rtol=1e-9)


def test_the_robust_line_ignores_one_bad_event():
    time_s = np.linspace(0, 8 * HOUR_S, 7)
    offset_s = 2 + 3e-5 * time_s
    spoiled = offset_s.copy()
    spoiled[3] += 40
    assert_allclose(robust_line(time_s, spoiled, None), offset_s, atol=1e-9)


@given(st.floats(-1e4, 1e4), st.floats(-1.9e-4, 1.9e-4), st.floats(0, 1e5))
def test_events_on_a_line_are_recovered(offset, slope, begin):
    time_s = begin + np.array([0, 10, 14400, 14410, 28800, 28810.0])
    line = fit_line(time_s, offset + slope * time_s, np.full(6, 0.08), max_slope=2e-4)
    assert_allclose(line.at(time_s), offset + slope * time_s, atol=1e-6)


@pytest.mark.parametrize(("rate_hz", "u_s"), [(1, 0.41), (5, 0.082), (10, 0.041)])
def test_u_of_an_edge(rate_hz, u_s):  # computed: step sqrt(1/12) sqrt(2)
    assert_allclose(edge_u_s(1 / rate_hz, 1 / rate_hz), u_s, rtol=0.01)


# ---- covers

def light(time_s, covers, *, seed=0, level=800.0, noise=8.0):
    values = np.full(time_s.size, level)
    for start, stop in covers:
        values[(time_s >= start) & (time_s < stop)] = 0.0
    return values + noise * np.random.default_rng(seed).standard_normal(time_s.size)


def test_a_cover_is_found_between_longer_and_shorter_ones():
    time_s = np.arange(0, 300, 0.2)
    values = light(time_s, [(20.05, 90), (150.03, 160.11), (220, 222)])
    (cover,) = find_covers(time_s, values, 10.0, dark=True, min_contrast=5)
    assert cover.start_s == pytest.approx(150.03, abs=0.2)
    assert cover.stop_s == pytest.approx(160.11, abs=0.2)
    assert cover.start_step_s == pytest.approx(0.2)


def test_a_board_before_an_infrared_head_may_be_warmer_or_colder():
    time_s = np.arange(0, 120, 0.5)
    for sign in (-1, 1):
        values = 310 + sign * light(time_s, [(50, 61)], level=20, noise=0.2)
        (cover,) = find_covers(time_s, values, 10.0, dark=False, min_contrast=5)
        assert cover.start_s == pytest.approx(49.75, abs=0.3)
    values = 310 + light(time_s, [(50, 61)], level=-20, noise=0.2)  # brighter under the cover
    assert find_covers(time_s, values, 10.0, dark=True, min_contrast=5) == []


def test_no_cover_no_find_and_a_gap_hides_an_edge():
    time_s = np.arange(0, 120, 0.5)
    assert find_covers(time_s, light(time_s, []), 10.0, dark=True, min_contrast=5) == []
    values = light(time_s, [(50, 61)])
    away = (time_s < 48) | (time_s > 52)
    assert find_covers(time_s[away], values[away], 10.0, dark=True, min_contrast=5) == []
    assert find_covers(time_s[:5], values[:5], 10.0, dark=True, min_contrast=5) == []


def test_offsets_from_covers_are_covered_as_their_u_says():
    # start, middle and end of 8 h at 5 Hz: coverage 95 +- 3 %
    rng = np.random.default_rng(3)
    deviations = []
    for _ in range(5000 if FULL else 400):
        offset, drift = rng.uniform(-30, 30), rng.uniform(-1e-4, 1e-4)
        edges = {False: [], True: []}
        for middle in (100.0, 4 * HOUR_S, 8 * HOUR_S - 100):
            start = middle + rng.uniform(0, 5)
            stop = start + rng.uniform(8, 13)
            for slow in (False, True):  # the second logger writes (true - offset) / (1 + drift)
                origin = (start - offset) / (1 + drift) if slow else start
                logged = np.arange(-60, 60, 0.2) + origin + rng.uniform(0, 0.2)
                true = logged * (1 + drift) + offset if slow else logged
                values = np.where((true >= start) & (true < stop), 0.0, 800.0)
                found = find_covers(logged, values + 5 * rng.standard_normal(logged.size), 10.0,
                                    dark=True, min_contrast=5)[0]
                edges[slow] += [found.start_s, found.stop_s]
        logged, true = np.array(edges[True]), np.array(edges[False])
        line = fit_line(logged, true - logged, np.full(6, edge_u_s(0.2, 0.2)), max_slope=2e-4)
        at = (np.array([0, 4, 8]) * HOUR_S - offset) / (1 + drift)
        deviations.append((line.at(at) - (offset + drift * at)) / line.u(at))
    covered = np.abs(deviations) < 1.96
    assert 0.92 < covered.mean() < 0.98
    assert (np.abs(covered.mean(axis=0) - 0.95) < 0.03).all()


# ---- correlation

def clouds(rng, n):
    return lfilter([1.0], [1.0, -0.98], rng.standard_normal(n + 400))


def pair(rng, n, ratio, lag, *, alike):
    """Return two loggers' light; the second's times lack `lag` s; ratio of innovations to noise."""
    one = clouds(rng, n)
    two = one if alike else clouds(rng, n)
    return (one[200:200 + n] + rng.standard_normal(n) / ratio,
            two[200 + lag:200 + lag + n] + rng.standard_normal(n) / ratio)


def test_false_accepts_among_accepted():
    # AR(.98) clouds, innovations over noise .1 to 3, n 120 to 1800, half of them unalignable
    rng, accepted, wrong = np.random.default_rng(7), 0, 0
    for _ in range(40_000 if FULL else 1500):
        n, ratio = int(rng.integers(120, 1801)), 10 ** rng.uniform(-1, np.log10(3))
        lag, alike = int(rng.integers(-100, 101)), bool(rng.random() < 0.5)
        one, two = pair(rng, n, ratio, lag, alike=alike)
        time_s = np.arange(n, dtype=float)
        found = correlate(time_s, one, time_s, two, search_s=120, step_s=1.0)
        if not found.refusal(**RULE):
            accepted += 1
            wrong += not alike or abs(found.lag_s - lag) > 1.5
    assert accepted > (3000 if FULL else 100)
    assert wrong <= 0.005 * accepted


@pytest.mark.parametrize(("ratio", "low", "high"), [(1.0, 0.97, 1.0), (0.3, 0.0, 0.25)])
def test_share_of_pairs_whose_peak_is_right(ratio, low, high):
    # computed: n 600: noise as large as the clouds' innovations: all, peak .32; thrice: hardly any
    rng, right, peaks = np.random.default_rng(11), [], []
    for _ in range(60):
        one, two = pair(rng, 600, ratio, 37, alike=True)
        time_s = np.arange(600.0)
        found = correlate(time_s, one, time_s, two, search_s=120, step_s=1.0)
        right.append(abs(found.lag_s - 37) < 1.5)
        peaks.append(found.peak)
    assert low <= np.mean(right) <= high
    assert np.median(peaks) == pytest.approx(0.32 if ratio == 1 else 0.13, abs=0.03)


def test_sign_and_start_of_a_lag():
    rng = np.random.default_rng(1)
    one, two = pair(rng, 900, 3.0, 37, alike=True)
    time_s = np.arange(900.0)
    # what the second logger reads at its 0 s the first read at its 37 s: 37 s are to be added
    found = correlate(time_s, one, time_s, two, search_s=120, step_s=1.0)
    assert found.lag_s == pytest.approx(37, abs=0.3)
    far = correlate(time_s + 5000, one, time_s, two, search_s=120, step_s=1.0, centre_s=5000.0)
    assert far.lag_s == pytest.approx(5037, abs=0.3)
    assert far.lags_s[np.argmax(far.r)] == pytest.approx(5037)


def test_caps_and_gaps_do_not_align_two_clear_days():
    rng, time_s = np.random.default_rng(2), np.arange(0, 3000.0)
    one, two = (800 + 5 * rng.standard_normal(3000) for _ in range(2))
    one[1000:1080], two[1200:1280] = 0, 0  # capped at different times
    assert correlate(time_s, one, time_s, two, search_s=600, step_s=1.0).refusal(**RULE)
    keep = (time_s < 500) | (time_s > 900)
    assert correlate(time_s[keep], one[keep], time_s, two, search_s=600,
                     step_s=1.0).refusal(**RULE)
    flat = correlate(time_s, np.ones(3000), time_s, two, search_s=60, step_s=1.0)
    assert "do not overlap, or do not change" in flat.refusal(**RULE)


def test_halves_that_disagree_are_refused():
    rng = np.random.default_rng(4)
    one, two = pair(rng, 1800, 3.0, 0, alike=True)
    time_s = np.arange(1800.0)
    late = np.where(time_s < 900, time_s, time_s + 4)  # set 4 s on, midway
    found = correlate(time_s, one, late, two, search_s=60, step_s=1.0)
    assert found.refusal(min_peak=0.1, max_second=0.999, max_halves_s=1.0).startswith(
        "the two halves of the records differ by 4.0 s")


# ---- change of level

def test_change_of_level():
    rng = np.random.default_rng(6)
    values = np.concatenate([rng.normal(300, 0.5, 40), rng.normal(312, 0.5, 60)])
    assert change_point(values, min_side=5, min_contrast=5.0) == 40
    assert change_point(rng.normal(300, 0.5, 100), min_side=5, min_contrast=5.0) is None
    assert change_point(values[:8], min_side=5, min_contrast=5.0) is None
    assert change_point(np.full(50, 3.0), min_side=5, min_contrast=5.0) is None
