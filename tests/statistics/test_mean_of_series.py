"""The mean of a correlated series."""

from __future__ import annotations

import numpy as np
import pytest
from checks import check, names
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays
from scipy.signal import lfilter
from statsmodels.tsa.stattools import acf

from surveykit.statistics import series

finite = st.floats(-1e3, 1e3)


def ar1(phi: float, n: int, seed: int) -> np.ndarray:
    """Return a first-order autoregressive series of unit variance, begun in its steady state."""
    noise = np.random.default_rng(seed).standard_normal(n) * np.sqrt(1 - phi**2)
    noise[0] /= np.sqrt(1 - phi**2)
    return lfilter([1.0], [1.0, -phi], noise)


@pytest.mark.parametrize("n", [2, 3, 10, 1001])
def test_autocorrelation_agrees_with_statsmodels(n):
    # independent library: statsmodels acf, direct sums (fft=False)
    x = ar1(0.8, n, seed=n) + 300
    assert series.autocorrelation(x) == pytest.approx(acf(x, nlags=n - 1, fft=False), abs=1e-12)


def test_autocorrelation_worked_by_hand():
    # 1 2 3 4: deviations -1.5 -.5 .5 1.5; sums of products 5, 1.25, -1.5, -2.25
    assert series.autocorrelation([1, 2, 3, 4]) == pytest.approx([1, 0.25, -0.3, -0.45])


@pytest.mark.parametrize("name", names("ar1_"))
def test_integrated_time_of_a_first_order_process(name):
    # closed form (1 + phi) / (1 - phi), and the exact variance of a mean of n over that of
    # independent records, whose lags weigh 1 - k/n; both computed, check_values
    given_, expected, tol, _ = check(name)
    phi, n = given_["phi"], given_["n"]
    lags = np.arange(4000)
    assert series.integrated_time(phi**lags) == pytest.approx(expected["iat"], abs=tol)
    assert series.integrated_time(phi**lags) == pytest.approx((1 + phi) / (1 - phi))
    lags = np.arange(n)
    assert series.integrated_time((1 - lags / n) * phi**lags) == pytest.approx(
        expected["var_mean_over_iid_exact_n"], abs=tol)


@pytest.mark.parametrize(("n", "phi", "expected"),
                         [(600, 0.95, 15.4), (600, 0.99, 3.0), (3000, 0.998, 3.0)])
def test_effective_numbers_of_the_closed_form(n, phi, expected):
    # n (1 - phi) / (1 + phi), computed, to the printed digit
    assert n / series.integrated_time(phi ** np.arange(20000)) == pytest.approx(expected, abs=0.05)


@pytest.mark.parametrize("phi", [0.3, 0.7, 0.9])
def test_effective_size_of_a_long_record_meets_the_closed_form(phi):
    # closed form; 2e5 records know the integrated time to some 3 %
    n = 200_000
    expected = n * (1 - phi) / (1 + phi)
    assert series.effective_sample_size(ar1(phi, n, seed=7)) == pytest.approx(expected, rel=0.08)


def test_stated_u_is_the_scatter_of_means():
    # property: over 400 records of one process the mean's scatter is what each record claims
    made = [series.mean_of_series(ar1(0.9, 4000, seed=s), "K", "") for s in range(400)]
    scatter = np.std([estimate.value for estimate in made])
    claimed = np.sqrt(np.mean([estimate.u**2 for estimate in made]))
    assert claimed == pytest.approx(scatter, rel=0.12)  # 400 means know their scatter to 3.5 %


def test_independent_records_count_as_published_gum_4_4_3():
    # JCGM 100 4.4.3 (from memory): mean 100.145, s 1.489, u 0.333 degC. The table is printed in
    # rising order; a fixed shuffle without positive neighbours stands for independent readings.
    given_, expected, tol, _ = check("gum_4_4_3")
    high_low = np.array(given_["data"])[[0, 19, 1, 18, 2, 17, 3, 16, 4, 15,
                                         5, 14, 6, 13, 7, 12, 8, 11, 9, 10]]
    estimate = series.mean_of_series(high_low, "degC", "thermometer")
    assert estimate.n_eff == estimate.n == 20
    assert estimate.value == pytest.approx(expected["mean"], abs=tol)
    assert estimate.u * np.sqrt(20) == pytest.approx(expected["s"], abs=tol)
    assert estimate.u == pytest.approx(expected["u_mean"], abs=tol)


def test_equal_records_count_as_one():
    estimate = series.mean_of_series(np.full(50, 21.3), "degC", "")
    assert (estimate.n_eff, estimate.n) == (1, 50)
    assert estimate.value == pytest.approx(21.3)
    assert estimate.u == pytest.approx(0, abs=1e-12)
    assert np.isnan(series.autocorrelation(np.full(5, 21.3))).all()


@given(arrays(np.float64, st.integers(2, 60), elements=finite), st.floats(-500, 500))
def test_size_stays_within_bounds_and_an_offset_moves_the_mean_alone(x, offset):
    here = series.mean_of_series(x, "K", "")
    assert 1 <= here.n_eff <= here.n
    there = series.mean_of_series(x + offset, "K", "")
    assert there.value == pytest.approx(here.value + offset, abs=1e-9)


@pytest.mark.parametrize("bad", [[], [[1.0, 2.0]], [1.0, np.nan], [np.inf, 1.0]])
def test_series_refuses_what_is_no_series(bad):
    for function in (series.autocorrelation, series.effective_sample_size):
        with pytest.raises(ValueError, match="series"):
            function(bad)


def test_one_record_has_no_spread():
    with pytest.raises(ValueError, match="at least two records, got one"):
        series.mean_of_series([1.0], "K", "")
