"""The checks of one channel: arrays in, one boolean a record out; a reading is never changed."""

from __future__ import annotations

import numpy as np
from scipy.ndimage import median_filter

from surveykit.accounting import NS
from surveykit.core import BoolArray, FloatArray, IntArray
from surveykit.physics.shortwave import shortwave_limits
from surveykit.physics.sun import Sun

TO_SD = 1.4826  # of the median absolute deviation of normal readings
LIMITS = {"shortwave_down": ("down_possible", "down_rare"),
          "shortwave_up": ("up_possible", "up_rare")}  # of physics.shortwave
PILE = 5  # times as many readings at a channel's end as at the next value show a limit


def out_of_range(values: FloatArray, low: float, high: float) -> BoolArray:
    """Readings [the quantity's unit] below `low` or above `high`; NaN is never out of range."""
    with np.errstate(invalid="ignore"):
        return (values < low) | (values > high)


def too_much_light(values: FloatArray, quantity: str, sun: Sun, *, rare: bool) -> BoolArray:
    """Shortwave irradiance [W m-2] above what is physically possible; others never.

    With `rare`, above the extremely rare limits, made for one-minute means. The lower limits are
    left out: readings still hold the head's dark reading here, which may lie below them.

    References
    ----------
    Long, C. N. and Shi, Y. (2008), The Open Atmospheric Science Journal 2, 23-37 (down);
    BSRN limits for the upward flux (from memory).
    """
    if quantity not in LIMITS:
        return np.zeros(values.shape, dtype=bool)
    limits = shortwave_limits(sun.cos_zenith, sun.extraterrestrial_w_m2)
    with np.errstate(invalid="ignore"):
        return np.asarray(values > getattr(limits, LIMITS[quantity][rare]))


def end_of_range(values: FloatArray, low: float, high: float, share: float, *,
                 lower: bool) -> BoolArray:
    """Readings from the last `share` of [low, high] on at its top, with `lower` at its bottom."""
    reach = share * (high - low)
    with np.errstate(invalid="ignore"):
        return (values > high - reach) | ((values < low + reach) & lower)


def saturated(values: FloatArray, repeats: int, *, lower: bool) -> BoolArray:
    """Readings piled up at the channel's own largest value, and with `lower` at its smallest.

    A head or logger at its limit gives one value again and again; a living channel reaches its
    largest value about as often as the value next to it, at most 2.4 times as often (the top of a
    parabola, in whole steps). A pile is at least `repeats` readings, and more than five times as
    many as at the next value and as at half of all values. A channel of one value is stuck, not
    saturated. NaN is left out.
    """
    out = np.zeros(values.shape, dtype=bool)
    found, count = np.unique(values[np.isfinite(values)], return_counts=True)
    if found.size < 2:
        return out
    for end, beside in ((-1, -2), (0, 1)) if lower else ((-1, -2),):
        usual = max(count[beside], np.median(count))
        if count[end] >= repeats and count[end] > PILE * usual:
            out |= values == found[end]
    return out


def stuck(values: FloatArray, time_ns: IntArray, *, min_s: float, false_alarms: float,
          max_repeat: float) -> BoolArray:
    """Runs of identical readings longer than the channel's own scatter makes credible.

    With p the share of steps that repeat the reading, a run of m repeats is expected
    n * p**m times by chance; runs are marked from the m that makes this `false_alarms`, and
    never under `min_s` [s]. So a coarse but living channel (whole numbers once a minute) passes.
    p is held at `max_repeat` or below: what repeats more often than that is stuck, not coarse.
    Times must ascend.
    """
    out = np.zeros(values.shape, dtype=bool)
    if values.size < 3:
        return out
    same = values[1:] == values[:-1]
    p = float(np.clip(same.mean(), 1e-3, max_repeat))
    repeats = max(2, int(np.ceil(np.log(false_alarms / values.size) / np.log(p))))
    edges = np.flatnonzero(np.diff(np.concatenate(([0], same.view(np.int8), [0])))).reshape(-1, 2)
    start, stop = edges[edges[:, 1] - edges[:, 0] >= repeats].T
    for first, last in zip(start, stop, strict=True):
        if time_ns[last] - time_ns[first] >= min_s * NS:
            out[first:last + 1] = True
    return out


def noise_sd(values: FloatArray, resolution: float) -> float:
    """Return the standard deviation of a channel's noise, from second differences.

    Slow change drops out of them; the median keeps spikes and steps from counting. Never below
    that of rounding to `resolution` (NaN: none known).
    """
    rounding = resolution / np.sqrt(12) if np.isfinite(resolution) else 0.0
    if values.size < 3:
        return float(rounding)
    second = np.diff(values, n=2)
    return float(max(TO_SD * np.median(np.abs(second)) / np.sqrt(6), rounding))


def spikes(values: FloatArray, *, window: int, mad: float, noise: float,
           resolution: float, floor: FloatArray) -> BoolArray:
    """Readings far off the median of the `window` records around them; no NaN among the values.

    Far is more than `mad` scaled median absolute deviations of these records, and more than
    `noise` standard deviations of the noise: of second differences or, where larger, of what the
    running median leaves over, so that the texture of walked ground makes no spikes; and more than
    `floor`, the size of a deviation that is no matter, one a reading.

    References
    ----------
    Hampel, F. R. (1974), J. Am. Stat. Assoc. 69, 383-393 (from memory); its scale 1.4826.
    """
    out = np.zeros(values.shape, dtype=bool)
    if values.size < window:
        return out
    off = np.abs(values - median_filter(values, size=window, mode="reflect"))
    usual = max(noise_sd(values, resolution), float(TO_SD * np.median(off)))
    rows = np.flatnonzero(off > np.maximum(noise * usual, floor))
    if rows.size:
        half = window // 2
        first = np.clip(rows - half, 0, values.size - window)
        around = values[first[:, None] + np.arange(window)]
        middle = np.median(around, axis=1)
        spread = TO_SD * np.median(np.abs(around - middle[:, None]), axis=1)
        out[rows] = off[rows] > mad * spread
    return out


def steps(time_ns: IntArray, values: FloatArray, max_per_s: float, interval_s: float) -> BoolArray:
    """Readings that differ by more than `max_per_s` [unit s-1] from the one about 1 s before.

    The one before is as many records back as make a second, at least one; so noise at many
    records a second does not look like a step.
    """
    out = np.zeros(values.shape, dtype=bool)
    back = max(1, round(1 / interval_s)) if interval_s > 0 else 1
    if values.size > back:
        lapse_s = np.maximum((time_ns[back:] - time_ns[:-back]) / NS, 1e-9)
        out[back:] = np.abs(values[back:] - values[:-back]) > max_per_s * np.maximum(lapse_s, 1.0)
    return out
