"""Readings that can tell a clock: which channel of a logger, and its good readings."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from surveykit.core import FloatArray, IntArray
from surveykit.intake.params import Channel, Settings
from surveykit.intake.records import NS, Records

LIGHT = ("shortwave_down", "nir_down", "red_down", "shortwave_up", "nir_up", "red_up")
COVERED = (*LIGHT, "brightness_temperature", "longwave_down", "longwave_up")


def first_of(channels: Sequence[Channel], quantities: Sequence[str]) -> Channel | None:
    """Return the channel of the first of these quantities that there is."""
    held = {channel.quantity: channel for channel in channels}
    return next((held[name] for name in quantities if name in held), None)


def in_common(one: Sequence[Channel], two: Sequence[Channel]) -> tuple[Channel, Channel] | None:
    """Return the two channels that share the irradiance most closely: same quantity, same band."""
    pairs = [(a, b) for a in one for b in two if a.quantity in LIGHT and b.quantity in LIGHT]

    def unlike(pair: tuple[Channel, Channel]) -> tuple[bool, bool, int, int]:
        a, b = (channel.quantity for channel in pair)
        return (a != b, a.split("_")[0] != b.split("_")[0], LIGHT.index(a), LIGHT.index(b))

    return min(pairs, key=unlike, default=None)


def readings(log: Records, channel: Channel, settings: Settings, origin_ns: int,
             part: IntArray | None = None) -> tuple[FloatArray, FloatArray]:
    """Return time [s since origin_ns] and good readings [SI], ascending; of all records or a part.

    `part` holds the places of records that have a time.
    """
    if part is None:
        part = np.arange(log.n_timed)
    marked = np.logical_or.reduce([*log.marks.values()])
    values = log.channels[channel.column][part]
    low, high = settings.quality.range_of(channel.quantity)
    with np.errstate(invalid="ignore"):
        good = (values >= low) & (values <= high) & ~marked[part]
    time_s = (log.time_ns[part][good] - origin_ns) / NS
    new = np.concatenate([[True], np.diff(time_s) > 0]) if time_s.size else np.zeros(0, bool)
    return time_s[new], values[good][new]
