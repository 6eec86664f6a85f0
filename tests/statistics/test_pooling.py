"""Passes pooled to a patch."""

from __future__ import annotations

import numpy as np
import pytest
from checks import check
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats
from statsmodels.stats.meta_analysis import combine_effects

from surveykit.statistics import pooling

units = st.lists(st.tuples(st.floats(-50, 50), st.floats(0.01, 5)), min_size=2, max_size=9)


def test_golden_case_to_the_printed_digits():
    # computed by two scripts: tau2 1.62103, mean 41.688, se .6645, t 3.182, half-width 2.115
    y, s = [41.2, 42.6, 40.1, 43.0], [0.3, 0.4, 0.3, 0.5]
    assert pooling.paule_mandel(y, s) == pytest.approx(1.62103, abs=5e-6)
    pooled = pooling.pool(y, s)
    assert pooled.value == pytest.approx(41.688, abs=5e-4)
    assert pooled.u == pytest.approx(0.6645, abs=5e-5)
    assert pooled.tau == pytest.approx(1.273, abs=5e-4)
    assert pooled.dof == 3
    assert stats.t.ppf(0.975, pooled.dof) * pooled.u == pytest.approx(2.115, abs=5e-4)


def test_scatter_within_what_the_passes_explain():
    # computed by two scripts: plain Hartung-Knapp +-.190, modified +-.745; tau2 = 0
    pooled = pooling.pool([10, 10.1, 9.95], [0.3] * 3)
    t = stats.t.ppf(0.975, 2)
    assert pooled.tau == 0
    assert t * pooled.u == pytest.approx(0.745, abs=5e-4)
    assert t * pooled.u * np.sqrt(pooled.q) == pytest.approx(0.190, abs=5e-4)


def test_published_interlaboratory_comparison():
    # Kacker 2004, Metrologia 41, table 1 (tau .8399); mean, se and Hartung-Knapp se as printed in
    # the test-suite of statsmodels (from the R package metafor)
    given_, expected, tol, _ = check("kacker2004_pm")
    y, s = np.array(given_["y"]), np.sqrt(given_["v"])
    pooled = pooling.pool(y, s)
    assert pooled.tau == pytest.approx(expected["tau"], abs=tol)
    assert pooled.value == pytest.approx(expected["mean"], abs=tol)
    assert pooled.u == pytest.approx(expected["hk_se"], abs=tol)
    assert pooled.u == pytest.approx(expected["se"], abs=tol)
    assert pooled.q == pytest.approx(1, abs=1e-9)  # where tau > 0 the scale is 1


@pytest.mark.parametrize("seed", range(8))
def test_agrees_with_statsmodels(seed):
    # independent library: statsmodels combine_effects, iterated (Paule-Mandel) with HKSJ; asked
    # for more than 1e-7 its iteration may end on a rounding error and return tau2 = 0
    random = np.random.default_rng(seed)
    s = random.uniform(0.1, 1.0, 2 + seed)
    y = random.normal(20, 1.5, s.size)
    theirs = combine_effects(y, s**2, method_re="iterated", atol=1e-7)
    ours = pooling.pool(y, s)
    assert ours.tau**2 == pytest.approx(theirs.tau2, rel=1e-5, abs=1e-9)
    assert ours.value == pytest.approx(theirs.mean_effect_re, rel=1e-8)
    assert ours.q == pytest.approx(theirs.scale_hksj_re, rel=1e-5)
    assert ours.u == pytest.approx(
        theirs.sd_eff_w_re * np.sqrt(max(1, theirs.scale_hksj_re)), rel=1e-5)
    assert ours.weights == pytest.approx(theirs.weights_rel_re, rel=1e-5)


def test_equal_passes_reduce_to_students_interval():
    # analytic limit: equal within-pass u and scatter beyond it give u = sd / sqrt(k)
    y = np.array([20.1, 22.4, 19.0, 24.2, 21.3])
    assert pooling.pool(y, np.full(5, 0.2)).u == pytest.approx(stats.sem(y), rel=1e-12)


