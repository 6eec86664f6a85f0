"""Passes pooled to a patch, patches to a surface: the pass is the statistical unit."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike
from scipy.optimize import brentq
from scipy.special import ndtri, stdtrit

from surveykit.core import FloatArray

# A within-unit u of 0 is taken as this share of the largest u or spread at hand, so that weights
# stay finite; the pooled value then follows the units that claim to be exact.
_SMALLEST_SHARE = 1e-6


@dataclass(frozen=True)
class Pooled:
    """A pooled mean.

    `u` is the standard uncertainty for a t distribution with `dof` degrees of freedom, NaN (and
    `dof` 0) where a single unit was pooled: its scatter between units is not known. `tau` is the
    standard deviation between units and `q` the Hartung-Knapp scale before it was held at 1 or
    above, both NaN for a single unit. `weights` sum to 1.
    """

    value: float
    u: float
    dof: int
    tau: float
    weights: FloatArray
    q: float


def paule_mandel(values: ArrayLike, within_u: ArrayLike) -> float:
    """Return the variance between units which explains their scatter.

    Parameters
    ----------
    values : array_like, shape (k,)
        One value a pass (or patch), k >= 2, any unit.
    within_u : array_like, shape (k,)
        Standard uncertainty of each within its pass, in the same unit, holding only what the
        passes do not share.

    Returns
    -------
    float
        tau^2 in the unit squared: the root of sum w (y - mu)^2 = k - 1 with
        w = 1 / (s^2 + tau^2); 0 where the scatter is no more than `within_u` explains.

    Raises
    ------
    ValueError
        If the two differ in shape, hold fewer than two units, a NaN, an infinity or a negative u.

    References
    ----------
    Paule & Mandel, Journal of Research of the National Bureau of Standards 87 (1982) 377-385
    (from memory).

    Examples
    --------
    >>> round(paule_mandel([41.2, 42.6, 40.1, 43.0], [0.3, 0.4, 0.3, 0.5]), 5)
    1.62103
    """
    y, variance = _units(values, within_u)
    if y.size < 2:
        raise ValueError("the scatter between units needs at least two of them, got one")

    if np.ptp(y) == 0:
        return 0.0

    def excess(tau2: float) -> float:
        weights = 1 / (variance + tau2)
        return float(weights @ (y - weights @ y / weights.sum()) ** 2 - (y.size - 1))

    # Sum w (y - mu)^2 is at most sum (y - mean)^2 / tau^2, so the root is at most the variance.
    largest = float(y.var(ddof=1))
    if excess(0.0) <= 0:
        return 0.0
    if excess(largest) >= 0:
        return largest
    return float(brentq(excess, 0.0, largest, xtol=largest * 1e-14, maxiter=500))


def pool(values: ArrayLike, within_u: ArrayLike) -> Pooled:
    """Pool passes to a patch, or patches to a surface.

    Paule-Mandel weights with the modified Hartung-Knapp uncertainty: u^2 = max(1, q) / sum w,
    q = sum w (y - mu)^2 / (k - 1), to be used with a t distribution of k - 1 degrees of freedom.
    Where tau^2 > 0 the scale q is 1 by construction.

    Parameters
    ----------
    values : array_like, shape (k,)
        One value a pass (or patch), any unit.
    within_u : array_like, shape (k,)
        Standard uncertainty of each within its pass, in the same unit.

    Returns
    -------
    Pooled
        With one unit: its value, u NaN, dof 0.

    Raises
    ------
    ValueError
        If the two differ in shape, are empty, hold a NaN, an infinity or a negative u.

    References
    ----------
    Hartung & Knapp, Statistics in Medicine 20 (2001) 3875-3889; Knapp & Hartung, Statistics in
    Medicine 22 (2003) 2693-2710 (both from memory); the scale held at 1 or above as recommended
    for few unequal studies by Roever, Knapp & Friede, BMC Medical Research Methodology 15 (2015)
    99.

    Examples
    --------
    >>> patch = pool([10.0, 10.1, 9.95], [0.3, 0.3, 0.3])
    >>> round(patch.value, 3), round(patch.u, 4), patch.dof, patch.tau
    (10.017, 0.1732, 2, 0.0)
    """
    y, variance = _units(values, within_u)
    if y.size == 1:
        return Pooled(float(y[0]), np.nan, 0, np.nan, np.ones(1), np.nan)
    if not variance.any():  # all equal, and all said to be exact
        return Pooled(float(y[0]), 0.0, y.size - 1, 0.0, np.full(y.size, 1 / y.size), 0.0)
    tau2 = paule_mandel(y, within_u)
    weights = 1 / (variance + tau2)
    total = float(weights.sum())
    value = float(weights @ y / total)
    q = float(weights @ (y - value) ** 2 / (y.size - 1))
    u = float(np.sqrt(max(1.0, q) / total))
    return Pooled(value, u, y.size - 1, float(np.sqrt(tau2)), weights / total, q)


def passes_needed(tau: float, within_u: float, half_width: float, coverage: float = 0.95) -> int:
    """Return the least number of passes whose interval is as narrow as wished.

    Parameters
    ----------
    tau : float
        Standard deviation between passes.
    within_u : float
        Standard uncertainty within a pass, same unit.
    half_width : float
        Half-width of the interval wished for, same unit.
    coverage : float, optional
        Coverage probability of the interval [1].

    Returns
    -------
    int
        The least k >= 2 with t(k - 1) sqrt((tau^2 + within_u^2) / k) <= half_width.

    Raises
    ------
    ValueError
        If half_width is not positive, tau or within_u is negative, or one of them is NaN.

    References
    ----------
    Student's interval for a mean: JCGM 100:2008, annex G.3.

    Examples
    --------
    >>> passes_needed(0.5, 0.3, 1.0)
    4
    """
    if not (half_width > 0 and tau >= 0 and within_u >= 0):
        raise ValueError(f"passes_needed needs half_width > 0, tau >= 0 and within_u >= 0, "
                         f"got {half_width!r}, {tau!r}, {within_u!r}")
    upper, spread = (1 + coverage) / 2, float(np.hypot(tau, within_u))
    # The normal quantile is below every t quantile: no smaller number can do.
    passes = max(2, int((ndtri(upper) * spread / half_width) ** 2))
    while stdtrit(passes - 1, upper) * spread / np.sqrt(passes) > half_width:
        passes += 1
    return passes


def _units(values: ArrayLike, within_u: ArrayLike) -> tuple[FloatArray, FloatArray]:
    y, u = np.asarray(values, dtype=np.float64), np.asarray(within_u, dtype=np.float64)
    if y.ndim != 1 or y.size == 0 or y.shape != u.shape:
        raise ValueError(f"pooling needs values and within_u of one shape (k,) with k >= 1, "
                         f"got {y.shape} and {u.shape}")
    if not (np.isfinite(y).all() and np.isfinite(u).all() and (u >= 0).all()):
        raise ValueError(f"pooling needs finite values and within_u >= 0, got {y} and {u}")
    smallest = _SMALLEST_SHARE * max(float(u.max()), float(np.ptp(y)))
    return y, np.maximum(u, smallest) ** 2
