"""Numbers of clocks, sampling, pooling and verdicts to their printed digits, and published cases.

"Computed" values are those of two independent scripts that share no code with this package.
"""

from __future__ import annotations

import numpy as np
import pytest
from checks import check
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats
from scipy.spatial.distance import cdist
from statsmodels.stats.weightstats import ttost_paired

from surveykit.statistics.alignment import Line, edge_u_s, fit_line
from surveykit.statistics.course import hat_weights
from surveykit.statistics.draws import Draws, Sampling, combine, observed, summarise
from surveykit.statistics.pooling import Common, pool
from surveykit.statistics.series import integrated_time
from surveykit.statistics.shape import huber_location
from surveykit.statistics.spatial import Fit
from surveykit.statistics.trends import mann_kendall, ordinary, theil_sen
from surveykit.statistics.verdicts import could_have_missed, equivalence_p, verdict

HOUR_S = 3600.0
DRAWS = Draws(20251, 200_000)


# ---- clocks

@pytest.mark.parametrize(("ppm", "seconds", "digit"), [
    (20, 0.58, 0.005), (50, 1.4, 0.05), (100, 2.9, 0.05)])
def test_what_a_crystal_loses_in_a_day(ppm, seconds, digit):
    """8 h (computed)."""
    assert Line(0.0, 0.0, ppm * 1e-6, 0.0, 0.0).at(8 * HOUR_S) == pytest.approx(seconds, abs=digit)


@pytest.mark.parametrize(("rate_hz", "u_s", "digit"), [
    (1, 0.41, 0.005), (5, 0.082, 0.0005), (10, 0.041, 0.0005)])
def test_u_of_an_edge_to_the_printed_digits(rate_hz, u_s, digit):
    assert edge_u_s(1 / rate_hz, 1 / rate_hz) == pytest.approx(u_s, abs=digit)  # computed


def test_events_close_together_say_nothing_of_the_evening():
    """Three events at 0, 1 and 2 min, 5 Hz, two edges 10 s apart: 677 ppm, 19 s at 8 h (computed);
    at 0 and 8 h instead: 2.8 ppm and .041 s in the middle.
    """
    u_s = edge_u_s(0.2, 0.2)
    near = fit_line(np.array([0, 10, 60, 70, 120, 130.0]), np.zeros(6), np.full(6, u_s),
                    max_slope=1.0)
    assert 1e6 * np.sqrt(near.var_slope) == pytest.approx(677, abs=0.5)
    assert near.u(8 * HOUR_S) == pytest.approx(19, abs=0.5)
    far = fit_line(np.array([0, 10, 8 * HOUR_S, 8 * HOUR_S + 10]), np.zeros(4), np.full(4, u_s),
                   max_slope=2e-4)
    assert 1e6 * np.sqrt(far.var_slope) == pytest.approx(2.8, abs=0.05)
    assert far.u(np.array([0, 4, 8]) * HOUR_S) == pytest.approx([0.058, 0.041, 0.058], abs=5e-4)


# ---- sampling: 20 x 20 m, C = 4 exp(-d / 2 m), nugget .25, a record each .5 m of lane

MODEL = Fit(0.25, 4.0, 2.0, "")


def lanes(spacing):
    x, y = np.meshgrid(np.arange(spacing / 2, 20, spacing), np.arange(0.25, 20, 0.5))
    return x.ravel(), y.ravel()


def test_few_of_four_hundred_records_count_for_the_process():
    """Lanes 2 m apart: 22 of 400 records, standard error .444 of the process mean and .103 as if
    independent (computed); nugget and process together."""
    x, y = lanes(2)
    among = float(MODEL.covariance(cdist(np.c_[x, y], np.c_[x, y])).mean())
    variance = among + MODEL.nugget / x.size
    assert x.size == 400
    assert np.sqrt(variance) == pytest.approx(0.444, abs=5e-4)
    assert (MODEL.sill + MODEL.nugget) / variance == pytest.approx(22, abs=0.5)
    assert np.sqrt((MODEL.sill + MODEL.nugget) / x.size) == pytest.approx(0.103, abs=5e-4)


def test_effective_numbers_need_long_series():
    """AR(1): 600 records at .95 are 15.4, at .99 3.0, 3,000 at .998 3.0 (computed)."""
    for n, phi, count in ((600, 0.95, 15.4), (600, 0.99, 3.0), (3000, 0.998, 3.0)):
        assert n / integrated_time(phi ** np.arange(40_000)) == pytest.approx(count, abs=0.05)


# ---- location: population values of normal laws of sd 1

def population(*parts):
    """Quantiles of normal laws (mean, thousands of readings) of sd 1."""
    return np.concatenate([mean + stats.norm.ppf((np.arange(1000 * k) + 0.5) / (1000 * k))
                           for mean, k in parts])