def test_one_pass_has_no_uncertainty_between_passes():
    pooled = pooling.pool([41.2], [0.3])
    assert (pooled.value, pooled.dof) == (41.2, 0)
    assert np.isnan([pooled.u, pooled.tau, pooled.q]).all()
    assert pooled.weights.tolist() == [1.0]


def test_passes_said_to_be_exact():
    # analytic limits: scatter alone, agreement alone, and one exact pass among others
    assert pooling.pool([1.0, 3.0], [0.0, 0.0]).u == pytest.approx(1.0)
    assert pooling.pool([2.0, 2.0], [0.0, 0.0]).u == 0
    assert pooling.pool([2.0, 2.1, 1.9], [0.0, 0.3, 0.3]).value == pytest.approx(2.0)


@given(units, st.randoms(use_true_random=False), st.floats(-100, 100))
def test_order_does_not_matter_and_an_offset_shifts(passes, random, offset):
    y, s = np.array(passes).T
    order = list(range(y.size))
    random.shuffle(order)
    first, second = pooling.pool(y, s), pooling.pool(y[order] + offset, s[order])
    assert second.value == pytest.approx(first.value + offset, abs=1e-7)
    assert second.u == pytest.approx(first.u, rel=1e-6)
    assert second.weights == pytest.approx(first.weights[order], rel=1e-5, abs=1e-9)


@given(units)
def test_mean_lies_between_and_u_never_undercuts_fixed_effect(passes):
    y, s = np.array(passes).T
    pooled = pooling.pool(y, s)
    assert y.min() - 1e-9 <= pooled.value <= y.max() + 1e-9
    assert pooled.weights.sum() == pytest.approx(1)
    assert pooled.u >= (1 - 1e-9) / np.sqrt((s**-2.0).sum())


@given(units)
def test_tau_solves_its_equation(passes):
    # the definition itself: sum w (y - mu)^2 = k - 1 where tau2 > 0, at most k - 1 where it is 0
    y, s = np.array(passes).T
    weights = 1 / (s**2 + pooling.paule_mandel(y, s))
    q = weights @ (y - np.average(y, weights=weights)) ** 2
    if pooling.paule_mandel(y, s) > 0:
        assert q == pytest.approx(y.size - 1, rel=1e-6)
    else:
        assert q <= y.size - 1 + 1e-9


@pytest.mark.parametrize(("tau", "within_u", "half_width", "expected"), [
    (0.5, 0.3, 1.0, 4), (0.5, 0.3, 0.5, 8), (1.0, 0.3, 1.0, 7), (1.0, 0.3, 0.5, 20),
    (0.01, 0.005, 0.01, 8), (0.02, 0.005, 0.01, 19), (0.0, 0.0, 0.1, 2),
])
def test_passes_needed(tau, within_u, half_width, expected):
    # computed by two scripts (temperature in K, albedo); the last by hand
    assert pooling.passes_needed(tau, within_u, half_width) == expected


@given(st.floats(0.1, 2), st.floats(0, 1), st.floats(0.1, 3))
def test_passes_needed_is_the_least(tau, within_u, half_width):
    def width(k: int) -> float:
        return stats.t.ppf(0.975, k - 1) * np.hypot(tau, within_u) / np.sqrt(k)

    k = pooling.passes_needed(tau, within_u, half_width)
    assert width(k) <= half_width * (1 + 1e-12)
    assert k == 2 or width(k - 1) > half_width * (1 - 1e-12)


def test_refusals():
    for y, s in [([], []), ([1.0, 2.0], [0.1]), ([1.0, np.nan], [0.1, 0.1]),
                 ([1.0, 2.0], [0.1, -0.1]), ([1.0, 2.0], [0.1, np.nan])]:
        with pytest.raises(ValueError, match="pooling needs"):
            pooling.pool(y, s)
    with pytest.raises(ValueError, match="at least two"):
        pooling.paule_mandel([1.0], [0.1])
    with pytest.raises(ValueError, match="half_width > 0"):
        pooling.passes_needed(0.5, 0.3, 0.0)
