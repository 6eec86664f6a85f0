"""Intervals that hold together, places, and the Monte Carlo error of an interval's ends."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from surveykit.statistics.draws import Draws, Result, Sampling, combine, observed, summarise
from surveykit.statistics.simultaneous import rank_probabilities, simultaneous

DRAWS = Draws(20251, 200_000)


def independent(names, value=0.0, dof=1e9, se=1.0):
    flat = np.full(DRAWS.size, value)
    return [observed(value, flat, (Sampling(name, se, dof),), DRAWS) for name in names]


def test_all_pairs_of_three_are_tukeys():
    """Studentised range, three means, endless dof: 3.314 / sqrt 2 = 2.344 (Tukey's table)."""
    a, b, c = independent("abc")
    pairs = [combine(lambda x, y: x - y, *pair) for pair in ((a, b), (a, c), (b, c))]
    ends = simultaneous(pairs, 0.95)
    exact = stats.studentized_range.ppf(0.95, 3, np.inf)  # of differences with u sqrt 2
    assert exact == pytest.approx(3.314, abs=1e-3)
    assert ends[:, 1] == pytest.approx([exact] * 3, rel=0.01)


def test_one_result_keeps_its_own_interval():
    (one,) = independent("a")
    assert simultaneous([one], 0.95)[0] == pytest.approx([-1.96, 1.96], abs=0.01)


def test_results_of_few_degrees_of_freedom_do_not_widen_the_others():
    few, many = independent("a", dof=2)[0], independent("b")[0]
    ends = simultaneous([few, many], 0.95)
    share = 1 - np.sqrt(0.95)
    assert ends[0, 1] == pytest.approx(stats.t.isf(share / 2, 2), rel=0.02)
    assert ends[1, 1] == pytest.approx(stats.norm.isf(share / 2), rel=0.01)


def test_a_result_without_draws_does_not_count():
    (good,) = independent("a")
    bad = Result(0.0, np.full(DRAWS.size, np.nan), np.full(DRAWS.size, np.nan))
    ends = simultaneous([bad, good], 0.95)
    assert np.isnan(ends[0]).all()
    assert ends[1, 1] == pytest.approx(1.96, abs=0.01)
    assert np.isnan(simultaneous([], 0.95)).size == 0


def test_places_of_two_and_of_shared_errors():
    """P(a above b) = Phi(1 / sqrt 2) = .760 for means 1 apart and u 1 each; an error that both
    share changes nothing.
    """
    a, b = independent("a", 1.0)[0], independent("b", 0.0)[0]
    shares = rank_probabilities([a, b])
    assert shares[0, 0] == pytest.approx(stats.norm.cdf(1 / np.sqrt(2)), abs=0.004)
    assert shares.sum(axis=0) == pytest.approx([1, 1])
    both = 100 * DRAWS.standard("calibration")
    moved = [Result(r.value, r.systematic + both, r.total + both, r.sampling) for r in (a, b)]
    assert rank_probabilities(moved) == pytest.approx(shares)


@pytest.mark.parametrize("size", [2_000, 20_000])
def test_error_of_the_ends_against_repeated_draws(size):
    rng = np.random.default_rng(3)
    ends = [np.quantile(rng.standard_normal(size), 0.975) for _ in range(300)]
    made = (Result(0.0, draws, draws) for draws in rng.standard_normal((30, size)))
    stated = np.mean([summarise(one, 0.95).end_error for one in made])
    assert stated == pytest.approx(np.std(ends), rel=0.2)
