"""Monte Carlo draws keyed by what an error belongs to, and the results built from them.

A result is held as two vectors of draws, drawn from the same streams wherever the same scope
occurs: `systematic` moves with the uncertain inputs alone, `total` also with the sampling of the
passes. Differences, ratios and changes are made draw by draw, so that a shared error cancels as
far as it should and no further.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any, NamedTuple

import numpy as np
from scipy.special import stdtr, stdtrit

from surveykit.core import FloatArray
from surveykit.statistics.streams import Draws

__all__ = ["Draws", "Result", "Sampling", "Summary", "combine", "observed", "summarise"]

# Step of a central difference, relative: the cube root of the spacing of doubles balances
# rounding against curvature.
_STEP = float(np.cbrt(np.finfo(np.float64).eps))
MIDDLE = 0.95  # share of the draws by which sums of sampling are scaled


@dataclass(frozen=True)
class Sampling:
    """How far a result moves for one standard error of the sampling of a scope.

    `se` is in the result's unit and signed (a difference moves against the pass it takes away);
    `dof` are the degrees of freedom of that standard error.
    """

    scope: str
    se: float
    dof: float

    def __post_init__(self) -> None:
        if not (np.isfinite(self.se) and self.dof > 0):
            raise ValueError(f"sampling of {self.scope!r} needs a finite se and dof > 0, "
                             f"got {self.se!r} and {self.dof!r}")


@dataclass(frozen=True)
class Result:
    """A value with its draws, shape (M,) each, and its terms of sampling."""

    value: float
    systematic: FloatArray = field(repr=False)
    total: FloatArray = field(repr=False)
    sampling: tuple[Sampling, ...] = ()

    def __post_init__(self) -> None:
        if self.systematic.ndim != 1 or self.systematic.shape != self.total.shape:
            raise ValueError(f"a result needs two vectors of draws of one length, "
                             f"got {self.systematic.shape} and {self.total.shape}")

    @cached_property
    def judged(self) -> FloatArray:
        """The draws that intervals and verdicts are made of, shape (M,).

        A sum of several t draws is wider than what is known of it, and would hold the truth too
        often: what the sampling adds is scaled so that its central 95 % are those of Student's t
        with the effective degrees of freedom.

        References
        ----------
        Welch, Biometrika 34 (1947) 28-35 (from memory); JCGM 100:2008, G.4.1.
        """
        if sum(term.se != 0 for term in self.sampling) < 2:
            return self.total
        u2, dof = _effective(self.sampling)
        added = self.total - self.systematic
        half = float(np.quantile(np.abs(added), MIDDLE))
        wanted = float(stdtrit(dof, (1 + MIDDLE) / 2) * np.sqrt(u2))
        return np.asarray(self.systematic + added * (wanted / half)) if half > 0 else self.total


class Summary(NamedTuple):
    """What is reported of a result: u, the interval of the draws, k = U / u, effective dof.

    `end_error` is the standard error by Monte Carlo of the interval's ends, the larger of the two.
    """

    value: float
    u: float
    lower: float
    upper: float
    k: float
    dof: float
    p_two_sided: float
    end_error: float


def observed(value: float, systematic: FloatArray, sampling: tuple[Sampling, ...],
             draws: Draws) -> Result:
    """Return an observed value as a result, its sampling drawn from Student's t.

    Parameters
    ----------
    value : float
        The value at the inputs' best estimates.
    systematic : ndarray, shape (M,)
        The value as the inputs' draws move it; a constant vector where nothing is uncertain.
    sampling : tuple of Sampling
        The sampling of the passes behind it, one term a scope.
    draws : Draws
        Where the draws come from; M is its size.

    Returns
    -------
    Result
        With total = systematic + sum of se t(dof).

    Raises
    ------
    ValueError
        If the vector's length is not M.

    References
    ----------
    JCGM 101:2008, 6.4.9.
    """
    if systematic.shape != (draws.size,):
        raise ValueError(f"observed needs {draws.size} draws, got shape {systematic.shape}")
    total = systematic.astype(np.float64)
    for term in sampling:
        total = total + term.se * draws.student(term.scope, term.dof)
    return Result(float(value), systematic, total, tuple(sampling))


def combine(function: Callable[..., Any], *results: Result) -> Result:
    """Return a function of results, made draw by draw.

    Parameters
    ----------
    function : callable
        Takes as many arguments as there are results, scalars or vectors alike.
    *results : Result
        Its arguments, all of one number of draws.

    Returns
    -------
    Result
        The terms of sampling carried over by their sensitivities (central differences), those of
        one scope added with their signs.

    Raises
    ------
    ValueError
        If one scope comes with different degrees of freedom.

    References
    ----------
    JCGM 101:2008, 5.9 (draws); JCGM 100:2008, 5.1.3 note 2 (numerical sensitivities).

    Examples
    --------
    >>> draws = Draws(seed=1, size=100)
    >>> flat = np.full(100, 20.0)
    >>> warm = observed(20.0, flat, (Sampling("lawn", 0.3, 3),), draws)
    >>> combine(lambda a, b: a - b, warm, warm).sampling[0].se
    0.0
    """
    values = np.array([result.value for result in results])
    terms: dict[str, Sampling] = {}
    for place, result in enumerate(results):
        if not result.sampling:
            continue
        slope = _slope(function, values, place, result.sampling)
        for term in result.sampling:
            known = terms.get(term.scope, Sampling(term.scope, 0.0, term.dof))
            if known.dof != term.dof:
                raise ValueError(f"sampling scope {term.scope!r} comes with {known.dof:g} and "
                                 f"with {term.dof:g} degrees of freedom")
            terms[term.scope] = Sampling(term.scope, known.se + slope * term.se, term.dof)
    return Result(
        value=float(function(*values)),
        systematic=np.asarray(function(*(r.systematic for r in results)), dtype=np.float64),
        total=np.asarray(function(*(r.total for r in results)), dtype=np.float64),
        sampling=tuple(terms.values()),
    )


def summarise(result: Result, coverage: float) -> Summary:
    """Return standard uncertainty, interval, coverage factor and p of a result.

    Parameters
    ----------
    result : Result
        The result; a NaN among its draws makes its u, interval and p NaN.
    coverage : float
        Coverage probability of the interval [1], between 0 and 1.

    Returns
    -------
    Summary
        u = sqrt(var(systematic) + sum se^2), which stays finite at any dof; lower and upper are
        the draws' quantiles with equal tails; k = (upper - lower) / (2 u), NaN where u is 0; dof
        by Welch-Satterthwaite, infinite without sampling; p of the value against 0, two-sided:
        of Student's t with these dof or of the draws, whichever is larger; the ends' error from
        the draws one standard error of a binomial count away (an upper bound: draws in strata are
        a little better than that).

    Raises
    ------
    ValueError
        If coverage is not between 0 and 1.

    References
    ----------
    JCGM 100:2008, G.4.1 equation (G.2b) (Welch-Satterthwaite); JCGM 101:2008, 7.7 and 7.9.1; the
    distribution-free interval of a quantile: David, Order Statistics (from memory).
    """
    if not 0 < coverage < 1:
        raise ValueError(f"coverage must lie between 0 and 1, got {coverage!r}")
    variance, dof = _effective(result.sampling, float(result.systematic.var(ddof=1)))
    u = float(np.sqrt(variance))
    tail = (1 - coverage) / 2
    off = np.array([-1.0, 0.0, 1.0]) * np.sqrt(tail * (1 - tail) / result.judged.size)
    low, high = np.quantile(result.judged, np.clip([tail + off, 1 - tail + off], 0, 1))
    lower, upper, error = float(low[1]), float(high[1]), float(max(np.ptp(low), np.ptp(high)) / 2)
    if u == 0:
        return Summary(result.value, u, lower, upper, np.nan, dof, float(result.value == 0), error)
    beyond = min(np.count_nonzero(result.judged <= 0), np.count_nonzero(result.judged >= 0))
    p = max(float(2 * stdtr(dof, -abs(result.value) / u)),
            min(1.0, 2.0 * float(beyond) / result.total.size))
    return Summary(result.value, u, lower, upper, (upper - lower) / (2 * u), dof, p, error)


def _effective(sampling: tuple[Sampling, ...], known: float = 0.0) -> tuple[float, float]:
    """Return the variance of the terms with a known one, and its degrees of freedom."""
    se2 = np.array([term.se**2 for term in sampling])
    uncertain = float((se2**2 / np.array([term.dof for term in sampling])).sum())
    variance = known + float(se2.sum())
    return variance, variance**2 / uncertain if uncertain > 0 else np.inf


def _slope(function: Callable[..., Any], values: FloatArray, place: int,
           sampling: tuple[Sampling, ...]) -> float:
    """Return the derivative of `function` by its argument number `place`."""
    size = max(abs(values[place]), *(abs(term.se) for term in sampling))
    step = np.zeros(values.size)
    step[place] = _STEP * size if size > 0 else _STEP
    above, below = values + step, values - step
    return float((function(*above) - function(*below)) / (above[place] - below[place]))
