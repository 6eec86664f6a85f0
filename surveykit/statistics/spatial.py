"""Readings on the ground plan: variogram, its fit, and how well lanes give a patch's mean."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike
from scipy.optimize import least_squares
from scipy.spatial.distance import cdist, pdist

from surveykit.core import FloatArray

GAUSS, WEIGHT = np.polynomial.legendre.leggauss(24)


class Variogram(NamedTuple):
    """Semivariances by lag: mean distance [m], pairs, Matheron's and the robust estimate."""

    distance_m: FloatArray
    pairs: FloatArray
    matheron: FloatArray
    robust: FloatArray


class Fit(NamedTuple):
    """An exponential model: nugget, partial sill (unit squared), scale a [m]; range 3 a.

    `refusal` says why the fit is not to be used, or is empty.
    """

    nugget: float
    sill: float
    scale_m: float
    refusal: str

    def covariance(self, distance_m: ArrayLike) -> FloatArray:
        """Return the covariance without the nugget at distances [m]."""
        return np.asarray(self.sill * np.exp(-np.asarray(distance_m, np.float64) / self.scale_m))


def variogram(x_m: ArrayLike, y_m: ArrayLike, values: ArrayLike, edges_m: ArrayLike,
              *, detrend: bool) -> Variogram:
    """Return the experimental variogram of readings on a plan.

    Parameters
    ----------
    x_m, y_m, values : array_like, shape (n,)
        Positions [m] and readings, none missing; n of some thousands at most (all pairs are
        held: thin longer records first).
    edges_m : array_like, shape (m + 1,)
        Edges of the lag classes [m], ascending.
    detrend : bool
        Whether a plane is taken off first.

    Returns
    -------
    Variogram
        Arrays of shape (m,); NaN where a class holds no pair.

    Raises
    ------
    ValueError
        If the arrays differ in shape or hold a NaN.

    References
    ----------
    Matheron, Economic Geology 58 (1963) 1246-1266; Cressie & Hawkins, Mathematical Geology 12
    (1980) 115-125 (both from memory).

    Examples
    --------
    >>> made = variogram([0, 1, 2], [0, 0, 0], [1.0, 3.0, 2.0], [0.5, 1.5, 2.5], detrend=False)
    >>> made.matheron  # (2^2 + 1^2) / 4 and 1^2 / 2
    array([1.25, 0.5 ])
    """
    place, v = _placed(x_m, y_m, values)
    if detrend:
        plane = np.column_stack([np.ones(v.size), place - place.mean(axis=0)])
        v = v - plane @ np.linalg.lstsq(plane, v, rcond=None)[0]
    apart, size = pdist(place), pdist(v[:, None], "cityblock")
    edges = np.asarray(edges_m, dtype=np.float64)
    lag = np.digitize(apart, edges) - 1
    good = (lag >= 0) & (lag < edges.size - 1)
    lag, apart, size = lag[good], apart[good], size[good]
    n = np.bincount(lag, minlength=edges.size - 1).astype(np.float64)
    with np.errstate(invalid="ignore", divide="ignore"):
        def mean(of: FloatArray) -> FloatArray:
            return np.asarray(np.bincount(lag, of, edges.size - 1) / n)

        robust = mean(np.sqrt(size)) ** 4 / (0.457 + 0.494 / n) / 2
        return Variogram(mean(apart), n, mean(size**2) / 2, np.asarray(robust))


