"""The course of a day as a repeatedly visited control shows it: straight lines between visits."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from surveykit.core import FloatArray


def hat_weights(knots: ArrayLike, at: ArrayLike) -> FloatArray:
    """Return what each knot of a piecewise-linear course counts at some times.

    Parameters
    ----------
    knots : array_like, shape (k,)
        Times of the visits, ascending and distinct, any unit, k >= 2.
    at : array_like, shape (n,)
        Times asked for; before the first and after the last knot its value is kept.

    Returns
    -------
    ndarray, shape (n, k)
        Weights [1]; each row sums to 1.

    Raises
    ------
    ValueError
        If there are fewer than two knots or they do not ascend.

    References
    ----------
    Linear interpolation as a sum of hat functions (arithmetic).

    Examples
    --------
    >>> hat_weights([0, 60, 120], [30, 90]) @ [40.0, 44.5, 46.0]
    array([42.25, 45.25])
    """
    times = np.asarray(knots, dtype=np.float64)
    if times.ndim != 1 or times.size < 2 or not (np.diff(times) > 0).all():
        raise ValueError(f"a course needs two or more ascending times, got {times}")
    return np.stack([np.interp(np.asarray(at, np.float64), times, row)
                     for row in np.eye(times.size)], axis=-1)


def local_scatter(knots: ArrayLike, values: ArrayLike) -> float:
    """Return the scatter of single values about a smooth course, from each one and its neighbours.

    Parameters
    ----------
    knots, values : array_like, shape (k,)
        Ascending distinct times and the values there, k >= 3.

    Returns
    -------
    float
        Standard deviation, unit of values: the root mean square of each inner value less the
        straight line between its two neighbours, scaled so that a curve bent slowly adds nothing.

    References
    ----------
    Gasser, Sroka & Jennen-Steinmetz, Biometrika 73 (1986) 625-633 (from memory).

    Examples
    --------
    >>> round(local_scatter([0, 1, 2], [0.0, 1.5, 0.0]), 4)  # 1.5 / sqrt(1 + 1/4 + 1/4)
    1.2247
    """
    t, y = np.asarray(knots, np.float64), np.asarray(values, np.float64)
    share = (t[1:-1] - t[:-2]) / (t[2:] - t[:-2])
    rest = y[1:-1] - (1 - share) * y[:-2] - share * y[2:]
    return float(np.sqrt(np.mean(rest**2 / (1 + (1 - share) ** 2 + share**2))))
