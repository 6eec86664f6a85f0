"""What derived rows are made of: the groups of a day, their draws, and rows of results."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from surveykit.core import Input
from surveykit.evidence.conditions import Day
from surveykit.evidence.parts import surface_scope
from surveykit.evidence.surfaces import Group
from surveykit.statistics.draws import Draws, Result, combine, summarise

Row = dict[str, Any]


@dataclass(frozen=True)
class Asked:
    """One product of one surface, and all that it may be made of."""

    day: Day
    groups: tuple[Group, ...]
    draws: Draws
    coverage: float
    surface: str
    product: str

    def of(self, quantity: str) -> list[Group]:
        """Return the groups of the surface and a quantity that have a value."""
        return [g for g in self.groups
                if g.key[:2] == (self.surface, quantity) and np.isfinite(g.value)]

    @property
    def broadband(self) -> Input | None:
        """The surface's broadband emissivity, if stated."""
        entry = self.day.parameters.campaign.surfaces[self.surface].emissivity_broadband
        return None if entry is None else Input(
            "emissivity_broadband", float(entry.value or 0), float(entry.u or 0),
            surface_scope("emissivity broadband", self.surface, entry), "")

    def missing(self, what: str) -> Row:
        """Return the row of a product that lacks something."""
        return self.row("", "1", None, note=f"{what} is missing")

    def row(self, form: str, unit: str, result: Result | None, *, value: float = np.nan,
            note: str = "") -> Row:
        """Return a row of the table `derived`; without a result there is no interval."""
        row: Row = {
            "campaign": self.day.name, "surface": self.surface, "product": self.product,
            "form": form, "unit": unit, "value": value, "u": np.nan, "lower": np.nan,
            "upper": np.nan, "coverage": self.coverage, "note": note,
            "status": "value only" if np.isfinite(value) else "not evaluated"}
        if result is not None:
            s = summarise(result, self.coverage)
            row |= {"value": s.value, "u": s.u, "lower": s.lower, "upper": s.upper, "status": "ok"}
        return row

    def made(self, form: str, unit: str, function: Callable[..., Any],
             parts: Sequence[Group | Input], note: str = "") -> Row:
        """Return a row of a function of groups and inputs; without repeats it has a value only."""
        results = [p.result if isinstance(p, Group) else self._known(p) for p in parts]
        if any(r is None for r in results):
            return self.row(form, unit, None, value=float(function(*(p.value for p in parts))),
                            note="; ".join(filter(None, [note, "no repeats: no interval"])))
        return self.row(form, unit, combine(function, *(r for r in results if r is not None)),
                        note=note)

    def _known(self, one: Input) -> Result:
        moved = one.value + one.u * self.draws.standard(one.scope, one.distribution)
        return Result(one.value, moved, moved, ())
