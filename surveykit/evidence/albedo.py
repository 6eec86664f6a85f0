"""Albedo of a pass: ratio of sums of an up- and a down-looking head, corrected step by step."""

from __future__ import annotations

import numpy as np

from surveykit.core import FloatArray, Input
from surveykit.evidence import models
from surveykit.evidence.conditions import NS, Day, Sky
from surveykit.evidence.corrections import Correction, correct, lag_corrections
from surveykit.evidence.heads import class_inputs, directional_inputs, limits
from surveykit.evidence.intercalibration import ratio_input, swapped
from surveykit.evidence.parts import (
    NotEvaluated,
    PassValue,
    calibration_flags,
    fixed,
    gain,
    pass_scope,
    raw_series,
    series,
    skew,
    zero,
)
from surveykit.evidence.views import (
    albedo_around,
    foreign_ground,
    lane_effect,
    lean_deg,
    operator_inputs,
    own_shade,
    treat,
)
from surveykit.intake.passes import Pass
from surveykit.physics.shortwave import levelling_error, ratio_of_sums
from surveykit.statistics.series import mean_of_series

GROUND_SHARE = 1 / 3  # of the sky head's hidden zero, for the head that looks at the ground
EVERY_WAY_DEG = np.arange(0.0, 360.0, 45.0)  # a hand may lean any way
NEAR_M = 1.5  # nearer than this an operator hides more than a hundredth of either view
LOWEST = 0.02  # albedo below which something is wrong, as no ground is so dark


def albedo(day: Day, this: Pass, sky: Sky) -> PassValue:
    """Return an albedo pass: darks, gain ratio, surroundings and shade corrected, the rest kept."""
    _, up = series(day, this, "shortwave_up")
    _, down = series(day, this, "shortwave_down")
    raw = [raw_series(day, this, q)[1] for q in ("shortwave_up", "shortwave_down")]
    settings = day.parameters.campaign.settings.albedo
    head_up, head_down = this.channels["shortwave_up"], this.channels["shortwave_down"]
    zenith = day.quality.passes[this.name].zenith_deg
    ratio = ratio_of_sums(up, down)
    if not np.isfinite(ratio):
        raise NotEvaluated("the irradiance of the pass does not sum to more than zero")
    if not 0 <= ratio <= 1:
        raise NotEvaluated(f"a share of {ratio:.2f} of the light comes back, which cannot be: "
                           "check which head looks up, and their gains and darks")
    inputs, flags = _inputs(day, this, sky, up, down)
    stated = day.parameters.campaign.surfaces[this.surface].around is not None
    inputs, more = treat(inputs, ratio / inputs["gain_ratio"].value, settings, stated)
    steps = [Correction("dark readings", {"up": float(raw[0].mean()), "down": float(raw[1].mean())},
                        "albedo.correct_darks", settings.correct_darks),
             *lag_corrections(inputs.values(), "albedo.correct_lag", settings.correct_lag),
             Correction("gain ratio", {"gain_ratio": 1.0}, "albedo.correct_gain_ratio"),
             Correction("surroundings", {"surroundings_corrected": 0.0},
                        "albedo.correct_surroundings"),
             Correction("own shade", {"shade_corrected": 0.0}, "albedo.correct_self_shade")]
    if settings.normalise_zenith:
        inputs |= _normalised(day, this, zenith)
        steps.append(Correction(f"sun at {settings.normalise_zenith_deg:g} degrees zenith",
                                {"reference_zenith_deg": zenith}, "albedo.normalise_zenith"))
    done = [s for s in steps if not s.on or any(
        inputs[name].value != value for name, value in s.without.items())]
    made = correct("albedo", inputs, done, f"{day.name}:{this.surface}:albedo")
    value = made.steps[-1][1]
    if value < LOWEST:
        more += ("darker than any ground",)
    x = {name: i.value for name, i in made.inputs.items()}
    slope = float(models.albedo(x | {"up": x["up"] + 1.0}) - models.albedo(x))  # linear in `up`
    residual = slope * (up - up.mean() / down.mean() * down)
    within = mean_of_series(residual, unit="1", method="ratio of sums")
    return PassValue(float(ratio_of_sums(*raw)), value, within.u, within.n_eff,
                     tuple(made.inputs.values()),
                     calibration_flags(day, [head_up, head_down]) + flags + more + made.flags,
                     made.steps, records=residual)


