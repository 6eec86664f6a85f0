"""Differences between the surfaces of one date, and changes between dates."""

from __future__ import annotations

from itertools import combinations
from typing import Any

import numpy as np
import pandas as pd

from surveykit.core import table
from surveykit.evidence.changes import changes_between, zenith_term
from surveykit.evidence.comparability import Date
from surveykit.evidence.parts import HALF_WIDTH
from surveykit.evidence.surfaces import Group
from surveykit.statistics.draws import Draws, Result, combine, summarise
from surveykit.statistics.verdicts import (
    NO_DIFFERENCE_SHOWN,
    NOT_EVALUATED,
    could_have_missed,
    holm,
    verdict,
)

CONTROL_PASSES = 3  # at as many times, that show the day's course
DIFFERENCE_UNITS = {"temperature": "K", "albedo": "1", "ndvi": "1"}


def differences(date: Date, draws: Draws) -> pd.DataFrame:
    """Return the table `differences`: every pair of surfaces of one quantity and kind.

    The interval is that of the pair alone; the verdict rests on p adjusted after Holm within the
    quantity and kind. The day's course between the two mean times stands in the interval.
    """
    settings = date.parameters.campaign.settings
    rows: list[dict[str, Any]] = []
    for quantity, kind in dict.fromkeys((q, k) for _, q, k in date.groups):
        family = [g for g in date.groups.values() if (g.quantity, g.kind) == (quantity, kind)]
        some = [_difference(date, a, b, draws) for a, b in combinations(family, 2)]
        judge(some, "difference", date, quantity)
        rows += some
    for row in rows:
        row["coverage"] = settings.statistics.coverage
        for extra in ("dof", "p"):
            row.pop(extra, None)
    return table("differences", rows)


def changes(now: Date, earlier: tuple[Date, ...], draws: Draws) -> pd.DataFrame:
    """Return the table `changes`: this date against each earlier one, surface by surface."""
    rows: list[dict[str, Any]] = []
    for then in earlier:
        some = changes_between(now, then, draws)
        for quantity, kind in dict.fromkeys((r["quantity"], r["kind"]) for r in some):
            judge([r for r in some if (r["quantity"], r["kind"]) == (quantity, kind)
                   and r.pop("judged")], "change", now, quantity)
        rows += some
    coverage = now.parameters.campaign.settings.statistics.coverage
    for row in rows:
        row["coverage"] = coverage
        for extra in ("dof", "p", "p_adjusted"):
            row.pop(extra, None)
    return table("changes", rows)


def judge(rows: list[dict[str, Any]], name: str, date: Date, quantity: str) -> None:
    """Set the verdicts of one family in place: Holm over those that can be judged."""
    campaign = date.parameters.campaign
    coverage = campaign.settings.statistics.coverage
    relevant = getattr(campaign.relevant_change, quantity)
    open_rows = [row for row in rows if row["verdict"] == ""]
    for row, p in zip(open_rows, holm([row["p"] for row in open_rows]), strict=True):
        row["p_adjusted"] = float(p)
        row["verdict"] = verdict(row[name], float(p), relevant, coverage=coverage)
        if row["verdict"] == NO_DIFFERENCE_SHOWN:
            row["could_have_missed"] = could_have_missed(row["u"], row["dof"], coverage=coverage)


def _difference(date: Date, a: Group, b: Group, draws: Draws) -> dict[str, Any]:
    row: dict[str, Any] = {
        "campaign": date.name, "quantity": a.quantity, "kind": a.kind, "surface": a.surface,
        "other": b.surface, "unit": DIFFERENCE_UNITS[a.quantity], "difference": np.nan,
        "u": np.nan, "lower": np.nan, "upper": np.nan, "p_adjusted": np.nan,
        "could_have_missed": np.nan, "verdict": "", "note": ""}
    for group in (a, b):
        if group.result is None:
            return row | {"verdict": NOT_EVALUATED,
                          "note": f"{group.surface}: {'; '.join(group.notes)}"}
    assert a.result is not None and b.result is not None  # noqa: PT018
    terms, note = _day_course(date, a, b, draws)
    made = combine(lambda x, y, *t: x - y + sum(t), a.result, b.result, *terms)
    s = summarise(made, date.parameters.campaign.settings.statistics.coverage)
    return row | {"difference": s.value, "u": s.u, "lower": s.lower, "upper": s.upper,
                  "p": s.p_two_sided, "dof": s.dof, "note": note}


def _day_course(date: Date, a: Group, b: Group, draws: Draws) -> tuple[list[Result], str]:
    """Return what the day's course can have done between the mean times of two surfaces.

    For an albedo that is the sun's height. For a temperature, not corrected yet: the control's
    linear course times the time between, allowed on either side (rectangular).
    """
    if a.quantity != "temperature":
        return [zenith_term(date, a, b, draws, 1.0)], ""
    control = date.find(date.parameters.campaign.comparison.control or "", a.quantity, a.kind)
    time_h = np.array([p.middle_ns for p in control.used]) / 3.6e12 if control else np.zeros(0)
    if control is None or np.unique(time_h).size < CONTROL_PASSES:
        return [], "the day's course was not watched by a control"
    slope = float(np.polyfit(time_h - time_h.mean(), [p.value for p in control.used], 1)[0])
    apart_h = (a.mean("middle_ns") - b.mean("middle_ns")) / 3.6e12
    z = draws.standard(f"{date.name}:day course", "rectangular")
    moved = slope * apart_h * HALF_WIDTH * z
    return [Result(0.0, moved, moved)], "not corrected for the day's course; it is in the interval"
