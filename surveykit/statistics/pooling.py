"""Passes pooled to a patch, patches to a surface: the pass is the statistical unit."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike
from scipy.optimize import brentq
from scipy.special import ndtri, stdtrit

from surveykit.core import FloatArray

# A within-unit u of 0 is taken as this share of the largest u or spread at hand, so that weights
# stay finite; the pooled value then follows the units that claim to be exact.
_SMALLEST_SHARE = 1e-6
MANY = 10_000  # passes: more are no plan


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
    return _between([(y, variance)])[0]


@dataclass(frozen=True)
class Common:
    """One scatter between units for several groups: tau^2, Hartung-Knapp scale q, summed dof."""

    tau2: float
    q: float
    dof: int


def common_scatter(some: Sequence[tuple[ArrayLike, ArrayLike]]) -> Common | None:
    """Return one variance between units for several groups, each with a mean of its own.

    Parameters
    ----------
    some : sequence of (values, within_u)
        The units of each group, as for `pool`, all in one unit of measure.

    Returns
    -------
    Common or None
        tau^2 is the root of the sum over groups of w (y - mu_group)^2 = sum (k - 1); None where no
        group has two units.

    References
    ----------
    The equation of `paule_mandel` summed over groups, as the residual variance of a one-way
    analysis of variance is: JCGM 100:2008, H.5.

    Examples
    --------
    >>> common_scatter([([1.0, 2.0], [0.0, 0.0]), ([5.0, 8.0], [0.0, 0.0])])
    Common(tau2=2.5, q=1.0, dof=2)
    """
    groups = [_units(values, u) for values, u in some if np.size(values) > 1]
    dof = sum(y.size - 1 for y, _ in groups)
    if not dof:
        return None
    tau2, scale = _between(groups)
    return Common(tau2, scale, dof)


def _between(groups: Sequence[tuple[FloatArray, FloatArray]]) -> tuple[float, float]:
    """Return tau^2 of groups of (values, variance within), and the scale q left at it."""
    dof = sum(y.size - 1 for y, _ in groups)
    # Sum w (y - mu)^2 is at most sum (y - mean)^2 / tau^2, so the root is at most the variance.
    largest = sum(float(((y - y.mean()) ** 2).sum()) for y, _ in groups) / dof
    least = 1e-12 * largest
    if largest == 0:
        return 0.0, 0.0

    def excess(tau2: float) -> float:
        total = -float(dof)
        for y, variance in groups:
            weights = 1 / (variance + tau2)
            total += float(weights @ (y - weights @ y / weights.sum()) ** 2)
        return total

    if (left := excess(least)) <= 0:
        return 0.0, left / dof + 1
    if excess(largest) >= 0:
        return largest, 1.0
    return float(brentq(excess, least, largest, xtol=largest * 1e-14, maxiter=500)), 1.0


def pool(values: ArrayLike, within_u: ArrayLike, common: Common | None = None) -> Pooled:
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
    common : Common, optional
        Scatter between units borrowed from several groups; not given, the units' own.

    Returns
    -------
    Pooled
        With one unit and no common scatter: its value, u NaN, dof 0.

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
    if common is not None:
        weights = 1 / np.maximum(variance + common.tau2, np.finfo(np.float64).tiny)
        total = float(weights.sum())
        return Pooled(float(weights @ y / total), float(np.sqrt(max(1.0, common.q) / total)),
                      common.dof, float(np.sqrt(common.tau2)), weights / total, common.q)
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


def passes_needed(tau: float, within_u: float, half_width: float, coverage: float = 0.95, *,
                  shared_u: float = 0.0) -> float:
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
    shared_u : float, optional
        What all passes share and more of them do not reduce, same unit.

    Returns
    -------
    float
        The least whole k >= 2 with t sqrt(shared_u^2 + (tau^2 + within_u^2) / k) <= half_width,
        t with the effective degrees of freedom of k - 1 passes; infinity where none does.

    Raises
    ------
    ValueError
        If half_width is not positive, tau or within_u is negative, or one of them is NaN.

    References
    ----------
    Student's interval for a mean and effective degrees of freedom: JCGM 100:2008, G.3 and G.4.

    Examples
    --------
    >>> passes_needed(0.5, 0.3, 1.0)
    4
    >>> passes_needed(0.5, 0.3, 1.0, shared_u=0.6)
    inf
    """
    if not (half_width > 0 and tau >= 0 and within_u >= 0 and shared_u >= 0):
        raise ValueError(f"passes_needed needs half_width > 0, tau, within_u and shared_u >= 0, "
                         f"got {half_width!r}, {tau!r}, {within_u!r}, {shared_u!r}")
    upper, spread2 = (1 + coverage) / 2, tau**2 + within_u**2
    # The normal quantile is below every t quantile: no smaller number can do.
    least = float(ndtri(upper)) ** 2
    room = half_width**2 / least - shared_u**2
    if room <= 0:
        return np.inf

    def wide(passes: int) -> bool:
        own2 = spread2 / passes
        both2 = shared_u**2 + own2
        dof = (passes - 1) * (both2 / own2) ** 2 if own2 > 0 else np.inf
        return bool(stdtrit(dof, upper) * np.sqrt(both2) > half_width)

    passes = max(2, int(spread2 / room))
    if passes > MANY:
        return np.inf
    while wide(passes):
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