def test_a_twentieth_of_wild_readings():
    """5 % at +20 K: mean +1.00, Huber +.09 (computed; median +.07 and 10 % trim +.09 likewise)."""
    x = population((0, 190), (20, 10))
    assert x.mean() == pytest.approx(1.00, abs=0.005)
    assert huber_location(x) == pytest.approx(0.09, abs=0.005)
    assert np.median(x) == pytest.approx(0.07, abs=0.005)
    assert stats.trim_mean(x, 0.1) == pytest.approx(0.09, abs=0.005)


def test_a_third_of_dry_ground_is_no_contamination():
    """Two thirds at 35, a third at 55: the mean is 41.7, the median 35.7, trimmed 40.9 (computed);
    Huber's location errs by some 5 K as well: a diagnostic, never the result."""
    x = population((35, 20), (55, 10))
    assert x.mean() == pytest.approx(41.7, abs=0.05)
    assert np.median(x) == pytest.approx(35.7, abs=0.05)
    assert stats.trim_mean(x, 0.1) == pytest.approx(40.9, abs=0.05)
    assert huber_location(x) < x.mean() - 5


# ---- pooling

def test_what_a_fixed_effect_would_claim():
    """41.2, 42.6, 40.1, 43.0 with .3 .4 .3 .5: Q 38.23, 41.315 +- .344 (computed): without scatter
    between passes; with it 41.688 +- 2.115.
    """
    y, s = [41.2, 42.6, 40.1, 43.0], [0.3, 0.4, 0.3, 0.5]
    fixed = pool(y, s, Common(tau2=0.0, q=1.0, dof=3))
    assert fixed.value == pytest.approx(41.315, abs=5e-4)
    assert 1.96 * fixed.u == pytest.approx(0.344, abs=5e-4)
    assert (((np.array(y) - fixed.value) / s) ** 2).sum() == pytest.approx(38.23, abs=0.005)


def test_the_published_comparison_without_scatter_between():
    """Kacker 2004, table 1, as printed in the test-suite of statsmodels: fixed mean and standard
    error, and Cochran's Q."""
    case = check("kacker2004_pm")
    y, v = np.array(case.input["y"]), np.array(case.input["v"])
    fixed = pool(y, np.sqrt(v), Common(tau2=0.0, q=1.0, dof=8))
    assert fixed.value == pytest.approx(case.expected["mean_fixed"], abs=1e-4)
    assert fixed.u == pytest.approx(case.expected["se_fixed"], abs=1e-5)
    assert ((y - fixed.value) ** 2 / v).sum() == pytest.approx(case.expected["Q"], abs=1e-3)


# ---- shared errors

def test_how_far_two_albedos_under_one_gain_go_together():
    """.30 and .10, gain 3 %, .004 each: correlation .548; a ratio is known to .0422, not .0598
    (computed).
    """
    bright, dark = (observed(a, a * (1 + 0.03 * DRAWS.standard("gain")),
                             (Sampling(f"patch {a}", 0.004, np.inf),), DRAWS) for a in (0.3, 0.1))
    assert np.corrcoef(bright.total, dark.total)[0, 1] == pytest.approx(0.548, abs=0.004)
    ratio = summarise(combine(lambda a, b: a / b, bright, dark), 0.95)
    assert ratio.u / ratio.value == pytest.approx(0.0422, abs=5e-5)
    own = [summarise(one, 0.95) for one in (bright, dark)]
    assert np.hypot(*(s.u / s.value for s in own)) == pytest.approx(0.0598, abs=5e-5)


# ---- course of the day

def test_a_control_that_bends():
    """40, 44.5 and 46 at 0, 60 and 120 min: 42.25 at 30 and 45.25 at 90; a straight fit says 42.0
    and 45.0 (computed)."""
    knots, read = [0.0, 60.0, 120.0], np.array([40.0, 44.5, 46.0])
    assert hat_weights(knots, [30.0, 90.0]) @ read == pytest.approx([42.25, 45.25])
    line = ordinary(knots, read, 0.95)
    straight = read.mean() + line.value * (np.array([30.0, 90.0]) - 60.0)
    assert straight == pytest.approx([42.0, 45.0], abs=0.005)


@pytest.mark.parametrize("drift", [-3.0, 0.7, 3.0])
def test_a_reversed_second_round_takes_a_linear_drift_out(drift):
    """A B C C B A: the means of the three differ by what they differ, whatever the drift."""
    truth, minutes = {"A": 1.0, "B": 2.0, "C": 4.0}, 10.0
    read = {name: [] for name in truth}
    for n, name in enumerate("ABCCBA"):
        read[name].append(truth[name] + drift * n * minutes / 60)
    means = {name: pool(two, [0.1, 0.1]).value for name, two in read.items()}
    assert means["B"] - means["A"] == pytest.approx(1.0)
    assert means["C"] - means["A"] == pytest.approx(3.0)


