"""How far two dates may be compared: matched (A), partly matched (B), not matched (C), and why."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from surveykit.evidence.surfaces import Group
from surveykit.evidence.vegetation import bands_of
from surveykit.intake.params import Parameters

WORDS = {"A": "matched", "B": "partly matched", "C": "not matched"}
STATED_SKY = {"clear": "clear", "overcast": "diffuse", "broken": "mixed"}
OTHER_BANDS = "the bands differ"
SKY_WORDS = {"clear": "clear", "diffuse": "overcast", "mixed": "broken"}


@dataclass(frozen=True)
class Date:
    """One campaign as the comparison sees it: its parameters and its groups by key.

    `carried` keeps the groups at one common time once they were made (drift.py).
    """

    parameters: Parameters
    groups: dict[tuple[str, str, str], Group]
    carried: dict[tuple[str, str], tuple[dict[str, Group], str]] = field(default_factory=dict)

    @property
    def name(self) -> str:
        """Name of the campaign."""
        return self.parameters.campaign.campaign

    @property
    def families(self) -> dict[tuple[str, str], list[Group]]:
        """The groups by quantity and kind, which alone are compared, in order."""
        found: dict[tuple[str, str], list[Group]] = {}
        for group in self.groups.values():
            found.setdefault((group.quantity, group.kind), []).append(group)
        return found

    def find(self, surface: str, quantity: str, kind: str) -> Group | None:
        """Return the group of this key if it has an interval."""
        group = self.groups.get((surface, quantity, kind))
        return group if group is not None and group.result is not None else None


@dataclass(frozen=True)
class Class:
    """A class A, B or C with every reason that keeps it from A."""

    letter: str
    reasons: tuple[str, ...]

    @property
    def word(self) -> str:
        """The class as printed: matched, partly matched, not matched."""
        return WORDS[self.letter]


def sky_of(date: Date, group: Group) -> str:
    """Return the sky of a group's passes as observed, else as stated, else an empty text."""
    seen = [p.sky.kind for p in group.used if p.sky.kind]
    if seen:
        return max(dict.fromkeys(seen), key=seen.count)
    return STATED_SKY.get(date.parameters.campaign.conditions.sky or "", "")


def comparability(now: Date, then: Date, new: Group, old: Group,
                  controls: tuple[Group, Group] | None) -> Class:
    """Return the class of a pair of dates for one surface and quantity, with its reasons.

    Class limits are engineering defaults (settings.comparison); the rule that another sky, wet
    ground or a control too close to the air forbids a verdict is this project's.
    """
    limits = now.parameters.campaign.settings.comparison
    barred, lowered = [], []
    skies = sky_of(now, new), sky_of(then, old)
    if not all(skies):
        lowered.append("the sky was neither watched nor stated on both dates")
    elif skies[0] != skies[1]:
        barred.append(f"the sky differs: {SKY_WORDS[skies[0]]} now, "
                      f"{SKY_WORDS[skies[1]]} on {then.name}")
    elif skies[0] == "mixed":
        lowered.append("broken sky on both dates")
    for date in (now, then):
        rain = date.parameters.campaign.conditions.rain_48h_mm
        if rain is None:
            lowered.append(f"rain before {date.name} not stated")
        elif rain > limits.wet_rain_mm:
            barred.append(f"wet ground on {date.name}: {rain:g} mm of rain in 48 h")
        elif rain > limits.rain_max_mm:
            lowered.append(f"{rain:g} mm of rain in the 48 h before {date.name}")
    _match(lowered, "sun height", abs(new.mean("cos_zenith") - old.mean("cos_zenith")),
           limits.cos_zenith_match, "cosine of the zenith angle differs by {:.2f}")
    if new.quantity == "temperature":
        ratio = new.mean("irradiance_w_m2") / old.mean("irradiance_w_m2") - 1
        _match(lowered, "irradiance", abs(ratio), limits.irradiance_match,
               "irradiance differs by {:.0%}")
        _match(lowered, "wind", abs(new.mean("wind_m_s") - old.mean("wind_m_s")),
               limits.wind_match_m_s, "wind differs by {:.1f} m s-1")
    if new.quantity == "ndvi":
        if any(bands(a) != bands(b) for a, b in ((new, old), *([controls] if controls else []))):
            barred.append(OTHER_BANDS)
        elif any(None in pair for pair in bands(new)):
            lowered.append("the bands are not stated")
    if controls is None:
        missing = "no control with an interval on both dates"
        (barred if new.quantity == "temperature" else lowered).append(missing)
    elif new.quantity == "temperature":
        for date, group, control in zip((now, then), (new, old), controls, strict=True):
            excess = control.value - control.mean("air_k")
            if np.isnan(excess) or np.isnan(group.mean("air_k")):
                barred.append(f"air temperature on {date.name} is missing")
            elif excess < limits.min_control_excess_k:
                barred.append(f"the control is only {excess:.1f} K above the air on {date.name}")
    letter = "C" if barred else "B" if lowered else "A"
    return Class(letter, tuple(barred + lowered))


def _match(lowered: list[str], what: str, size: float, limit: float, words: str) -> None:
    if np.isnan(size):
        lowered.append(f"{what} not known on both dates")
    elif size > limit:
        lowered.append(words.format(size))


def bands(group: Group) -> frozenset[tuple[object, object]]:
    """Return centres and widths of all bands that a group's NDVI was read in."""
    return frozenset().union(*(bands_of(p.this, p.inputs) for p in group.used))
