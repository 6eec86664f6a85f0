"""Whether the readings of one pass look like two kinds of ground: a flag, never a correction."""

from __future__ import annotations

import numpy as np

from surveykit.core import FloatArray
from surveykit.statistics.shape import huber_location, two_hills

TWO_KINDS = "readings in two groups: two kinds of ground?"
STRONG = 10.0  # difference of the Bayesian information criterion
BARS = 20


def two_kinds(values: FloatArray, u: float, n_effective: float) -> bool:
    """Return whether the mean is not the middle of one hill of readings.

    The mean must lie further than half its u from Huber's location, and two normal components
    must describe the readings, thinned to as many as are independent, strongly better than one.
    """
    if values.size < 8 or not n_effective >= 8:
        return False
    if abs(float(values.mean()) - huber_location(values)) <= 0.5 * u:
        return False
    return two_hills(values[:: max(1, round(values.size / n_effective))]) > STRONG


def histogram(values: FloatArray) -> tuple[tuple[float, float, int], ...]:
    """Return lower edge, upper edge and count of each bar, from the least value to the largest."""
    counts, edges = np.histogram(values, BARS)
    return tuple(zip(edges[:-1].tolist(), edges[1:].tolist(), counts.tolist(), strict=True))
