"""Several results judged at once: simultaneous intervals, ranks, error of the Monte Carlo ends."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from surveykit.core import FloatArray
from surveykit.statistics.draws import Result


def simultaneous(results: Sequence[Result], coverage: float) -> FloatArray:
    """Return intervals that hold all together, from the largest deviation draw by draw.

    Each result's deviations are ranked on its own scale, so that results of few degrees of
    freedom do not widen the others; for equal degrees of freedom that is the largest |t|.

    Parameters
    ----------
    results : sequence of Result, length m
        One family, drawn from one set of streams.
    coverage : float
        Probability that all intervals hold [1].

    Returns
    -------
    ndarray, shape (m, 2)
        Lower and upper ends, in the results' unit, centred on the values; NaN where a result has
        NaN among its draws (such a result does not count in the family).

    References
    ----------
    Hothorn, Bretz & Westfall, Biometrical Journal 50 (2008) 346-363 (largest |t|); Beran,
    Journal of the American Statistical Association 83 (1988) 679-686 (balanced, by ranks); both
    from memory.

    Examples
    --------
    >>> from surveykit.statistics.draws import Draws, Sampling, observed
    >>> draws = Draws(seed=1, size=20000)
    >>> flat = np.zeros(draws.size)
    >>> three = [observed(0.0, flat, (Sampling(s, 1.0, 1e9),), draws) for s in "abc"]
    >>> print(simultaneous(three, 0.95).round(1)[:, 1])  # .95^(1/3) each: 2.39
    [2.4 2.4 2.4]
    """
    out = np.full((len(results), 2), np.nan)
    good = [i for i, r in enumerate(results) if np.isfinite(r.total).all()]
    if not good:
        return out
    size = np.array([np.abs(results[i].judged - results[i].value) for i in good])
    ordered = np.sort(size, axis=1)
    largest = np.zeros(size.shape[1])
    for one, order in zip(size, ordered, strict=True):
        np.maximum(largest, np.searchsorted(order, one, side="right"), out=largest)
    level = float(np.quantile(largest, coverage)) / size.shape[1]
    for i, order in zip(good, ordered, strict=True):
        half = float(np.quantile(order, min(level, 1.0)))
        out[i] = results[i].value - half, results[i].value + half
    return out


def rank_probabilities(results: Sequence[Result]) -> FloatArray:
    """Return the probability of each result to stand at each place, the highest first.

    Parameters
    ----------
    results : sequence of Result, length m
        Drawn from one set of streams, so that shared errors do not mix the places.

    Returns
    -------
    ndarray, shape (m, m)
        [i, j]: probability [1] that result i is the (j + 1)th highest; rows and columns sum to 1.

    References
    ----------
    JCGM 101:2008, 5.9: the share of draws with a property estimates its probability.
    """
    totals = np.array([result.total for result in results])
    places = np.argsort(np.argsort(-totals, axis=0, kind="stable"), axis=0)
    return np.stack([(places == j).mean(axis=1) for j in range(len(results))], axis=1)


def end_error(total: FloatArray, coverage: float) -> float:
    """Return the standard error by Monte Carlo of an interval's ends, the larger of the two.

    From the order statistics one standard error of a binomial count away; draws in strata are
    a little better than that, so it is an upper bound.

    Parameters
    ----------
    total : ndarray, shape (M,)
        Draws of the result.
    coverage : float
        Coverage probability of the interval [1].

    Returns
    -------
    float
        Standard error, unit of the draws; NaN where a draw is NaN.

    References
    ----------
    JCGM 101:2008, 7.9.1 and D; the distribution-free interval of a quantile: David, Order
    Statistics (from memory).
    """
    tail = (1 - coverage) / 2
    step = np.sqrt(tail * (1 - tail) / total.size)
    ends = np.quantile(total, [max(tail - step, 0), tail + step, 1 - tail - step,
                               min(1 - tail + step, 1)])
    return float(max(ends[1] - ends[0], ends[3] - ends[2]) / 2)


def tolerance(u: float, digits: int) -> float:
    """Return half a unit of the last of so many significant digits of a standard uncertainty.

    References
    ----------
    JCGM 101:2008, 7.9.2.

    Examples
    --------
    >>> tolerance(0.35, 2), tolerance(0.35, 1)  # 35e-2 and 4e-1
    (0.005, 0.05)
    """
    exponent = int(f"{u:.{digits - 1}e}".partition("e")[2])
    return 0.5 * 10.0 ** (exponent - digits + 1)
