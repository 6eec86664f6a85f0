"""Albedo of a pass: ratio of sums of an up- and a down-looking head."""

from __future__ import annotations

import numpy as np

from surveykit.core import Input
from surveykit.evidence.conditions import Day, Sky
from surveykit.evidence.parts import (
    HALF_WIDTH,
    NotEvaluated,
    PassValue,
    calibration_flags,
    fixed,
    gain,
    series,
    surface_scope,
    zero,
)
from surveykit.intake.params import Channel
from surveykit.intake.passes import Pass
from surveykit.physics.footprint import disc_share, limited_share, rectangle_share, self_shade
from surveykit.physics.shortwave import ratio_of_sums
from surveykit.statistics.series import mean_of_series


def albedo(day: Day, this: Pass, sky: Sky) -> PassValue:
    """Return an albedo pass with its zero, direction, level, shade and footprint budgeted."""
    _, up = series(day, this, "shortwave_up")
    _, down = series(day, this, "shortwave_down")
    settings = day.parameters.campaign.settings.albedo
    head_up, head_down = this.channels["shortwave_up"], this.channels["shortwave_down"]
    value = float(ratio_of_sums(up, down))
    if not np.isfinite(value):
        raise NotEvaluated("the irradiance of the pass does not sum to more than zero")
    zenith = day.quality.passes[this.name].zenith_deg
    share = footprint_share(this, head_up)
    shade, assumed = shade_share(day, this, head_up, zenith)
    around, flags = _around(day, this)
    if 1 - share + shade > settings.max_shade_contamination:
        raise NotEvaluated(
            f"the head sees {1 - share:.0%} foreign ground and {shade:.0%} of its own shade, "
            f"more than {settings.max_shade_contamination:.0%} together: change height_cm or patch")
    if share < settings.min_footprint:
        flags += ("small footprint share",)
    if assumed:
        flags += ("head radius not stated",)
    if all(day.darks[c.logger, c.column] is None for c in (head_up, head_down)):
        flags += ("no dark reading",)
    if zenith > settings.zenith_qualified_deg:
        flags += (f"sun lower than {90 - settings.zenith_qualified_deg:.0f} degrees: "
                  "indicative only",)
    elif zenith > settings.zenith_standard_deg:
        flags += (f"sun lower than {90 - settings.zenith_standard_deg:.0f} degrees",)
    flags += ("gain ratio not checked by swapping", "surroundings and shade not corrected")
    slope = np.tan(np.radians(min(zenith, 85.0)))
    inputs = (
        fixed("up", float(up.mean())), fixed("down", float(down.mean())),
        fixed("footprint_share", share), fixed("shade_share", shade), around,
        gain(head_up, "up_gain_error"), gain(head_down, "down_gain_error"),
        zero(day, head_up, "up_zero_error", settings.zero_offset_u_w_m2 / 3),
        zero(day, head_down, "down_zero_error", settings.zero_offset_u_w_m2),
        Input("directional_error", 0.0,
              settings.beam_fraction * settings.directional_limit_w_m2 * HALF_WIDTH
              / (1000.0 * max(np.cos(np.radians(zenith)), 0.1)),
              f"{head_down.gain_scope}:direction", "directional response of the upper head",
              "rectangular"),
        Input("levelling_error", 0.0,
              settings.beam_fraction * slope * np.radians(settings.levelling_u_deg) / np.sqrt(2),
              pass_scope(day, this), "levelling of the upper head in the hand"),
        Input("shade_error", 0.0, HALF_WIDTH, f"{head_up.logger}:shade",
              "shade of the head on the ground, not corrected", "rectangular"),
        Input("contamination_error", 0.0, HALF_WIDTH, f"{day.name}:{this.surface}:contamination",
              "foreign ground in the head's view, not corrected", "rectangular"),
    )
    residual = (up - value * down) / down.mean()
    within = mean_of_series(residual, unit="1", method="ratio of sums")
    raw = value
    if any(day.darks[c.logger, c.column] is not None for c in (head_up, head_down)):
        raw = _without_darks(day, this)
    return PassValue(raw, value, within.u, within.n_eff, inputs,
                     calibration_flags(day, [head_up, head_down]) + flags,
                     (("raw", raw), ("dark readings", value)))


def footprint_share(this: Pass, head: Channel) -> float:
    """Return the share of a level head's view that the patch fills, the head over its centre.

    A head of limited view is given the largest circle within the patch.

    Raises
    ------
    NotEvaluated
        If the sheet states no size of the patch.
    """
    if np.isnan(this.length_m):
        raise NotEvaluated(f"width_m and length_m of patch {this.patch!r} are missing")
    half_angle = head.half_angle_deg or 90.0
    if half_angle < 90:
        smaller = np.nanmin([this.length_m, this.width_m])
        return float(limited_share(smaller / 2, this.height_m, half_angle))
    if np.isnan(this.width_m):
        return float(disc_share(this.length_m / 2, this.height_m))
    half_width, half_length = this.width_m / 2, this.length_m / 2
    return float(rectangle_share(-half_length, half_length, -half_width, half_width,
                                 this.height_m))


def shade_share(day: Day, this: Pass, head: Channel, zenith_deg: float) -> tuple[float, bool]:
    """Return the share of the reflected signal lost to the head's shade; whether assumed."""
    settings = day.parameters.campaign.settings.albedo
    radius = head.head_radius_m
    assumed = radius is None
    if radius is None:
        radius = settings.head_radius_assumed_cm / 100
    shade = self_shade(radius, this.height_m, zenith_deg, settings.beam_fraction)
    return float(shade), assumed


def pass_scope(day: Day, this: Pass) -> str:
    """Return the scope id of what belongs to this pass alone."""
    return f"{day.name}:pass:{this.name}"


def _around(day: Day, this: Pass) -> tuple[Input, tuple[str, ...]]:
    entry = day.parameters.campaign.surfaces[this.surface].around
    settings = day.parameters.campaign.settings.albedo
    if entry is None:
        return Input("around_albedo", settings.around_albedo, settings.around_albedo_u,
                     f"{day.name}:{this.surface}:around", "albedo around the patch, assumed"), (
                         "albedo around the patch not stated",)
    return Input("around_albedo", entry.amount.value, entry.amount.u,
                 surface_scope("around", this.surface, entry),
                 "albedo around the patch, as stated"), ()


def _without_darks(day: Day, this: Pass) -> float:
    records = day.quality.passes[this.name]
    sums = []
    for quantity in ("shortwave_up", "shortwave_down"):
        channel = this.channels[quantity]
        index = (records.index if channel.logger == records.logger
                 else records.partners[channel.logger])
        sums.append(day.records[channel.logger].channels[channel.column][index])
    return float(ratio_of_sums(*sums))