def test_twenty_minutes_of_drift_are_a_false_difference():
    """3 K/h: 1.0 K (computed), by the weights of the control's visits."""
    read = 3.0 * np.array([0.0, 1.0, 2.0])
    early, late = hat_weights([0.0, 60.0, 120.0], [40.0, 60.0]) @ read
    assert late - early == pytest.approx(1.0)


# ---- equivalence

def test_two_one_sided_tests_worked():
    """d .3, u .35, 6 dof, margin 1: 90 % interval -.38 to .98, p .046 (computed)."""
    assert equivalence_p(0.3, 0.35, 6, 1.0) == pytest.approx(0.046, abs=5e-4)
    ends = 0.3 + 0.35 * stats.t.ppf([0.05, 0.95], 6)
    assert ends == pytest.approx([-0.38, 0.98], abs=0.005)
    just = float(max(abs(ends)))  # the margin at which the interval just fits
    assert equivalence_p(0.3, 0.35, 6, just) == pytest.approx(0.05, abs=1e-9)
    assert verdict(0.3, 0.4, 1.0, p_equivalent=0.046) == "equivalent"
    assert verdict(0.3, 0.4, 1.0, p_equivalent=0.054) == "no difference shown"


@pytest.mark.parametrize(("seed", "margin"), [(1, 0.6), (2, 1.0), (3, 0.3)])
def test_two_one_sided_tests_of_another_library(seed, margin):
    """statsmodels ttost_paired: seven pairs of readings."""
    rng = np.random.default_rng(seed)
    one, other = rng.normal(20.0, 1, 7), rng.normal(20.1, 1, 7)
    theirs = ttost_paired(one, other, -margin, margin)[0]
    apart = one - other
    ours = equivalence_p(float(apart.mean()), float(stats.sem(apart)), 6, margin)
    assert ours == pytest.approx(theirs, rel=1e-9)


@given(st.floats(-5, 5), st.floats(0.01, 3), st.floats(1, 60), st.floats(0.1, 5))
def test_equivalent_means_within_the_90_per_cent_interval(value, u, dof, margin):
    half = stats.t.ppf(0.95, dof) * u
    inside = -margin < value - half and value + half < margin
    p = equivalence_p(value, u, dof, margin)
    assert (p < 0.05) == inside or p == pytest.approx(0.05, abs=1e-6)


def test_equivalence_without_uncertainty():
    assert equivalence_p(0.3, 0.0, 6, 1.0) == 0.0
    assert equivalence_p(1.0, 0.0, 6, 1.0) == 1.0
    assert np.isnan(equivalence_p(0.3, np.nan, 6, 1.0))


def test_what_could_have_been_missed_to_the_printed_digits():
    """u .566 K: 1.6 K (normal), 2.1 K (4 dof) (computed)."""
    assert could_have_missed(0.566, np.inf) == pytest.approx(1.6, abs=0.05)
    assert could_have_missed(0.566, 4) == pytest.approx(2.1, abs=0.05)


# ---- trends

def test_gilberts_example_of_s():
    """Gilbert 1987, p. 211."""
    case = check("gilbert_s4")
    assert mann_kendall(range(4), case.input["x"])[0] == case.expected["S"]


def test_gilberts_example_with_ties():
    """Gilbert 1987, p. 211: variance of S 83.67 for nine values with ties (0 thrice, 23 twice, 24
    thrice); through p of the normal law with the step of one."""
    case = check("gilbert_var")
    s, p = mann_kendall(range(9), case.input["x"])
    z = (abs(s) - 1) / np.sqrt(case.expected["varS"]) if s else 0.0
    assert p == pytest.approx(2 * stats.norm.sf(z), abs=1e-5)


def test_a_falling_series_of_eight():
    """Slope -1.5 by Theil-Sen; S -22 and Z -2.598 (two other libraries agree): 8 values are judged
    by the exact law, which is close to the normal one here."""
    case = check("theil_sen")
    y, t = case.input["y"], np.arange(8.0)
    assert theil_sen(t, y, 0.95).value == pytest.approx(case.expected["slope"], abs=case.tol)
    s, p = mann_kendall(t, y)
    assert s == case.expected["S"]
    assert p == pytest.approx(stats.kendalltau(t, y, method="exact").pvalue)
    z = (abs(s) - 1) / np.sqrt(case.expected["varS"])
    assert z == pytest.approx(-case.expected["Z"], abs=1e-5)
    assert p == pytest.approx(2 * stats.norm.sf(z), abs=0.004)
