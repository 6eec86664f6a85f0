"""Records in time: which lie in a stretch, which belong together, slopes and means of 10 s."""

from __future__ import annotations

import numpy as np

from surveykit.accounting import NS
from surveykit.core import BoolArray, FloatArray, IntArray
from surveykit.intake.records import NO_TIME_NS, Records

ROUNDING_S = 1e-3  # of printed times


def within(time_ns: IntArray, start_ns: int, stop_ns: int) -> tuple[int, int]:
    """Return first index and one past the last of the times from start to before stop.

    Times ascend; records without a time stand last and lie nowhere.
    """
    n = time_ns.size
    while n and time_ns[n - 1] == NO_TIME_NS:
        n -= 1
    first, last = np.searchsorted(time_ns[:n], [start_ns, stop_ns])
    return int(first), max(int(first), int(last))


def inside(time_ns: IntArray, spans: list[tuple[int, int]]) -> BoolArray:
    """Return which times lie within any of the (start, stop) spans; stop is outside.

    Times as in `within`.
    """
    out = np.zeros(time_ns.shape, dtype=bool)
    for start, stop in spans:
        out[slice(*within(time_ns, start, stop))] = True
    return out


def nearest(time_ns: IntArray, other_ns: IntArray, within_s: float) -> IntArray:
    """Return for each time the index of the nearest other time, or -1 if none is `within_s`.

    The other times must ascend: leave out records without a time.
    """
    if other_ns.size == 0:
        return np.full(time_ns.shape, -1, dtype=np.int64)
    right = np.clip(np.searchsorted(other_ns, time_ns), 1, max(other_ns.size - 1, 1))
    right = np.minimum(right, other_ns.size - 1)
    left = np.maximum(right - 1, 0)
    pick = np.where(np.abs(other_ns[left] - time_ns) <= np.abs(other_ns[right] - time_ns),
                    left, right)
    return np.where(np.abs(other_ns[pick] - time_ns) <= within_s * NS, pick, -1)


def partners(log: Records, rows: IntArray, other: Records) -> IntArray:
    """Return for each of a logger's records `rows` the nearest of another logger, or -1.

    Half the longer of the two intervals is near.
    """
    reach_s = 0.5 * max(log.interval_s, other.interval_s) + ROUNDING_S
    return nearest(log.time_ns[rows], other.time_ns[:other.n_timed], reach_s)


def chosen(size: int, rows: IntArray) -> BoolArray:
    """Return which of `size` records are among `rows`."""
    out = np.zeros(size, dtype=bool)
    out[rows] = True
    return out


def slopes(time_ns: IntArray, values: FloatArray, window_s: float) -> FloatArray:
    """Return the least-squares slope [unit s-1] over `window_s` around each record.

    NaN where fewer than three records lie in the window. Times ascend; no NaN among the values.
    """
    if values.size == 0:
        return np.zeros(0)
    time_s = (time_ns - time_ns[0]) / NS
    first = np.searchsorted(time_s, time_s - window_s / 2)
    last = np.searchsorted(time_s, time_s + window_s / 2, side="right")
    about, level = time_s - time_s.mean(), values - values.mean()

    def total(terms: FloatArray) -> FloatArray:
        summed = np.concatenate(([0.0], np.cumsum(terms)))
        return np.asarray(summed[last] - summed[first])

    n, t, v = last - first, total(about), total(level)
    spread = total(about**2) - t**2 / n
    with np.errstate(divide="ignore", invalid="ignore"):
        slope = (total(about * level) - t * v / n) / spread
    return np.where((n >= 3) & (spread > 1e-6), slope, np.nan)


def medians(time_ns: IntArray, values: FloatArray, width_s: float,
            least: int) -> tuple[IntArray, FloatArray]:
    """Return the end [ns] and median of each stretch of `width_s` that holds `least` records."""
    if values.size == 0:
        return np.zeros(0, dtype=np.int64), np.zeros(0)
    width_ns = round(width_s * NS)
    place = time_ns // width_ns
    order = np.lexsort((values, place))
    kinds, start, count = np.unique(place[order], return_index=True, return_counts=True)
    ranked = values[order]
    middle = (ranked[start + (count - 1) // 2] + ranked[start + count // 2]) / 2
    full = count >= least
    return (kinds[full] + 1) * width_ns, middle[full]