def fit_exponential(made: Variogram, *, patch_m: float, min_pairs: int) -> Fit:
    """Return the exponential model that fits a variogram best, by weighted least squares.

    Parameters
    ----------
    made : Variogram
        Its Matheron estimates are fitted, weighted by pairs over the model squared.
    patch_m : float
        Smaller side of the patch [m]: a practical range beyond half of it is refused.
    min_pairs : int
        Least pairs of a class that takes part.

    Returns
    -------
    Fit
        With a refusal where fewer than four classes have enough pairs or the range is too long.

    References
    ----------
    Cressie, Mathematical Geology 17 (1985) 563-586 (weights; from memory).
    """
    good = (made.pairs >= min_pairs) & np.isfinite(made.matheron)
    h, g, n = made.distance_m[good], made.matheron[good], made.pairs[good]
    if h.size < 4:
        return Fit(np.nan, np.nan, np.nan, f"only {h.size} lags have {min_pairs} pairs or more")
    top = max(float(g.max()), np.finfo(np.float64).tiny)

    def model(x: FloatArray) -> FloatArray:
        return np.asarray(x[0] + x[1] * -np.expm1(-h / x[2]))

    def rest(x: FloatArray) -> FloatArray:
        made_g = np.maximum(model(x), 1e-9 * top)
        return np.asarray(np.sqrt(n) * (g / made_g - 1))

    best = least_squares(rest, [0.1 * top, 0.9 * top, float(h.max()) / 4],
                         bounds=([0, 0, 1e-3 * h.max()], [2 * top, 4 * top, 10 * h.max()]),
                         x_scale=[top, top, float(h.max())])
    nugget, sill, scale = (float(one) for one in best.x)
    refusal = ""
    if 3 * scale > patch_m / 2:
        refusal = f"the range of {3 * scale:.1f} m exceeds half the patch, {patch_m / 2:.1f} m"
    return Fit(nugget, sill, scale, refusal)


def patch_mean_u(x_m: ArrayLike, y_m: ArrayLike, fit: Fit, *, width_m: float,
                 length_m: float) -> float:
    """Return the standard error of the records' mean as the mean of a rectangular patch.

    Parameters
    ----------
    x_m, y_m : array_like, shape (n,)
        Positions of the records [m] from one corner, 0 to width_m and 0 to length_m.
    fit : Fit
        Model of the covariance.
    width_m, length_m : float
        Sides of the patch [m].

    Returns
    -------
    float
        sqrt(mean C between records - 2 mean C records to patch + mean C within the patch +
        nugget / n), in the unit of the readings: the error for this patch today, not for
        surfaces of its kind.

    References
    ----------
    Extension variance, Journel & Huijbregts, Mining Geostatistics (1978), section II.C (from
    memory); block kriging with equal weights. The means over the patch are integrals: from a
    record by the angle, the distance in closed form; within, over the distances of two random
    points, whose densities are 2 (width - u) / width^2 and likewise along the length.
    """
    x, y = (np.clip(np.asarray(a, np.float64), 0.0, side)
            for a, side in ((x_m, width_m), (y_m, length_m)))
    records = np.column_stack([x, y])
    among = float(fit.covariance(cdist(records, records)).mean())
    across = sum(float(_from_corner(p, q, fit).mean()) for p in (x, width_m - x)
                 for q in (y, length_m - y)) / (width_m * length_m)
    at, weight = (GAUSS + 1) / 2, WEIGHT / 2  # u = width at^2: the origin drawn out
    apart = fit.covariance(np.hypot((width_m * at**2)[:, None], length_m * at**2))
    density = 4 * at * (1 - at**2) * weight
    within = float(density @ apart @ density)
    return float(np.sqrt(max(among - 2 * across + within, 0.0) + fit.nugget / len(records)))


def _from_corner(p_m: FloatArray, q_m: FloatArray, fit: Fit) -> FloatArray:
    """Return the integral of the covariance from a corner over rectangles p by q."""
    turn = np.arctan2(q_m, p_m)

    def sector(low: FloatArray, high: FloatArray, reach: FloatArray, off: float) -> FloatArray:
        angle = (low + high) / 2 + (high - low) / 2 * GAUSS[:, None]
        far = reach / np.cos(angle - off) / fit.scale_m
        ring = fit.sill * fit.scale_m**2 * (1 - (1 + far) * np.exp(-far))
        return np.asarray((high - low) / 2 * (WEIGHT @ ring))

    right = np.full_like(turn, np.pi / 2)
    return sector(0 * turn, turn, p_m, 0.0) + sector(turn, right, q_m, np.pi / 2)


def _placed(x_m: ArrayLike, y_m: ArrayLike, values: ArrayLike) -> tuple[FloatArray, FloatArray]:
    x, y, v = (np.asarray(a, dtype=np.float64) for a in (x_m, y_m, values))
    if not (x.ndim == 1 and x.shape == y.shape == v.shape and x.size > 1):
        raise ValueError(f"x_m, y_m and values need one shape (n,), n >= 2, got {x.shape}, "
                         f"{y.shape} and {v.shape}")
    if not (np.isfinite(x) & np.isfinite(y) & np.isfinite(v)).all():
        raise ValueError("positions and values may not hold a NaN: leave such records out first")
    return np.column_stack([x, y]), v
