"""Several results judged at once: simultaneous intervals, ranks, enough draws for all of them."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from typing import TypeVar

import numpy as np

from surveykit.core import FloatArray
from surveykit.statistics.draws import Draws, Result

MOST_DRAWS = 400_000
Made = TypeVar("Made")


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


def settled(make: Callable[[Draws], tuple[Made, Iterable[tuple[float, float]]]], draws: Draws,
            digits: int) -> tuple[Made, Draws]:
    """Return what is made with as many draws as hold the ends of its intervals, and these draws.

    Draws are doubled, up to 400,000, until twice the standard error of every end is within half
    a unit of the last of so many significant digits of u.

    Parameters
    ----------
    make : callable
        From draws to what is made, and (u, standard error of the ends) of each interval in it.
    draws : Draws
        The draws to begin with.
    digits : int
        Significant digits of u that must hold; 0 takes the draws as they are.

    Returns
    -------
    tuple
        What was made last, and its draws.

    References
    ----------
    JCGM 101:2008, 7.9.2 (numerical tolerance) and 7.9.4 (the comparison).
    """
    while True:
        made, ends = make(draws)
        if not digits or draws.size >= MOST_DRAWS or not any(
                2 * error > tolerance(u, digits) for u, error in ends if u > 0):
            return made, draws
        draws = Draws(draws.seed, min(2 * draws.size, MOST_DRAWS))
