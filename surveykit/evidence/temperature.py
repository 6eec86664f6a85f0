"""Surface temperature of a pass from above: stand-off and longwave; contact has its own file."""

from __future__ import annotations

import numpy as np

from surveykit.core import Input
from surveykit.evidence import models
from surveykit.evidence.backgrounds import surroundings
from surveykit.evidence.conditions import Day, Sky
from surveykit.evidence.contact import contact as contact
from surveykit.evidence.corrections import correct
from surveykit.evidence.infrared import (
    emissivity_corrections,
    head_inputs,
    per_record,
    setting_correction,
)
from surveykit.evidence.parts import (
    NotEvaluated,
    PassValue,
    calibration_flags,
    fixed,
    gain,
    in_range,
    offset,
    series,
    surface_scope,
)
from surveykit.intake.passes import Pass
from surveykit.physics.walking import footprint_m
from surveykit.statistics.series import mean_of_series


def stand_off(day: Day, this: Pass, sky: Sky) -> PassValue:
    """Return a stand-off pass: emissivity, sky and what stands beside the sky."""
    _, brightness = series(day, this, "brightness_temperature")
    inputs, flags = head_inputs(day, this, sky, brightness)
    around, more = surroundings(day, this, sky, this.channels["brightness_temperature"])
    inputs |= around
    settings = day.parameters.campaign.settings.temperature
    if this.height_m > settings.path_limit_m:
        more += (f"higher than {settings.path_limit_m:g} m: the air in between is not corrected",)
    head = this.channels["brightness_temperature"]
    if head.half_angle_deg is not None and footprint_m(
            this.height_m, head.half_angle_deg, head.view_angle_deg or 0.0) > np.nanmin(
            [this.length_m, this.width_m, np.inf]):
        more += ("the spot is wider than the patch",)
    made = correct("stand-off", inputs, [
        *setting_correction(day, inputs),
        *emissivity_corrections(day, "emissivity", "surroundings", {"background_factor": 0.0})],
        f"{day.name}:{this.surface}:stand-off", series={"brightness_k": brightness})
    values = per_record("stand-off", made.inputs, brightness)
    mean = mean_of_series(values, unit="K", method="stand-off")
    return PassValue(float(brightness.mean()), mean.value, mean.u, mean.n_eff,
                     tuple(made.inputs.values()), flags + more + made.flags, made.steps,
                     records=values)


def longwave(day: Day, this: Pass, sky: Sky) -> PassValue:
    """Return a pass of a longwave pair by the Stefan-Boltzmann balance."""
    _, up = series(day, this, "longwave_up")
    _, down = series(day, this, "longwave_down")
    entry = day.parameters.campaign.surfaces[this.surface].emissivity_broadband
    if entry is None:
        raise NotEvaluated(f"surfaces.{this.surface}.emissivity_broadband is missing")
    pair = this.channels["longwave_up"], this.channels["longwave_down"]
    inputs = {
        "up": fixed("up", float(up.mean())), "down": fixed("down", float(down.mean())),
        "up_gain_error": gain(pair[0], "up_gain_error"),
        "down_gain_error": gain(pair[1], "down_gain_error"),
        "up_offset_error": offset(pair[0], "up_offset_error"),
        "down_offset_error": offset(pair[1], "down_offset_error"),
        "emissivity_broadband": Input(
            "emissivity_broadband", float(entry.value or 0.0), float(entry.u or 0.0),
            surface_scope("emissivity broadband", this.surface, entry),
            f"broadband emissivity of the surface ({entry.source})"),
    }
    made = correct("longwave", inputs, emissivity_corrections(
        day, "emissivity_broadband", "surroundings", {"down": 0.0}),
        f"{day.name}:{this.surface}:longwave", series={"up": up, "down": down})
    nominal = {name: i.value for name, i in made.inputs.items()}
    values = in_range(np.asarray(models.longwave(
        nominal | {"up": up} | ({"down": down} if nominal["down"] else {}))))
    mean = mean_of_series(values, unit="K", method="longwave")
    return PassValue(made.steps[0][1], mean.value, mean.u, mean.n_eff,
                     tuple(made.inputs.values()), calibration_flags(day, list(pair)) + made.flags,
                     made.steps, records=values)
