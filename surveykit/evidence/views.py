"""What a head that looks down sees of its patch and of its own shade, and what height does to it.

Neither is corrected yet: both stand in the budget as inputs that are zero by expectation.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import partial

import numpy as np

from surveykit.core import Input
from surveykit.evidence.conditions import Day
from surveykit.evidence.parts import HALF_WIDTH, NotEvaluated, fixed, pass_scope, surface_scope
from surveykit.intake.params import Channel
from surveykit.intake.passes import Pass
from surveykit.physics.footprint import disc_share, limited_share, rectangle_share, self_shade

HEMISPHERE_DEG = 90.0  # half-angle of a head that states none: it sees most of what is around


def footprint_share(this: Pass, head: Channel, height_m: float) -> float:
    """Return the share of a level head's view that the patch fills, the head over its centre.

    A head of limited view is given the largest circle within the patch.

    Raises
    ------
    NotEvaluated
        If the sheet states no size of the patch.
    """
    if np.isnan(this.length_m):
        raise NotEvaluated(f"width_m and length_m of patch {this.patch!r} are missing")
    half_angle = head.half_angle_deg or HEMISPHERE_DEG
    if half_angle < HEMISPHERE_DEG:
        smaller = np.nanmin([this.length_m, this.width_m])
        return float(limited_share(smaller / 2, height_m, half_angle))
    if np.isnan(this.width_m):
        return float(disc_share(this.length_m / 2, height_m))
    half_width, half_length = this.width_m / 2, this.length_m / 2
    return float(rectangle_share(-half_length, half_length, -half_width, half_width, height_m))


def foreign_ground(day: Day, this: Pass, head: Channel,
                   around: Input) -> tuple[list[Input], tuple[str, ...]]:
    """Return the inputs of foreign ground in view, and flags; `around` is what it is taken for."""
    share = partial(footprint_share, this, head)
    flags: tuple[str, ...] = ()
    if head.half_angle_deg is None:
        flags = (f"field of view of {head.logger} not stated: a hemisphere taken",)
    return [
        fixed("footprint_share", share(this.height_m)),
        fixed("footprint_per_m", _per_m(day, this, share)), fixed(around.name, around.value),
        Input("around_error", 0.0, around.u, around.scope, around.source, around.distribution),
        Input("contamination_error", 0.0, HALF_WIDTH, f"{day.name}:{this.surface}:contamination",
              "foreign ground in the head's view, not corrected", "rectangular"),
        Input("height_error", 0.0, day.parameters.campaign.settings.albedo.height_u_cm / 100,
              pass_scope(day, this), "height of the head above the ground"),
    ], flags


def own_shade(day: Day, this: Pass, head: Channel,
              zenith_deg: float) -> tuple[list[Input], tuple[str, ...]]:
    """Return the inputs of the head's shade on the ground it sees, and flags."""
    settings = day.parameters.campaign.settings.albedo
    flags: tuple[str, ...] = ()
    radius_m = head.head_radius_m
    if radius_m is None:
        radius_m, flags = settings.head_radius_assumed_cm / 100, ("head radius not stated",)

    def share(height_m: float) -> float:
        return float(self_shade(radius_m, height_m, zenith_deg, settings.beam_fraction))

    return [
        fixed("shade_share", share(this.height_m)),
        fixed("shade_per_m", _per_m(day, this, share)),
        Input("shade_error", 0.0, HALF_WIDTH, f"{head.logger}:shade",
              "shade of the head on the ground, not corrected", "rectangular"),
    ], flags


def albedo_around(day: Day, this: Pass) -> tuple[Input, tuple[str, ...]]:
    """Return the albedo of what surrounds a patch, stated or assumed, and flags."""
    entry = day.parameters.campaign.surfaces[this.surface].around
    settings = day.parameters.campaign.settings.albedo
    if entry is None:
        return Input("around_albedo", settings.around_albedo, settings.around_albedo_u,
                     f"{day.name}:{this.surface}:around", "albedo around the patch, assumed"), (
                         "albedo around the patch not stated",)
    return Input("around_albedo", entry.amount.value, entry.amount.u,
                 surface_scope("around", this.surface, entry),
                 "albedo around the patch, as stated"), ()


def _per_m(day: Day, this: Pass, share: Callable[[float], float]) -> float:
    """Return the slope of a share with height [m-1], over what the height is known to."""
    u_m = day.parameters.campaign.settings.albedo.height_u_cm / 100
    step = min(u_m or this.height_m / 2, this.height_m / 2)
    return (share(this.height_m + step) - share(this.height_m - step)) / (2 * step)