def _inputs(day: Day, this: Pass, sky: Sky, up: FloatArray,
            down: FloatArray) -> tuple[dict[str, Input], tuple[str, ...]]:
    settings = day.parameters.campaign.settings.albedo
    head_up, head_down = this.channels["shortwave_up"], this.channels["shortwave_down"]
    zenith = day.quality.passes[this.name].zenith_deg
    around, flags = albedo_around(day, this)
    foreign, more = foreign_ground(day, this, head_up, around)
    shade, most = own_shade(day, this, head_up, sky, zenith)
    gains, last = _gains(day, this)
    hidden = limits(day, head_down).hidden_zero_u
    inputs = [
        fixed("up", float(up.mean())), fixed("down", float(down.mean())), *foreign, *shade, *gains,
        zero(day, head_up, "up_zero_error", hidden * GROUND_SHARE),
        zero(day, head_down, "down_zero_error", hidden),
        *directional_inputs(day, head_down, zenith),
        Input("levelling_error", 0.0, float(np.sqrt(np.mean(levelling_error(
            zenith, settings.levelling_u_deg, EVERY_WAY_DEG, settings.beam_fraction) ** 2))),
              pass_scope(day, this), "levelling of the upper head in the hand"),
        *operator_inputs(day, this), *skew(day, this, "shortwave"),
        *class_inputs(day, this, head_up, head_down),
    ]
    flags += more + most + last + _circumstances(day, this, down, zenith)
    return {i.name: i for i in inputs}, flags


def _gains(day: Day, this: Pass) -> tuple[list[Input], tuple[str, ...]]:
    """Return the gain ratio found by swapping the heads, or the errors of both gains."""
    settings = day.parameters.campaign.settings.albedo
    up, down = this.channels["shortwave_up"], this.channels["shortwave_down"]
    own = [fixed("gain_ratio", 1.0), gain(up, "up_gain_error"), gain(down, "down_gain_error")]
    found = swapped(day, up, down, "albedo", GROUND_SHARE)
    if found is None:
        return own, ("gain ratio not checked by swapping",)
    if not settings.correct_gain_ratio:
        return own, ("not corrected, settings.albedo.correct_gain_ratio is off: gain ratio",)
    if found.sd > settings.swap_max_sd:
        return own, (f"swaps not used: their ratios scatter by more than "
                     f"{settings.swap_max_sd:.0%}",)
    flags = ("fewer or shorter swaps than recommended",) if found.few else ()
    return [ratio_input(day, "gain_ratio", found, up, "gain ratio by swapping the heads"),
            fixed("ratio_per_up_zero", found.per_up_zero),
            fixed("ratio_per_down_zero", found.per_down_zero),
            fixed("up_gain_error", 0.0), fixed("down_gain_error", 0.0)], flags


def _circumstances(day: Day, this: Pass, down: FloatArray, zenith: float) -> tuple[str, ...]:
    """Return flags about darks, the sun's height, the lanes' direction and slow heads."""
    settings = day.parameters.campaign.settings.albedo
    heads = this.channels["shortwave_up"], this.channels["shortwave_down"]
    flags: tuple[str, ...] = ()
    if any(day.darks[c.logger, c.column] is None for c in heads):
        flags += ("no dark reading",)
    if zenith > settings.zenith_qualified_deg:
        flags += (f"sun lower than {90 - settings.zenith_qualified_deg:.0f} degrees: "
                  "indicative only",)
    elif zenith > settings.zenith_standard_deg:
        flags += (f"sun lower than {90 - settings.zenith_standard_deg:.0f} degrees",)
    lean = lane_effect(day, this, down)
    if abs(lean) > settings.lane_effect_max:
        flags += (f"the upper head leans with the lanes' direction, by "
                  f"{lean_deg(lean, zenith, settings.beam_fraction):.1f} degrees or more",)
    elif this.lanes % 2 and this.lanes > 1:
        flags += ("odd number of lanes: a lean of the upper head does not cancel",)
    if not all(c.spectrally_flat is not False for c in heads):
        flags += ("response of the heads is not flat: do not compare green with grey ground",)
    if this.lanes and np.isfinite(this.length_m):
        speed = this.length_m * this.lanes / ((this.stop_ns - this.start_ns) / NS)
        if speed * max(c.time_constant_s for c in heads) > this.length_m / 4:
            flags += ("heads too slow for the walk",)
    if this.operator_side in ("sun", "across"):
        flags += ("the operator stood beside or towards the sun",)
    if settings.operator_distance_m < NEAR_M:
        flags += (f"the operator stood nearer than {NEAR_M:g} m",)
    return flags


def _normalised(day: Day, this: Pass, zenith: float) -> dict[str, Input]:
    settings = day.parameters.campaign.settings.albedo
    return {
        "zenith_deg": fixed("zenith_deg", zenith),
        "reference_zenith_deg": fixed("reference_zenith_deg", settings.normalise_zenith_deg),
        "zenith_dependence": Input(
            "zenith_dependence", settings.zenith_dependence, settings.zenith_dependence_u,
            f"{this.surface}:zenith dependence", "dependence of albedo on the sun's height")}
