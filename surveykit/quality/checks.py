"""The checks: arrays in, one boolean a record out; a reading is never changed, only judged."""

from __future__ import annotations

import numpy as np

from surveykit.accounting import NS, Mask
from surveykit.core import BoolArray, FloatArray, IntArray
from surveykit.physics.shortwave import shortwave_limits
from surveykit.physics.sun import Sun

MOST_REPEATS = 0.98


def out_of_range(values: FloatArray, low: float, high: float) -> BoolArray:
    """Readings [the quantity's unit] below `low` or above `high`; NaN is never out of range."""
    with np.errstate(invalid="ignore"):
        return (values < low) | (values > high)


def physically_impossible(values: FloatArray, quantity: str, sun: Sun) -> BoolArray:
    """Shortwave irradiance [W m-2] above the limits of Long & Shi (2008); others never.

    The lower limits are left out: readings still hold the head's dark reading here, which may lie
    below them.

    References
    ----------
    Long, C. N. and Shi, Y. (2008), The Open Atmospheric Science Journal 2, 23-37 (down);
    BSRN limits for the upward flux (from memory).
    """
    if quantity not in ("shortwave_down", "shortwave_up"):
        return np.zeros(values.shape, dtype=bool)
    limits = shortwave_limits(sun.cos_zenith, sun.extraterrestrial_w_m2)
    high = limits.down_possible if quantity == "shortwave_down" else limits.up_possible
    with np.errstate(invalid="ignore"):
        return values > high


def stuck(values: FloatArray, time_ns: IntArray, *, min_s: float,
          false_alarms: float) -> BoolArray:
    """Runs of identical readings longer than the channel's own scatter makes credible.

    With p the share of steps that repeat the reading, a run of m repeats is expected
    n * p**m times by chance; runs are marked from the m that makes this `false_alarms`, and
    never under `min_s` [s]. So a coarse but living channel (whole numbers once a minute) passes.
    p is held at `MOST_REPEATS` or below: what repeats more often than that is stuck, not coarse.
    Times must ascend.
    """
    out = np.zeros(values.shape, dtype=bool)
    if values.size < 3:
        return out
    same = values[1:] == values[:-1]
    p = float(np.clip(same.mean(), 1e-3, MOST_REPEATS))
    repeats = max(2, int(np.ceil(np.log(false_alarms / values.size) / np.log(p))))
    edges = np.flatnonzero(np.diff(np.concatenate(([0], same.view(np.int8), [0]))))
    for start, stop in edges.reshape(-1, 2):
        long_enough = (time_ns[stop] - time_ns[start]) >= min_s * NS
        if stop - start >= repeats and long_enough:
            out[start:stop + 1] = True
    return out


def inside(time_ns: IntArray, spans: list[tuple[int, int]]) -> BoolArray:
    """Return which times lie within any of the (start, stop) spans; stop is outside."""
    out = np.zeros(time_ns.shape, dtype=bool)
    for start, stop in spans:
        out |= (time_ns >= start) & (time_ns < stop)
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


def primary(mask: Mask) -> IntArray:
    """Return the index of the first reason set in each mask; -1 where none is."""
    lowest = mask & (~mask + np.uint32(1))
    return np.where(mask == 0, -1, np.log2(np.maximum(lowest, 1)).astype(np.int64))
