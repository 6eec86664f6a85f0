"""Variograms and the extension variance of a mapped pass."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import dblquad
from scipy.spatial.distance import cdist

from surveykit.statistics.spatial import (
    Fit,
    Variogram,
    fit_exponential,
    patch_mean_u,
    variogram,
)

MODEL = Fit(0.25, 4.0, 2.0, "")


def lanes(spacing: float) -> tuple[np.ndarray, np.ndarray]:
    x, y = np.meshgrid(np.arange(spacing / 2, 20, spacing), np.arange(0.25, 20, 0.5))
    return x.ravel(), y.ravel()


@pytest.mark.parametrize(("spacing", "u"), [(1, 0.029), (2, 0.058), (4, 0.137), (5, 0.181),
                                            (10, 0.391)])
def test_extension_error_by_lane_spacing(spacing, u):
    """20 x 20 m, C = 4 exp(-d / 2 m), nugget .25, a record each .5 m of lane (computed twice)."""
    x, y = lanes(spacing)
    assert patch_mean_u(x, y, MODEL, width_m=20.0, length_m=20.0) == pytest.approx(u, abs=5e-4)


def test_means_over_a_patch_against_quadrature():
    """Independent: dblquad of the covariance over an uneven patch; one record, at its edge."""
    fit = Fit(0.0, 1.0, 0.7, "")

    def mean(function, *ends):
        return dblquad(function, *ends)[0]

    x, y, width, length = 0.0, 0.4, 3.0, 1.5
    across = mean(lambda v, u: np.exp(-np.hypot(u - x, v - y) / 0.7), 0, width, 0, length) / 4.5
    within = mean(lambda v, u: 4 * (width - u) * (length - v) * np.exp(-np.hypot(u, v) / 0.7),
                  0, width, 0, length) / 4.5**2
    assert patch_mean_u([x], [y], fit, width_m=width, length_m=length) == pytest.approx(
        np.sqrt(1 - 2 * across + within), rel=1e-5)


def test_the_error_of_this_patch_is_not_that_of_the_process():
    """The same records: independent .103, mean of the process .444 (computed), patch .058."""
    x, y = lanes(2)
    among = MODEL.covariance(cdist(np.c_[x, y], np.c_[x, y])).mean()
    assert np.sqrt(4.25 / x.size) == pytest.approx(0.103, abs=5e-4)
    assert np.sqrt(among + 0.25 / x.size) == pytest.approx(0.444, abs=5e-4)
    assert patch_mean_u(x, y, MODEL, width_m=20.0, length_m=20.0) < 0.06


def test_extension_error_against_simulated_patches():
    """Gaussian fields on a 6 x 6 m patch by Cholesky: the scatter of records' less patch mean."""
    rng = np.random.default_rng(8)
    grid = np.stack(np.meshgrid(np.arange(0.1, 6, 0.2), np.arange(0.1, 6, 0.2)), -1).reshape(-1, 2)
    records = np.flatnonzero(np.isclose(grid[:, 0] % 2, 0.9))
    root = np.linalg.cholesky(np.exp(-cdist(grid, grid) / 1.0) + 1e-9 * np.eye(len(grid)))
    fields = root @ rng.standard_normal((len(grid), 3000))
    apart = fields[records].mean(axis=0) - fields.mean(axis=0)
    ours = patch_mean_u(*grid[records].T, Fit(0.0, 1.0, 1.0, ""), width_m=6.0, length_m=6.0)
    assert ours == pytest.approx(apart.std(), rel=0.08)


def test_fit_finds_the_model_of_a_simulated_field():
    rng = np.random.default_rng(9)
    place = rng.uniform(0, 40, (900, 2))
    root = np.linalg.cholesky(4 * np.exp(-cdist(place, place) / 2.0) + 0.25 * np.eye(900))
    values = 300 + root @ rng.standard_normal(900)
    made = variogram(*place.T, values, np.arange(0, 12.5, 0.5), detrend=False)
    fit = fit_exponential(made, patch_m=40.0, min_pairs=30)
    assert fit.refusal == ""
    assert fit.scale_m == pytest.approx(2.0, rel=0.4)
    assert fit.nugget + fit.sill == pytest.approx(4.25, rel=0.25)
    assert np.nanmedian(made.robust / made.matheron) == pytest.approx(1.0, abs=0.15)


def test_robust_estimate_resists_a_few_wild_readings():
    rng = np.random.default_rng(10)
    x = np.arange(400.0)
    values = rng.standard_normal(400)
    values[::40] += 20
    made = variogram(x, np.zeros(400), values, [0.5, 1.5, 2.5, 3.5], detrend=False)
    assert (made.robust < 0.25 * made.matheron).all()


def test_a_plane_is_taken_off():
    x, y = lanes(2)
    made = variogram(x, y, 0.1 * x - 0.2 * y, [0.1, 3.0, 6.0], detrend=True)
    assert made.matheron == pytest.approx([0, 0], abs=1e-12)


def test_a_range_beyond_half_the_patch_is_refused():
    h = np.arange(1.0, 9.0)
    made = Variogram(h, np.full(8, 100.0), 1 - np.exp(-h / 3), np.ones(8))
    fit = fit_exponential(made, patch_m=10.0, min_pairs=30)
    assert fit.scale_m == pytest.approx(3.0, rel=1e-3)
    assert fit.refusal == "the range of 9.0 m exceeds half the patch, 5.0 m"
    assert "lags" in fit_exponential(made, patch_m=10.0, min_pairs=1000).refusal


def test_refusals():
    with pytest.raises(ValueError, match="one shape"):
        variogram([0.0], [0.0, 1.0], [1.0, 2.0], [0, 1], detrend=False)
    with pytest.raises(ValueError, match="NaN"):
        variogram([0.0, 1.0], [0.0, 1.0], [1.0, np.nan], [0, 1], detrend=False)
