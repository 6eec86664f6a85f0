"""What there is to visit: patches from the campaign's own field sheet or from an earlier one."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from surveykit.core import InputError
from surveykit.intake.fieldsheet import Sheet, read_sheet
from surveykit.opening import Survey, open_file

NAN = float("nan")


@dataclass(frozen=True)
class Patch:
    """One marked area: its size [m], NaN where unknown, and the ways to read it."""

    surface: str
    name: str
    width_m: float = NAN
    length_m: float = NAN
    heads: tuple[str, ...] = field(default=())

    @property
    def across_m(self) -> float:
        """The smaller side, or the diameter of a disc; NaN where unknown."""
        return float(np.fmin(self.width_m, self.length_m))


def patches(survey: Survey) -> tuple[tuple[Patch, ...], str]:
    """Return the patches to visit and the sentence that says where they are from."""
    for one in (survey, *(open_file(p) for p in reversed(survey.parameters.earlier))):
        try:
            sheet = read_sheet(one.parameters.sheet_path, one.parameters)
        except InputError:
            continue
        found = tuple(p for p in _from_sheet(sheet) if p.surface in survey.campaign.surfaces)
        if found:
            return found, f"Patches as on the field sheet of {one.campaign.campaign}."
    heads = offered(survey)
    return (tuple(Patch(surface, f"{surface}-1", heads=heads)
                  for surface in survey.campaign.surfaces),
            "No field sheet names patches yet: one patch a surface, its size not known.")


def _from_sheet(sheet: Sheet) -> tuple[Patch, ...]:
    found: dict[tuple[str, str], Patch] = {}
    for entry in sheet.entries:
        if entry.entry != "pass":
            continue
        old = found.get((entry.surface, entry.patch), Patch(entry.surface, entry.patch))
        head = entry.quantity if entry.quantity != "temperature" else entry.mode or "longwave"
        width, length = (new if np.isfinite(new) else kept for new, kept in (
            (entry.width_m, old.width_m), (entry.length_m, old.length_m)))
        found[entry.surface, entry.patch] = Patch(
            entry.surface, entry.patch, width, length,
            old.heads if head in old.heads else (*old.heads, head))
    return tuple(found.values())


def offered(survey: Survey) -> tuple[str, ...]:
    """Return the ways to read that the campaign's loggers offer; contact is left to the crew."""
    held = {c.quantity for name in survey.campaign.loggers
            for c in survey.parameters.channels(name)}
    words = {"brightness_temperature": "stand-off", "longwave_up": "longwave",
             "shortwave_up": "albedo", "red_up": "ndvi"}
    return tuple(word for quantity, word in words.items() if quantity in held)
