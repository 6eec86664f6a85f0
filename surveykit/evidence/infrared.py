"""What stand-off and contact passes share: the head's own errors, its housing, its checks."""

from __future__ import annotations

from typing import Any

import numpy as np

from surveykit.core import FloatArray, Input
from surveykit.evidence.backgrounds import window_of
from surveykit.evidence.conditions import NS, Day, Sky
from surveykit.evidence.corrections import Correction
from surveykit.evidence.emissivities import surface_emissivity
from surveykit.evidence.models import MODELS
from surveykit.evidence.parts import (
    HALF_WIDTH,
    NotEvaluated,
    calibration_flags,
    fixed,
    gain,
    in_range,
    offset,
)
from surveykit.intake.params import Channel
from surveykit.intake.passes import Pass

Found = tuple[dict[str, Input], tuple[str, ...]]


def head_inputs(day: Day, this: Pass, sky: Sky, brightness: FloatArray) -> Found:
    """Return emissivity and the errors of the infrared head during a pass, and flags.

    Raises
    ------
    NotEvaluated
        If the kit or the surface lacks what a temperature needs.
    """
    channel = this.channels["brightness_temperature"]
    if channel.emissivity_setting is None:
        raise NotEvaluated(f"emissivity_setting of {channel.logger}, {channel.column} is missing")
    emissivity, flags = surface_emissivity(day, this.surface, channel, sky)
    window_of(channel)
    low, high = channel.band_um or (8.0, 14.0)
    mean = float(brightness.mean())
    settings = day.parameters.campaign.settings.temperature
    rate = _body_rate_k_min(day, this, channel)
    check, more = _check(day, channel)
    inputs = [
        fixed("brightness_k", mean), fixed("gain_reading", mean - channel.offset.value),
        fixed("band_low_um", low), fixed("band_high_um", high),
        gain(channel, "gain_error"), offset(channel, "offset_error"), emissivity, *check,
        fixed("body_rate_k_min", rate),
        Input("body_rate_error", 0.0, settings.body_rate_u_min,
              f"{day.name}:{channel.logger}:body rate",
              "warming or cooling of the instrument's housing"),
        *_setting(day, this, channel),
    ]
    return {i.name: i for i in inputs}, calibration_flags(day, [channel]) + flags + more


def setting_correction(day: Day, this: Pass, inputs: dict[str, Input]) -> tuple[Correction, ...]:
    """Return the correction for an emissivity set in the instrument, if one was set."""
    if inputs["emissivity_setting"].value == 1.0:
        return ()
    on = day.parameters.campaign.settings.temperature.correct_emissivity_setting
    channel = this.channels["brightness_temperature"]
    return (Correction("emissivity setting undone", {"emissivity_setting": 1.0}, on,
                       "temperature.correct_emissivity_setting",
                       f"{day.name}:{channel.logger}:emissivity setting"),)


def per_record(model: str, inputs: dict[str, Input], brightness: FloatArray) -> FloatArray:
    """Return the model's value of each record [K], or refuse the pass."""
    nominal: dict[str, Any] = {name: i.value for name, i in inputs.items()}
    return in_range(np.asarray(MODELS[model](nominal | {"brightness_k": brightness})))


def housing(day: Day, this: Pass, channel: Channel) -> Input | None:
    """Return the housing temperature [K] of an infrared head during a pass, if it was logged."""
    for body in day.channels.get("housing_temperature", []):
        if body.logger == channel.logger:
            _, value = day.readings(body, this.from_ns, this.to_ns)
            if value.size:
                return Input("body_k", float(value.mean()), body.u_offset, body.offset_scope,
                             f"housing temperature of {body.logger}")
    return None


def _setting(day: Day, this: Pass, channel: Channel) -> list[Input]:
    setting = channel.emissivity_setting or 1.0
    inputs = [fixed("emissivity_setting", setting)]
    if setting == 1.0:
        return inputs
    if channel.reflected_setting_k is not None:
        return [*inputs, fixed("reflected_k", channel.reflected_setting_k)]
    body = housing(day, this, channel)
    if body is None:
        raise NotEvaluated(
            f"{channel.logger}, {channel.column} was logged with emissivity setting {setting:g}; "
            "write its reflected_setting_degC, or log its housing temperature")
    return [*inputs, Input("reflected_k", body.value, body.u, body.scope,
                           "reflected temperature in the instrument, taken as its housing's")]


def _body_rate_k_min(day: Day, this: Pass, channel: Channel) -> float:
    for body in day.channels.get("housing_temperature", []):
        if body.logger == channel.logger:
            time, value = day.readings(body, this.start_ns, this.stop_ns)
            if value.size > 2:
                return float(np.polyfit((time - time[0]) / NS / 60.0, value, 1)[0])
    return 0.0


def _check(day: Day, channel: Channel) -> tuple[list[Input], tuple[str, ...]]:
    """Return what check readings of a known temperature say: a drift, and a flag if it is large."""
    settings = day.parameters.campaign.settings.temperature
    off = []
    for entry in day.sheet.entries:
        if entry.entry == "check" and entry.instrument in ("", channel.logger):
            edge = round((entry.edge_u_s + 5 * channel.time_constant_s) * NS)
            _, value = day.readings(channel, entry.start_ns + edge, entry.stop_ns - edge)
            if value.size:
                off.append(float(value.mean()) - entry.reading - 273.15)
    if not off:
        return [], ()
    worst = float(np.max(np.abs(off)))
    drift = Input("check_error", 0.0, worst * HALF_WIDTH if worst > settings.check_max_k else 0.0,
                  f"{day.name}:{channel.logger}:check", "check readings off the known temperature",
                  "rectangular")
    return [drift], (f"check reading off by more than {settings.check_max_k:g} K",) if (
        worst > settings.check_max_k) else ()
