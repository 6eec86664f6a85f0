"""Albedo of a pass: ratio of sums of an up- and a down-looking head."""

from __future__ import annotations

import numpy as np

from surveykit.core import Input
from surveykit.evidence.conditions import Day, Sky
from surveykit.evidence.parts import (
    NotEvaluated,
    PassValue,
    calibration_flags,
    fixed,
    gain,
    pass_scope,
    raw_series,
    series,
    zero,
)
from surveykit.evidence.views import albedo_around, foreign_ground, own_shade
from surveykit.intake.params.defaults import AlbedoSettings
from surveykit.intake.passes import Pass
from surveykit.physics.shortwave import directional_u, ratio_of_sums
from surveykit.statistics.series import mean_of_series

GROUND_SHARE = 1 / 3  # of the sky head's hidden zero, for the head that looks at the ground


def albedo(day: Day, this: Pass, sky: Sky) -> PassValue:
    """Return an albedo pass with its zero, direction, level, shade and footprint budgeted."""
    _, up = series(day, this, "shortwave_up")
    _, down = series(day, this, "shortwave_down")
    settings = day.parameters.campaign.settings.albedo
    head_up, head_down = this.channels["shortwave_up"], this.channels["shortwave_down"]
    value = float(ratio_of_sums(up, down))
    if not np.isfinite(value):
        raise NotEvaluated("the irradiance of the pass does not sum to more than zero")
    if not 0 <= value <= 1:
        raise NotEvaluated(f"a share of {value:.2f} of the light comes back, which cannot be: "
                           "check which head looks up, and their gains and darks")
    zenith = day.quality.passes[this.name].zenith_deg
    around, flags = albedo_around(day, this)
    foreign, more = foreign_ground(day, this, head_up, around)
    shade, most = own_shade(day, this, head_up, zenith)
    inputs = [
        fixed("up", float(up.mean())), fixed("down", float(down.mean())), *foreign, *shade,
        gain(head_up, "up_gain_error"), gain(head_down, "down_gain_error"),
        zero(day, head_up, "up_zero_error", settings.zero_offset_u_w_m2 * GROUND_SHARE),
        zero(day, head_down, "down_zero_error", settings.zero_offset_u_w_m2),
        Input("directional_error", 0.0, settings.beam_fraction * float(
            directional_u(zenith, settings.directional_limit_w_m2)),
              f"{head_down.gain_scope}:direction", "directional response of the upper head",
              "rectangular"),
        Input("levelling_error", 0.0, settings.beam_fraction * float(
            np.tan(np.radians(zenith)) * np.radians(settings.levelling_u_deg) / np.sqrt(2)),
              pass_scope(day, this), "levelling of the upper head in the hand"),
    ]
    flags += more + most + _share_flags(inputs, settings)
    if all(day.darks[c.logger, c.column] is None for c in (head_up, head_down)):
        flags += ("no dark reading",)
    if zenith > settings.zenith_qualified_deg:
        flags += (f"sun lower than {90 - settings.zenith_qualified_deg:.0f} degrees: "
                  "indicative only",)
    elif zenith > settings.zenith_standard_deg:
        flags += (f"sun lower than {90 - settings.zenith_standard_deg:.0f} degrees",)
    flags += ("gain ratio not checked by swapping", "surroundings and shade not corrected")
    residual = (up - value * down) / down.mean()
    within = mean_of_series(residual, unit="1", method="ratio of sums")
    raw = ratio_of_sums(*(raw_series(day, this, q)[1] for q in ("shortwave_up", "shortwave_down")))
    return PassValue(raw, value, within.u, within.n_eff, tuple(inputs),
                     calibration_flags(day, [head_up, head_down]) + flags,
                     (("raw", raw), ("dark readings", value)))


def _share_flags(inputs: list[Input], settings: AlbedoSettings) -> tuple[str, ...]:
    """Return flags about footprint and shade; refuse a pass that sees too little of its patch."""
    known = {i.name: i.value for i in inputs}
    share, shade = known["footprint_share"], known["shade_share"]
    if 1 - share + shade > settings.max_shade_contamination:
        raise NotEvaluated(
            f"the head sees {1 - share:.0%} foreign ground and {shade:.0%} of its own shade, "
            f"more than {settings.max_shade_contamination:.0%} together: change height_cm or patch")
    return ("small footprint share",) if share < settings.min_footprint else ()
