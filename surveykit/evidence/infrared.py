"""What stand-off and contact passes share: the head's own errors, its housing, its checks."""

from __future__ import annotations

from typing import Any

import numpy as np

from surveykit.core import FloatArray, Input
from surveykit.evidence.brightness import band_inputs, seen_in_rows, setting_inputs
from surveykit.evidence.conditions import NS, Day, Sky
from surveykit.evidence.corrections import Correction
from surveykit.evidence.emissivities import surface_emissivity
from surveykit.evidence.models import MODELS
from surveykit.evidence.parts import (
    HALF_WIDTH,
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
    own = [*setting_inputs(day, channel, this), *band_inputs(channel)]
    emissivity, flags = surface_emissivity(day, this.surface, channel, sky)
    mean = float(brightness.mean())
    settings = day.parameters.campaign.settings.temperature
    rate = _body_rate_k_min(day, this, channel)
    check, more = _check(day, channel)
    inputs = [
        fixed("brightness_k", mean), fixed("gain_reading", mean - channel.offset.value),
        gain(channel, "gain_error"), offset(channel, "offset_error"), emissivity, *check,
        fixed("body_rate_k_min", rate),
        Input("body_rate_error", 0.0, settings.body_rate_u_min,
              f"{day.name}:{channel.logger}:body rate",
              "warming or cooling of the instrument's housing"),
        *own,
    ]
    return {i.name: i for i in inputs}, calibration_flags(day, [channel]) + flags + more


def setting_correction(day: Day, inputs: dict[str, Input]) -> tuple[Correction, ...]:
    """Return the correction for an emissivity set in the instrument, if one was set."""
    if inputs["emissivity_setting"].value == 1.0:
        return ()
    return (Correction(
        "emissivity setting undone", {"emissivity_setting": 1.0},
        "temperature.correct_emissivity_setting",
        day.parameters.campaign.settings.temperature.correct_emissivity_setting),)


def emissivity_corrections(day: Day, emissivity: str, reflected: str,
                           nothing: dict[str, float]) -> list[Correction]:
    """Return the corrections for a surface's emissivity and for what it reflects.

    `emissivity` names its input; `nothing` holds the inputs that leave out what is `reflected`:
    surroundings or bore.
    """
    settings = day.parameters.campaign.settings.temperature
    return [Correction(name, without, f"temperature.correct_{word}",
                       getattr(settings, f"correct_{word}"))
            for name, word, without in (("emissivity", "emissivity", {emissivity: 1.0}),
                                        (f"reflected {reflected}", reflected, nothing))]


def per_record(model: str, inputs: dict[str, Input], brightness: FloatArray) -> FloatArray:
    """Return the model's value of each record [K], or refuse the pass."""
    nominal: dict[str, Any] = {name: i.value for name, i in inputs.items()}
    return in_range(np.asarray(MODELS[model](nominal | {"brightness_k": brightness})))


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
    off = [seen - entry.reading - 273.15
           for entry, seen in seen_in_rows(day, "check", channel) if seen is not None]
    if not off:
        return [], ()
    worst = float(np.max(np.abs(off)))
    drift = Input("check_error", 0.0, worst * HALF_WIDTH if worst > settings.check_max_k else 0.0,
                  f"{day.name}:{channel.logger}:check", "check readings off the known temperature",
                  "rectangular")
    return [drift], (f"check reading off by more than {settings.check_max_k:g} K",) if (
        worst > settings.check_max_k) else ()
