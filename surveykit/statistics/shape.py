"""Whether the readings of a pass are of one kind: a robust location and two hills against one."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import logsumexp

from surveykit.core import FloatArray

TUNING = 1.345  # robust standard deviations: 95 % efficiency on normal readings
STEPS = 200


def huber_location(x: ArrayLike) -> float:
    """Return Huber's location: the mean, readings far off counting less.

    A diagnostic beside the mean, never in its place: where a patch is truly of two kinds the
    mean is the area's and this is not.

    Parameters
    ----------
    x : array_like, shape (n,)
        Readings, none missing, in any unit.

    References
    ----------
    Huber, Annals of Mathematical Statistics 35 (1964) 73-101 (from memory); scale by the median
    absolute deviation.

    Examples
    --------
    >>> round(huber_location([1.0, 2.0, 3.0, 100.0]), 2)
    2.66
    """
    values = np.asarray(x, dtype=np.float64)
    middle = float(np.median(values))
    scale = 1.4826 * float(np.median(np.abs(values - middle)))
    if scale == 0:
        return middle
    for _ in range(STEPS):
        apart = np.maximum(np.abs(values - middle) / scale, TUNING)
        moved = float(np.average(values, weights=TUNING / apart))
        if abs(moved - middle) < 1e-9 * scale:
            break
        middle = moved
    return middle


def two_hills(x: ArrayLike) -> float:
    """Return by how much two normal components describe readings better than one.

    Parameters
    ----------
    x : array_like, shape (n,)
        Readings, none missing; correlated ones thinned to independent ones first.

    Returns
    -------
    float
        Bayesian information criterion of one component less that of two [1]: above 10 is strong
        evidence of two. 0 where the readings are fewer than 8 or all equal.

    References
    ----------
    Schwarz, Annals of Statistics 6 (1978) 461-464; the steps of expectation and maximisation:
    Dempster, Laird & Rubin, J. R. Stat. Soc. B 39 (1977) 1-38 (both from memory).
    """
    values = np.sort(np.asarray(x, dtype=np.float64))
    n, spread = values.size, float(np.std(values))
    if n < 8 or spread == 0:
        return 0.0
    one = -n * np.log(spread) - n / 2 * (1 + np.log(2 * np.pi))
    best = max(_two(values, place) for place in (n // 4, n // 2, 3 * n // 4))
    return float(2 * (best - one) - 3 * np.log(n))  # two more means and spreads less one, a share


def _two(values: FloatArray, place: int) -> float:
    """Return the log likelihood of two components, begun from a split of the sorted readings."""
    floor = 0.05 * float(np.std(values))  # a hill on a single reading is none
    share = np.array([place, values.size - place]) / values.size
    mean = np.array([values[:place].mean(), values[place:].mean()])
    sd = np.maximum([values[:place].std(), values[place:].std()], floor)
    total = -np.inf
    for _ in range(STEPS):
        each = (np.log(share) - np.log(sd) - 0.5 * np.log(2 * np.pi)
                - 0.5 * ((values[:, None] - mean) / sd) ** 2)
        log = logsumexp(each, axis=1)
        before, total = total, float(log.sum())
        if total - before < 1e-6 * abs(total):
            break
        weight = np.exp(each - log[:, None])
        size = np.maximum(weight.sum(axis=0), 1e-9)
        share, mean = size / values.size, (weight.T @ values) / size
        sd = np.maximum(np.sqrt((weight * (values[:, None] - mean) ** 2).sum(axis=0) / size),
                        floor)
    return total
