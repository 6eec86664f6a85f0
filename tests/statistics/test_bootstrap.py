"""Block length and standard error of the stationary bootstrap against arch and closed forms."""

from __future__ import annotations

import warnings

import numpy as np
import pytest
from arch.bootstrap import StationaryBootstrap, optimal_block_length

from surveykit.statistics.bootstrap import autocovariance, block_length, stationary_u
from surveykit.statistics.series import mean_of_series


def ar1(phi: float, n: int, seed: int) -> np.ndarray:
    rng = np.random.default_rng(seed)
    x = np.empty(n)
    x[0] = rng.standard_normal() / np.sqrt(1 - phi**2)
    for i, e in enumerate(rng.standard_normal(n - 1)):
        x[i + 1] = phi * x[i] + e
    return x


@pytest.mark.parametrize(("n", "phi"), [
    (50, 0.5), (600, 0.9), (3600, 0.95), (3600, 0.3), (500, 0.0), (20000, 0.98), (400, -0.6)])
def test_automatic_block_length_is_that_of_the_authors_rule(n, phi):
    """Politis & White 2004 with the correction of Patton et al. 2009, as arch codes them."""
    x = ar1(phi, n, seed=n)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        theirs = float(optimal_block_length(x)["stationary"].iloc[0])
    assert block_length(autocovariance(x)) == pytest.approx(max(theirs, 1.0), rel=1e-9)


@pytest.mark.parametrize(("n", "block"), [(200, 5.0), (500, 20.0)])
def test_closed_form_is_what_endless_resampling_gives(n, block):
    """Against 4,000 resamples by arch; their own error is 1.1 %."""
    x = ar1(0.7, n, seed=3)
    means = StationaryBootstrap(block, x, seed=np.random.default_rng(4)).apply(np.mean, 4000)
    assert stationary_u(x, block) == pytest.approx(float(means.std()), rel=0.05)


def test_blocks_of_one_record_are_the_plain_bootstrap():
    """The sd over n, by sqrt(n): arithmetic."""
    x = ar1(0.5, 300, seed=1)
    assert stationary_u(x, 1.0) == pytest.approx(x.std() / np.sqrt(300), rel=1e-12)


def test_close_to_the_effective_sample_size_on_a_long_record():
    """Two estimates of one thing, AR(1) with phi .9: sd of the mean 10 / sqrt(n) (computed)."""
    x = ar1(0.9, 40000, seed=5)
    assert stationary_u(x) == pytest.approx(10 / 200, rel=0.15)
    assert mean_of_series(x, "1", "").u == pytest.approx(10 / 200, rel=0.15)


@pytest.mark.parametrize(("phi", "n", "share"), [(0.95, 200, 0.57), (0.95, 600, 0.73),
                                                  (0.9, 1200, 0.87)])
def test_a_pass_takes_the_larger_of_two_errors(phi, n, share):
    """AR(1), its mean's error in closed form: the bootstrap alone falls short (computed, 300 runs);
    the effective sample size does not fall as far.
    """
    k = np.arange(1, n)
    true = np.sqrt((1 + 2 * ((1 - k / n) * phi**k).sum()) / n / (1 - phi**2))
    runs = [ar1(phi, n, seed=s) for s in range(200)]
    alone, both = (np.sqrt(np.mean(np.square(u))) / true for u in (
        [stationary_u(x) for x in runs], [mean_of_series(x, "K", "").u for x in runs]))
    assert alone == pytest.approx(share, abs=0.06)
    assert alone + 0.1 < both < 1.1
    assert all(mean_of_series(x, "K", "").u >= stationary_u(x) for x in runs[:20])


def test_equal_records_and_refusals():
    assert stationary_u([2.0] * 20) == 0.0
    with pytest.raises(ValueError, match="n >= 2"):
        autocovariance([1.0])
    with pytest.raises(ValueError, match="NaN"):
        autocovariance([1.0, np.nan])
    with pytest.raises(ValueError, match="1 or more"):
        stationary_u([1.0, 2.0], 0.5)
