"""From p and interval to the closed list of words a comparison may end with."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import stdtr, stdtrit

from surveykit.core import FloatArray

HIGHER = "higher"
LOWER = "lower"
HIGHER_SMALL = "higher, small"
LOWER_SMALL = "lower, small"
EQUIVALENT = "equivalent"
NO_DIFFERENCE_SHOWN = "no difference shown"
NOT_COMPARABLE = "not comparable"
NOT_EVALUATED = "not evaluated"


def holm(p: ArrayLike) -> FloatArray:
    """Return the p values of one family, adjusted for their number.

    Parameters
    ----------
    p : array_like, shape (m,)
        Two-sided p values [1]; NaN marks a comparison that could not be made.

    Returns
    -------
    ndarray, shape (m,)
        Adjusted p values [1] in the order given; NaN where p is NaN, and such a comparison does
        not count among the m.

    Raises
    ------
    ValueError
        If p is not one-dimensional or lies outside 0 to 1.

    References
    ----------
    Holm, Scandinavian Journal of Statistics 6 (1979) 65-70 (from memory).

    Examples
    --------
    >>> holm([0.012, 0.001, 0.5])
    array([0.024, 0.003, 0.5  ])
    """
    given = np.asarray(p, dtype=np.float64)
    if given.ndim != 1 or (given < 0).any() or (given > 1).any():
        raise ValueError(f"holm needs p values within 0 and 1 in shape (m,), got {given}")
    order = np.argsort(given, kind="stable")[: np.count_nonzero(~np.isnan(given))]
    factors = np.arange(order.size, 0, -1)
    adjusted = np.full(given.shape, np.nan)
    adjusted[order] = np.minimum(1.0, np.maximum.accumulate(factors * given[order]))
    return adjusted


def could_have_missed(u: float, dof: float, *, coverage: float = 0.95,
                      power: float = 0.80) -> float:
    """Return the smallest true difference which this comparison would have shown.

    Parameters
    ----------
    u : float
        Standard uncertainty of the difference.
    dof : float
        Its effective degrees of freedom, above 0; may be infinite.
    coverage : float, optional
        Coverage probability of the interval that must exclude 0 [1].
    power : float, optional
        Probability of showing such a difference [1].

    Returns
    -------
    float
        (t at (1 + coverage) / 2 + t at power) u, in the unit of u; NaN where u or dof is NaN.

    References
    ----------
    The minimum detectable difference of a t test; Zar, Biostatistical Analysis, sample size and
    detectable difference (from memory).

    Examples
    --------
    >>> round(could_have_missed(0.566, 4), 1)
    2.1
    """
    return float((stdtrit(dof, (1 + coverage) / 2) + stdtrit(dof, power)) * u)


def equivalence_p(value: float, u: float, dof: float, relevant: float) -> float:
    """Return the p value of two one-sided tests that a difference is smaller than what matters.

    Below .05 exactly where the 90 % interval of Student's t lies within +-`relevant`.

    Parameters
    ----------
    value, u : float
        The difference and its standard uncertainty, same unit.
    dof : float
        Its effective degrees of freedom, above 0; may be infinite.
    relevant : float
        The smallest difference that matters, same unit, above 0.

    Returns
    -------
    float
        The larger of the two one-sided p values [1]; NaN where value, u or dof is NaN.

    References
    ----------
    Schuirmann, Journal of Pharmacokinetics and Biopharmaceutics 15 (1987) 657-680 (from memory).

    Examples
    --------
    >>> round(equivalence_p(0.3, 0.35, 6, 1.0), 3)
    0.046
    """
    inside = relevant - abs(value)
    if u == 0:
        return 0.0 if inside > 0 else 1.0
    return float(stdtr(dof, -inside / u))


def verdict(value: float, p_adjusted: float, relevant: float, *, coverage: float = 0.95,
            p_equivalent: float = 1.0) -> str:
    """Return the word for a difference that was judged.

    Parameters
    ----------
    value : float
        The difference, this less the other.
    p_adjusted : float
        Its p value [1], adjusted for the family it belongs to.
    relevant : float
        The smallest difference that matters to the user, same unit as value, 0 or more.
    coverage : float, optional
        A difference is shown where p_adjusted is below 1 - coverage [1].
    p_equivalent : float, optional
        p value [1] of `equivalence_p`, adjusted likewise; not given, nothing is equivalent.

    Returns
    -------
    str
        higher or lower where it is shown and at least as large as `relevant`; higher, small or
        lower, small where it is shown and smaller; equivalent where none is shown and
        p_equivalent is below 1 - coverage; no difference shown; not evaluated where value or
        p_adjusted is NaN.

    Raises
    ------
    ValueError
        If relevant is negative or NaN.

    Examples
    --------
    >>> verdict(-0.4, 0.001, relevant=1.0)
    'lower, small'
    """
    if not relevant >= 0:
        raise ValueError(f"the relevant difference must be 0 or more, got {relevant!r}")
    if np.isnan(value) or np.isnan(p_adjusted):
        return NOT_EVALUATED
    if not p_adjusted < 1 - coverage:
        return EQUIVALENT if p_equivalent < 1 - coverage else NO_DIFFERENCE_SHOWN
    if abs(value) >= relevant:
        return HIGHER if value > 0 else LOWER
    return HIGHER_SMALL if value > 0 else LOWER_SMALL
