"""Whether an albedo was measured under the conditions of ASTM E1918, one by one."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Literal, NamedTuple

import numpy as np

from surveykit.evidence.conditions import NS, Day
from surveykit.evidence.estimates import PassEstimate

# ASTM E1918: sun angle from its scope, the rest from memory; hours about solar noon for "midday"
SUN_DEG, SLOPE_DEG, HEIGHT_M, ACROSS_M, READINGS, AGREE, MIDDAY_H = 45, 9.5, 0.5, 4.0, 3, 0.01, 3
STATES = ("not met", "not recorded", "met")
State = Literal["met", "not met", "not recorded"]


class Condition(NamedTuple):
    """One condition: its name, whether it was met, and what was found instead."""

    name: str
    state: State
    found: str


def conditions(day: Day, one: PassEstimate, others: Sequence[PassEstimate]) -> list[Condition]:
    """Return the conditions of one albedo pass; `others` may hold more readings of its patch."""
    this = one.this
    slope = day.parameters.campaign.surfaces[this.surface].slope_deg
    u_m = day.parameters.campaign.settings.albedo.height_u_cm / 100
    across = float(np.nanmin([this.length_m, this.width_m]))
    hours = one.middle_ns / NS / 3600 + day.parameters.campaign.site.longitude / 15
    from_noon = abs(hours % 24 - 12)
    read = [e.value for e in others if e.evaluated and e.this.quantity == "albedo"
            and e.this.patch == this.patch and e.kind == one.kind]
    spread = float(np.ptp(read)) if read else np.nan
    few = f"{len(read)} of {READINGS} readings" if len(read) < READINGS else \
        f"readings within {spread:.3f}, not {AGREE:g}"
    return [
        _held("slope", slope, f"slope of {slope:g} degrees" if slope is not None else "",
              slope is not None and slope <= SLOPE_DEG),
        _held("sun", one.zenith_deg, f"sun {one.zenith_deg:.0f} degrees from the zenith, not "
              f"below {SUN_DEG}", one.zenith_deg < SUN_DEG),
        _held("midday", from_noon, f"{from_noon:.1f} h from solar noon", from_noon <= MIDDAY_H),
        _held("sky", one.sky.kind or None, f"sky {one.sky.kind}", one.sky.kind == "clear"),
        _held("height", this.height_m, f"head at {100 * this.height_m:.0f} cm, not "
              f"{100 * HEIGHT_M:.0f}", abs(this.height_m - HEIGHT_M) <= 2 * u_m),
        _held("size", across, f"patch {across:g} m across, not {ACROSS_M:g}", across >= ACROSS_M),
        _held("readings", len(read), few, len(read) >= READINGS and spread <= AGREE),
    ]


def worst(passes: Sequence[Sequence[Condition]]) -> list[Condition]:
    """Return for each condition the worst of several passes."""
    return [min(some, key=lambda c: STATES.index(c.state)) for some in zip(*passes, strict=True)]


def told(found: Sequence[Condition], *, name: str, like: str) -> str:
    """Return the conditions in words: all met, or what was not met, not recorded and met."""
    parts = {state: [c.found if state == "not met" else c.name for c in found if c.state == state]
             for state in STATES}
    if len(parts["met"]) == len(found):
        return f"conditions of {name} recorded and met"
    return "; ".join([f"{like}, deviations: " + ", ".join(parts["not met"] or ["none recorded"]),
                      *(f"{state}: {', '.join(parts[state])}" for state in STATES[1:]
                        if parts[state])])


def _held(name: str, value: float | str | None, found: str, met: bool) -> Condition:
    known = value is not None and (isinstance(value, str) or bool(np.isfinite(value)))
    return Condition(name, ("met" if met else "not met") if known else "not recorded", found)
