"""What a head that looks down sees of its patch and its own shade, and what height does to it."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from surveykit.core import FloatArray, Input, IntArray
from surveykit.evidence.conditions import Day, Sky
from surveykit.evidence.parts import HALF_WIDTH, NotEvaluated, fixed, pass_scope, surface_scope
from surveykit.intake.footprints import HEMISPHERE_DEG, shares_along
from surveykit.intake.params import Channel
from surveykit.intake.params.defaults import AlbedoSettings
from surveykit.intake.passes import Pass
from surveykit.intake.paths import walk
from surveykit.physics.footprint import (
    disc_share,
    limited_share,
    rectangle_share,
    self_shade,
    upright_share,
)
from surveykit.physics.instrument import rod_shade
from surveykit.physics.shortwave import levelling_error

OPERATOR_M = (0.5, 1.75)  # width and height of a person, engineering default
ROD_TO_SUN_DEG = {"sun": 0.0, "across": 90.0, "away": 180.0}


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


def lane_effect(day: Day, this: Pass, down: FloatArray) -> float:
    """Return half the relative difference of the upper head between the lanes' two directions.

    NaN where no path is known or the lanes are not balanced. A slow change of the sun drops out.
    """
    where = walk(this, _times(day, this), day.parameters)
    if where is None or this.lanes % 2:
        return float("nan")
    lane = np.floor(where.y_m / this.width_m * this.lanes)
    good = ~where.turning & np.isfinite(lane)
    if good.sum() < 10:
        return float("nan")
    steps = np.arange(down.size, dtype=np.float64)
    way = np.where(lane % 2 == 0, 1.0, -1.0)[good]
    design = np.column_stack([np.ones(way.size), steps[good] - steps[good].mean(), way])
    mean, _, half = np.linalg.lstsq(design, down[good], rcond=None)[0]
    return float(half / mean)


def lean_deg(effect: float, zenith_deg: float, beam_fraction: float) -> float:
    """Return the tilt along the lanes [deg] whose levelling error is the lanes' effect.

    The sun is taken to stand along the lanes; where it stands across them the tilt is larger.
    """
    one = levelling_error(zenith_deg, 1.0, np.array([0.0, 180.0]), beam_fraction)
    return abs(effect) / float(np.ptp(one) / 2)


def foreign_ground(day: Day, this: Pass, head: Channel,
                   around: Input) -> tuple[list[Input], tuple[str, ...]]:
    """Return the inputs of foreign ground in view, and flags; `around` is what it is taken for."""
    settings = day.parameters.campaign.settings.albedo

    def share(height_m: float) -> float:
        along = shares_along(this, head, height_m, _times(day, this), day.parameters)
        if along is None or not np.isfinite(along).any():
            return footprint_share(this, head, height_m)
        return float(np.nanmean(along))

    flags: tuple[str, ...] = ()
    if head.half_angle_deg is None:
        flags = (f"field of view of {head.logger} not stated: a hemisphere taken",)
    footprint_share(this, head, this.height_m)
    return [
        fixed("footprint_share", share(this.height_m)),
        fixed("footprint_per_m", _per_m(day, this, share)), fixed(around.name, around.value),
        Input("footprint_error", 0.0, settings.footprint_u, f"{day.name}:{this.surface}:footprint",
              "share of the view that the patch fills"),
        Input("around_error", 0.0, around.u, around.scope, around.source, around.distribution),
        Input("contamination_error", 0.0, HALF_WIDTH, f"{day.name}:{this.surface}:contamination",
              "foreign ground in the head's view, not corrected", "rectangular"),
        Input("height_error", 0.0, settings.height_u_cm / 100, pass_scope(day, this),
              "height of the head above the ground"),
    ], flags


def shade_share(day: Day, this: Pass, head: Channel, sky: Sky, zenith_deg: float,
                radius_m: float, height_m: float) -> float:
    """Return the share of the reflected signal that head and rod take by their shade."""
    settings = day.parameters.campaign.settings.albedo
    beam = settings.beam_fraction * {"diffuse": 0.0, "mixed": 0.5}.get(sky.kind, 1.0)
    lost = float(self_shade(radius_m, height_m, zenith_deg, beam))
    side = ROD_TO_SUN_DEG.get(this.rod_side)
    if head.rod_width_m is not None and side is not None:
        lost += beam * float(rod_shade(head.rod_width_m, settings.rod_length_m, height_m,
                                       zenith_deg, side))
    return lost


def own_shade(day: Day, this: Pass, head: Channel, sky: Sky,
              zenith_deg: float) -> tuple[list[Input], tuple[str, ...]]:
    """Return the inputs of the shade of head and rod on the ground it sees, and flags.

    A head of unstated radius may be anything up to the assumed one: half of its shade is taken,
    and as much again either side.
    """
    settings = day.parameters.campaign.settings.albedo
    flags: tuple[str, ...] = ()
    radius_m, known = head.head_radius_m, 1.0
    if radius_m is None:
        radius_m, known = settings.head_radius_assumed_cm / 100, 0.5
        flags = ("head radius not stated",)
    if head.rod_width_m is not None and not this.rod_side:
        flags += ("side of the rod not written: its shade is left out",)

    def share(height_m: float) -> float:
        return known * shade_share(day, this, head, sky, zenith_deg, radius_m, height_m)

    u = HALF_WIDTH if known < 1 else settings.self_shade_u
    return [
        fixed("shade_share", share(this.height_m)),
        fixed("shade_per_m", _per_m(day, this, share)),
        Input("shade_error", 0.0, u, f"{head.logger}:shade",
              "shade of the head on the ground", "rectangular" if known < 1 else "normal"),
    ], flags


def operator_inputs(day: Day, this: Pass) -> list[Input]:
    """Return what the operator does, of whom the sheet tells: a plate in both heads' views.

    It hides sky, of which only the diffuse part matters, and ground; dark or bright, it changes
    the albedo by as much as it fills of them, either way.
    """
    settings = day.parameters.campaign.settings.albedo
    if not this.operator_side:
        return []
    width, tall = OPERATOR_M
    sky, ground = upright_share(width, [max(tall - this.height_m, 0.0), min(this.height_m, tall)],
                                settings.operator_distance_m)
    whole = float(np.hypot((1 - settings.beam_fraction) * sky, ground))
    return [Input("operator_error", 0.0, whole * float(HALF_WIDTH), f"{day.name}:operator",
                  f"the operator, {settings.operator_distance_m:g} m away", "rectangular")]


def treat(inputs: dict[str, Input], ratio: float, settings: AlbedoSettings,
          stated: bool) -> tuple[dict[str, Input], tuple[str, ...]]:
    """Decide what of shade and surroundings is corrected; refuse a pass that sees too little.

    Corrected up to `max_corrected` together (surroundings only where their albedo is stated);
    beyond that both stay in the uncertainty, whole, up to `max_shade_contamination`.

    Raises
    ------
    NotEvaluated
        If they exceed that, or too little of the view is lit patch.
    """
    share, shade = inputs["footprint_share"].value, inputs["shade_share"].value
    around = inputs["around_albedo"].value
    lit = share - shade
    if lit < settings.min_lit:
        raise NotEvaluated(
            f"the head sees {1 - share:.0%} foreign ground and {shade:.0%} of its own shade: less "
            f"than {settings.min_lit:.0%} of its view is lit patch; change height_cm or patch")
    patch = (ratio - (1 - share) * around) / lit
    contrast = abs(around - patch) / patch if patch > 0 else np.inf
    effect = shade + contrast * (1 - share)
    if effect > settings.max_shade_contamination:
        raise NotEvaluated(
            f"foreign ground and the head's own shade change the albedo by {effect:.0%}, more than "
            f"{settings.max_shade_contamination:.0%}: change height_cm or patch")
    flags: tuple[str, ...] = ("small footprint share",) if share < settings.min_footprint else ()
    small = effect <= settings.max_corrected
    if not small:
        flags += (f"shade and surroundings above {settings.max_corrected:.0%}: not corrected",)
    seen = small and stated and settings.correct_surroundings
    shaded = small and settings.correct_self_shade
    if not seen and small:
        flags += ("surroundings not corrected",)
    if not shaded and small:
        flags += ("own shade not corrected",)
    held = {"surroundings_corrected": fixed("surroundings_corrected", float(seen)),
            "shade_corrected": fixed("shade_corrected", float(shaded))}
    if not shaded:
        error = inputs["shade_error"]
        held["shade_error"] = Input(error.name, 0.0, HALF_WIDTH, error.scope,
                                    "shade of the head on the ground, not corrected", "rectangular")
    if seen:
        held["contamination_error"] = fixed("contamination_error", 0.0)
    return inputs | held, flags


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


def _times(day: Day, this: Pass) -> IntArray:
    records = day.quality.passes[this.name]
    return day.records[records.logger].time_ns[records.index]


def _per_m(day: Day, this: Pass, share: Callable[[float], float]) -> float:
    """Return the slope of a share with height [m-1], over what the height is known to."""
    u_m = day.parameters.campaign.settings.albedo.height_u_cm / 100
    step = min(u_m or this.height_m / 2, this.height_m / 2)
    return (share(this.height_m + step) - share(this.height_m - step)) / (2 * step)
