"""Trends over a few dates: weighted and ordinary lines, and two that need no normal errors."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import ndtr, stdtrit
from scipy.stats import kendalltau, linregress, theilslopes

from surveykit.core import FloatArray

EXACT_UP_TO = 10  # values: beyond, the normal approximation of the count is good


class Slope(NamedTuple):
    """A slope [value per time] with its u, interval and two-sided p against 0."""

    value: float
    u: float
    lower: float
    upper: float
    p: float


def slope_weights(time: ArrayLike, covariance: ArrayLike | None = None) -> FloatArray:
    """Return what each value counts in the slope of a straight line.

    Parameters
    ----------
    time : array_like, shape (n,)
        Times, not all equal.
    covariance : array_like, shape (n, n), optional
        Known covariance of the values; not given, all are equally good and independent.

    Returns
    -------
    ndarray, shape (n,)
        Weights [1 / time]: slope = weights @ values.

    Raises
    ------
    ValueError
        If there are fewer than two different times.

    References
    ----------
    Aitken's generalised least squares; JCGM 100:2008, H.3 for the ordinary line.

    Examples
    --------
    >>> slope_weights([0.0, 1.0, 2.0])
    array([-0.5,  0. ,  0.5])
    """
    t = np.asarray(time, dtype=np.float64)
    if np.unique(t).size < 2:
        raise ValueError(f"a slope needs two different times, got {t}")
    design = np.column_stack([np.ones(t.size), t - t.mean()])
    if covariance is None:
        weighted = design
    else:
        weighted = np.linalg.solve(np.asarray(covariance, dtype=np.float64), design)
    return np.asarray(np.linalg.solve(weighted.T @ design, weighted.T)[1], dtype=np.float64)


def ordinary(time: ArrayLike, values: ArrayLike, coverage: float) -> Slope:
    """Return the ordinary least-squares slope; its u from the scatter about the line.

    Parameters
    ----------
    time, values : array_like, shape (n,)
        n >= 3.
    coverage : float
        Coverage probability of the interval [1].

    References
    ----------
    JCGM 100:2008, H.3; Student's t with n - 2 degrees of freedom.

    Examples
    --------
    >>> made = ordinary([0, 1, 2], [0.0, 1.0, 2.3], 0.95)
    >>> print(f"{made.value:.2f} {made.u:.4f} {made.p:.3f}")
    1.15 0.0866 0.048
    """
    found = linregress(time, values)
    half = float(stdtrit(np.size(time) - 2, (1 + coverage) / 2) * found.stderr)
    return Slope(float(found.slope), float(found.stderr), float(found.slope) - half,
                 float(found.slope) + half, float(found.pvalue))


def theil_sen(time: ArrayLike, values: ArrayLike, coverage: float) -> Slope:
    """Return the median of all pairwise slopes with its interval, and Mann-Kendall's p.

    Parameters
    ----------
    time, values : array_like, shape (n,)
        n >= 3. u is NaN: the method gives an interval only.
    coverage : float
        Coverage probability of the interval [1].

    References
    ----------
    Sen, Journal of the American Statistical Association 63 (1968) 1379-1389 (from memory).
    """
    found = theilslopes(values, time, coverage)
    return Slope(float(found.slope), np.nan, float(found.low_slope), float(found.high_slope),
                 mann_kendall(time, values)[1])


def mann_kendall(time: ArrayLike, values: ArrayLike) -> tuple[int, float]:
    """Return Mann-Kendall's S and its two-sided p against no trend.

    Values of one time are not compared with each other. Without ties and up to 10 values p is
    exact, beyond by the normal approximation with continuity and ties corrected.

    Parameters
    ----------
    time, values : array_like, shape (n,)
        Values at their times, in any order, none missing.

    Returns
    -------
    tuple of (int, float)
        S and p [1].

    References
    ----------
    Gilbert, Statistical Methods for Environmental Pollution Monitoring (1987), section 16.4
    (from memory); Kendall's exact distribution by scipy.

    Examples
    --------
    >>> s, p = mann_kendall([1, 2, 3, 4], [1.0, 2.0, 3.0, 4.0])  # four cannot reach .05
    >>> s, round(p, 3)
    (6, 0.083)
    """
    t, y = np.asarray(time, dtype=np.float64), np.asarray(values, dtype=np.float64)
    first, second = np.triu_indices(t.size, 1)
    s = int(np.sum(np.sign(t[second] - t[first]) * np.sign(y[second] - y[first])))
    n = t.size
    tied = [np.unique(one, return_counts=True)[1] for one in (t, y)]
    if n <= EXACT_UP_TO and all((count == 1).all() for count in tied):
        return s, float(kendalltau(t, y, method="exact").pvalue)
    whole = n * (n - 1) * (2 * n + 5) / 18
    less = sum(float((c * (c - 1) * (2 * c + 5)).sum()) for c in tied) / 18
    pairs = [float((c * (c - 1)).sum()) for c in tied]
    triples = [float((c * (c - 1) * (c - 2)).sum()) for c in tied]
    variance = (whole - less + pairs[0] * pairs[1] / (2 * n * (n - 1))
                + (triples[0] * triples[1] / (9 * n * (n - 1) * (n - 2)) if n > 2 else 0.0))
    if variance <= 0:
        return s, 1.0
    return s, min(1.0, 2 * float(ndtr(-max(abs(s) - 1, 0) / np.sqrt(variance))))
