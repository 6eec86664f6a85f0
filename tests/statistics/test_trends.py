"""Lines through a few dates and Mann-Kendall, against published data and other libraries."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from surveykit.statistics.trends import mann_kendall, ordinary, slope_weights, theil_sen

# GUM H.3, table H.6 (JCGM 100:2008): thermometer readings t [degC] and corrections b [degC].
READ = [21.521, 22.012, 22.512, 23.003, 23.507, 23.999, 24.513, 25.002, 25.503, 26.010, 26.511]
SHIFT = [-0.171, -0.169, -0.166, -0.159, -0.164, -0.165, -0.156, -0.157, -0.159, -0.161, -0.160]


def test_gum_h_3_calibration_line():
    """Slope .002 18 with u .000 67 (JCGM 100:2008, H.3.3)."""
    made = ordinary(READ, SHIFT, 0.95)
    assert made.value == pytest.approx(0.00218, abs=5e-6)
    assert made.u == pytest.approx(0.00067, abs=5e-6)


def test_weighted_line_agrees_with_statsmodels():
    rng = np.random.default_rng(1)
    t, y = np.arange(5.0), rng.standard_normal(5)
    root = rng.standard_normal((5, 5))
    covariance = root @ root.T + np.eye(5)
    theirs = sm.GLS(y, sm.add_constant(t), sigma=covariance).fit()
    assert slope_weights(t, covariance) @ y == pytest.approx(theirs.params[1], rel=1e-9)
    assert slope_weights(t) @ y == pytest.approx(stats.linregress(t, y).slope, rel=1e-9)


def test_what_all_dates_share_does_not_move_the_slope():
    t = np.array([0.0, 1.0, 3.0])
    shared = np.ones((3, 3)) * 4.0 + np.eye(3) * 0.1
    assert slope_weights(t, shared) == pytest.approx(slope_weights(t), rel=1e-9)


@pytest.mark.parametrize(("n", "s", "p"), [(4, 6, 0.083), (5, 10, 0.017), (8, 16, 0.061),
                                           (10, 21, 0.073)])
def test_exact_p_of_mann_kendall(n, s, p):
    """Twice the tails of Gilbert 1987, table A18 (from memory: .042, .0083, .031, .036), and
    scipy's exact Kendall tau.
    """
    left, y, inversions = list(range(n)), [], (n * (n - 1) // 2 - s) // 2
    while left:  # the first value still to come, or one further on that takes more inversions
        k = min(inversions, len(left) - 1)
        y.append(float(left.pop(k)))
        inversions -= k
    got, ours = mann_kendall(np.arange(n), y)
    assert got == s
    assert ours == pytest.approx(p, abs=0.0015)
    assert ours == pytest.approx(stats.kendalltau(np.arange(n), y, method="exact").pvalue)


def test_four_dates_cannot_show_a_trend():
    """The least two-sided p is 2 / 4! = .083."""
    assert mann_kendall([0, 1, 2, 3], [1.0, 2.0, 3.0, 4.0])[1] == pytest.approx(2 / 24)


def test_ties_and_repeated_times():
    """Gilbert's variance with ties: n 5, one pair tied: (5*4*15 - 2*1*9) / 18 = 15.67 (hand)."""
    s, p = mann_kendall(range(5), [1.0, 2.0, 2.0, 3.0, 4.0])
    assert s == 9
    assert p == pytest.approx(2 * stats.norm.sf(8 / np.sqrt(282 / 18)), rel=1e-9)
    # two values of one date are not compared: S is not that of the index
    assert mann_kendall([0, 0, 1, 1], [1.0, 2.0, 3.0, 4.0])[0] == 4


@given(st.lists(st.integers(0, 1000), min_size=3, max_size=9, unique=True))
def test_mann_kendall_turns_with_the_sign(values):
    y = np.array(values, dtype=float)
    up, down = (mann_kendall(np.arange(y.size), side * y) for side in (1, -1))
    assert up[0] == -down[0]
    assert up[1] == pytest.approx(down[1])


def test_median_slope_ignores_one_wild_value():
    made = theil_sen(np.arange(7.0), [0.0, 1.0, 2.0, 30.0, 4.0, 5.0, 6.0], 0.95)
    assert made.value == pytest.approx(1.0, abs=0.25)
    assert made.lower <= made.value <= made.upper


def test_one_time_has_no_slope():
    with pytest.raises(ValueError, match="two different times"):
        slope_weights([1.0, 1.0])
