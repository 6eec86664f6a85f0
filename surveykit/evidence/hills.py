"""Whether the readings of one pass look like two kinds of ground: a flag, never a correction."""

from __future__ import annotations

import numpy as np

from surveykit.core import FloatArray
from surveykit.statistics.shape import huber_location, two_hills

TWO_KINDS = "readings in two groups: two kinds of ground?"
STRONG = 10.0  # difference of the Bayesian information criterion


def two_kinds(values: FloatArray, u: float, n_effective: float) -> tuple[str, ...]:
    """Return the flag where the mean is not the middle of one hill of readings.

    The mean must lie further than half its u from Huber's location, and two normal components
    must describe the readings, thinned to as many as are independent, strongly better than one.
    """
    good = values[np.isfinite(values)]
    if good.size < 8 or not n_effective >= 8:
        return ()
    if abs(float(good.mean()) - huber_location(good)) <= 0.5 * u:
        return ()
    thinned = good[:: max(1, round(good.size / n_effective))]
    return (TWO_KINDS,) if two_hills(thinned) > STRONG else ()
