"""What the estimates of all quantities share: gain and offset inputs, raw series, refusals."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from typing import Any

import numpy as np

from surveykit.core import FloatArray, Input, IntArray
from surveykit.evidence.conditions import NS, Day
from surveykit.intake.params import Channel
from surveykit.intake.passes import Pass

BANDS = ("red_up", "red_down", "nir_up", "nir_down")
HALF_WIDTH = 1 / np.sqrt(3.0)  # standard uncertainty of a rectangular distribution of half-width 1


class NotEvaluated(Exception):  # noqa: N818 - a refusal with a reason, not an error
    """A pass lacks what its quantity needs; the text says what."""


@dataclass(frozen=True)
class PassValue:
    """What a maker returns: raw and final value, scatter within the pass, inputs, flags.

    `dwells` are (start, stop [ns], value, u, records) of each placement of a contact pass;
    `records` the value of each record [as value], its mean of no account; None for placements.
    """

    value_raw: float
    value: float
    u_within: float
    n_effective: float
    inputs: tuple[Input, ...]
    flags: tuple[str, ...]
    steps: tuple[tuple[str, float], ...]
    dwells: tuple[tuple[int, int, float, float, int], ...] = ()
    records: FloatArray | None = None


def raw_series(day: Day, this: Pass, quantity: str) -> tuple[IntArray, FloatArray]:
    """Return time [ns] and readings [SI], darks left in, of a channel at the pass's good records.

    Readings of another logger are those nearest in time to the main logger's.
    """
    channel = this.channels[quantity]
    records = day.quality.passes[this.name]
    log = day.records[channel.logger]
    index = records.index if channel.logger == records.logger else records.partners[channel.logger]
    return log.time_ns[index], log.channels[channel.column][index]


def series(day: Day, this: Pass, quantity: str) -> tuple[IntArray, FloatArray]:
    """Return the same, dark readings taken off where the sheet has them."""
    time, values = raw_series(day, this, quantity)
    return time, day.without_dark(this.channels[quantity], time, values)


def fixed(name: str, value: float) -> Input:
    """Return an input without uncertainty of its own."""
    return Input(name, float(value), 0.0, "", "")


def gain(channel: Channel, name: str) -> Input:
    """Return the relative gain error of a channel's calibration."""
    return Input(name, 0.0, channel.u_gain, channel.gain_scope,
                 f"calibration gain of {channel.logger}, {channel.column}")


def offset(channel: Channel, name: str) -> Input:
    """Return the offset error of a channel's calibration [the channel's SI unit]."""
    return Input(name, 0.0, channel.u_offset, channel.offset_scope,
                 f"calibration offset of {channel.logger}, {channel.column}")


def zero(day: Day, channel: Channel, name: str, hidden_u: float) -> Input:
    """Return the error of a channel's zero: dark readings where taken, else the calibration's.

    `hidden_u` is what a cap cannot show (the head's own zero offset under an open sky).
    """
    dark = day.darks[channel.logger, channel.column]
    if dark is None:
        return Input(name, 0.0, float(np.hypot(channel.u_offset, hidden_u)), channel.offset_scope,
                     f"zero of {channel.logger}, {channel.column} (no dark reading)")
    return Input(name, 0.0, float(np.hypot(dark.u, hidden_u)),
                 f"{day.name}:{channel.logger}:{channel.column}:zero",
                 f"zero of {channel.logger}, {channel.column} (dark readings)")


def skew(day: Day, this: Pass, word: str, band: str = "") -> list[Input]:
    """Return what two loggers' clocks, and heads that follow at different speeds, do to a ratio.

    Sums over a pass begin and end at other moments where the clocks differ, so that the ratio
    moves by the relative rate [s-1] of the light times the difference [s]; a head behind a ramp
    of the light shows that of one time constant earlier.
    """
    up, down = (this.channels[f"{word}_{way}"] for way in ("up", "down"))
    lag_s = down.time_constant_s - up.time_constant_s
    if up.logger == down.logger and lag_s == 0:
        return []
    time, light = series(day, this, f"{word}_down")
    rate = float(np.polyfit((time - time[0]) / NS, light, 1)[0] / light.mean())
    made = [fixed(f"{band}down_per_s", rate), fixed(f"{band}lag_s", lag_s)]
    if up.logger != down.logger:
        made.append(Input("clock_skew_s", 0.0, this.skew_u_s,
                          f"{day.name}:{up.logger}:{down.logger}:clocks",
                          f"clocks of {up.logger} and {down.logger} against each other"))
    return made


def pass_scope(day: Day, this: Pass) -> str:
    """Return the scope id of what belongs to this pass alone."""
    return f"{day.name}:pass:{this.name}"


def in_range(values: FloatArray) -> FloatArray:
    """Return a model's values, or refuse the pass where they lie outside the model's range."""
    if not np.isfinite(values).all():
        raise NotEvaluated("the readings lie outside the range of the model")
    return values


def surface_scope(word: str, surface: str, entry: Any) -> str:
    """Return the scope id of a declared property: shared while the declared entry is the same."""
    digest = hashlib.sha256(repr(entry).encode()).hexdigest()[:12]
    return f"{word}:{surface}:{digest}"


def calibration_flags(day: Day, channels: list[Channel]) -> tuple[str, ...]:
    """Return flags about the calibrations behind a pass."""
    flags = []
    for channel in channels:
        calibration = channel.calibration
        if calibration is None:
            flags.append("no calibration stated")
        elif calibration.expired_on(day.parameters.campaign.date):
            flags.append("calibration expired")
    return tuple(dict.fromkeys(flags))


def need(value: Input | None, what: str) -> Input:
    """Return an input, or refuse the pass with the name of what is missing."""
    if value is None:
        raise NotEvaluated(f"{what} is missing")
    return value
