"""Trends of a surface over three dates or more, each date held against the control's weather.

Temperature enters as the ratio of the excesses over the air, surface to control, at the latest
date's excess of the control; albedo and NDVI as the difference to the control, else by
themselves. A trend is established where two lines agree: one that knows the uncertainty of every
date (and what the dates share), and one that takes it from the scatter about the line.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import pandas as pd

from surveykit.core import FloatArray, table
from surveykit.evidence.changes import (
    air_of,
    drift_term,
    interventions,
    model_share,
    zenith_term,
)
from surveykit.evidence.comparability import Date, comparability
from surveykit.evidence.drift import carried
from surveykit.evidence.surfaces import Group
from surveykit.statistics.draws import Draws, Result, combine, summarise
from surveykit.statistics.trends import ordinary, slope_weights, theil_sen
from surveykit.statistics.verdicts import NO_DIFFERENCE_SHOWN, holm, verdict

DATES = 3
MANY_DATES = 5  # for the methods that need no normal errors
NOT_ESTABLISHED = "trend not established"
METHODS = ("weighted line", "ordinary line", "median of slopes")


def trends(now: Date, earlier: Sequence[Date], draws: Draws) -> pd.DataFrame:
    """Return the table `trends`: lines through the dates of each surface, quantity and kind."""
    dates = sorted([*earlier, now], key=lambda date: date.parameters.campaign.date)
    control = now.parameters.campaign.comparison.control or ""
    leads: dict[tuple[str, str], list[dict[str, Any]]] = {}
    rows: list[dict[str, Any]] = []
    for key in now.groups:
        if key[0] == control or len(dates) < DATES:
            continue
        some = _rows(now, dates, key, control, draws)
        rows += some
        if some:
            leads.setdefault(key[1:], []).append(some[0])
    for (quantity, _), some in leads.items():
        _judge(some, now, quantity)
    for row in rows:
        for extra in ("span", "both"):
            row.pop(extra, None)
    return table("trends", rows)


def _judge(rows: list[dict[str, Any]], now: Date, quantity: str) -> None:
    """Set the verdicts of one family: the weighted row speaks where the ordinary line agrees."""
    campaign = now.parameters.campaign
    coverage = campaign.settings.statistics.coverage
    for row, p in zip(rows, holm([row["both"] for row in rows]), strict=True):
        row["verdict"] = verdict(row["slope"] * row["span"], float(p),
                                 campaign.relevant_change.of(quantity), coverage=coverage)
        if row["verdict"] == NO_DIFFERENCE_SHOWN:
            why = "" if row["p"] >= 1 - coverage else ": the two lines disagree"
            row["note"] = "; ".join(t for t in (NOT_ESTABLISHED + why, row["note"]) if t)


def _rows(now: Date, dates: Sequence[Date], key: tuple[str, str, str], control: str,
          draws: Draws) -> list[dict[str, Any]]:
    new, control_key = now.find(*key), (control, *key[1:])
    if new is None:
        return []
    with_control = all(d.find(*control_key) is not None for d in dates if d.find(*key))
    used, points, notes = [], [], []
    for date in dates:
        old = date.find(*key)
        if old is None:
            notes.append(f"{date.name}: no value")
            continue
        pair = (now.find(*control_key), date.find(*control_key)) if with_control else (None, None)
        controls = (pair[0], pair[1]) if pair[0] and pair[1] else None
        grade = comparability(now, date, new, old, controls)
        if grade.letter == "C":
            notes.append(f"{date.name} left out: {grade.reasons[0]}")
            continue
        points.append(_point(now, date, new, old, controls, grade.letter, draws))
        used.append(date)
    if len(used) < DATES:
        return []
    days = np.array([d.parameters.campaign.date for d in used], dtype="datetime64[D]")
    years = (days - days[-1]).astype(np.float64) / 365.25
    if np.unique(years).size < DATES:
        return []
    notes = [*interventions(used[-1], used[0], key[0]), *notes]
    unit = "K a-1" if key[1] == "temperature" else "a-1"
    base = {"campaign": now.name, "quantity": key[1], "kind": key[2], "surface": key[0],
            "control": control if with_control else "", "unit": unit, "dates": len(used),
            "first": str(days[0]), "last": str(days[-1]), "verdict": "", "note": "; ".join(notes),
            "coverage": now.parameters.campaign.settings.statistics.coverage}
    return _lines(base, years, points)


def _lines(base: dict[str, Any], years: FloatArray, points: list[Result]) -> list[dict[str, Any]]:
    coverage = base["coverage"]
    values = np.array([point.value for point in points])
    known = np.cov([point.systematic for point in points]) + np.diag(
        [sum(term.se**2 for term in point.sampling) for point in points])
    if not known.trace() > 0:
        return []
    weights = slope_weights(years, known + np.eye(values.size) * known.trace() * 1e-12)
    s = summarise(combine(lambda *y: sum(w * one for w, one in zip(weights, y, strict=True)),
                          *points), coverage)
    plain = ordinary(years, values, coverage)
    agree = s.value * plain.value > 0
    found = [(s.value, s.u, s.lower, s.upper, s.p_two_sided), tuple(plain)]
    if values.size >= MANY_DATES:
        found.append(tuple(theil_sen(years, values, coverage)))
    rows = [base | dict(zip(("slope", "u", "lower", "upper", "p"), numbers, strict=True))
            | {"method": method} for method, numbers in zip(METHODS, found, strict=False)]
    rows[0] |= {"span": float(np.ptp(years)),
                "both": max(s.p_two_sided, plain.p) if agree else 1.0}
    return rows


def _point(now: Date, date: Date, new: Group, old: Group, controls: tuple[Group, Group] | None,
           letter: str, draws: Draws) -> Result:
    """Return one date's value with the weather, or the control's own change, taken off."""
    if new.quantity == "temperature":
        assert controls  # class C without
        at_once = [carried(date, g.key, draws) for g in (old, controls[1])]
        old, control = (g for g in at_once if g is not None)
        assert old.result and control.result  # noqa: PT018
        excess = controls[0].value - controls[0].mean("air_k")
        form = model_share(now, new.surface, letter) * abs(excess)
        size = form * draws.standard(f"{date.name}:{new.surface}:trend by ratio to control")
        return combine(
            lambda s, a, c, b, f: (s - a) / (c - b) * excess + f, old.result, air_of(old, draws),
            control.result, air_of(control, draws), Result(0.0, size, size))
    assert old.result is not None
    terms = [zenith_term(now, new, old, draws, -1.0)]
    if controls is None:
        terms.append(drift_term(now, date, new, old, draws))
        return combine(lambda s, *t: s + sum(t), old.result, *terms)
    assert controls[1].result is not None
    terms.append(zenith_term(now, *controls, draws, 1.0))
    return combine(lambda s, c, *t: s - c + sum(t), old.result, controls[1].result, *terms)
