"""The law of propagation of uncertainty, for a function of a few independent quantities."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import ArrayLike


def combined_u(function: Callable[..., ArrayLike], values: Sequence[float],
               us: Sequence[float]) -> float:
    """Return the standard uncertainty of a function of independent quantities.

    Parameters
    ----------
    function : callable
        Takes as many numbers as there are values and returns one.
    values, us : sequence of float
        Best estimates and their standard uncertainties, in the units of the function's arguments.

    Returns
    -------
    float
        Standard uncertainty in the function's unit; NaN where it has no value within an u.

    References
    ----------
    JCGM 100:2008, 5.1.2 and 5.1.3 note 2: sensitivities from value - u to value + u.

    Examples
    --------
    >>> print(f"{combined_u(lambda a, b: a * b, (2.0, 3.0), (0.1, 0.2)):.2f}")
    0.50
    """
    moves = []
    for place, u in enumerate(us):
        high, low = ([v + sign * u * (n == place) for n, v in enumerate(values)]
                     for sign in (1, -1))
        moves.append(float(np.asarray(function(*high))) - float(np.asarray(function(*low))))
    return float(np.linalg.norm(moves)) / 2
