"""Differences between the surfaces of one date, and changes between dates."""

from __future__ import annotations

from itertools import combinations
from typing import Any

import numpy as np
import pandas as pd

from surveykit.core import table
from surveykit.evidence.changes import changes_between, zenith_term
from surveykit.evidence.comparability import OTHER_BANDS, SKY_WORDS, Date, bands, sky_of
from surveykit.evidence.drift import EXTRAPOLATED, at_common_time
from surveykit.evidence.surfaces import Group
from surveykit.statistics.draws import Draws, Result, combine, summarise
from surveykit.statistics.simultaneous import rank_probabilities, simultaneous
from surveykit.statistics.verdicts import (
    NOT_COMPARABLE,
    NOT_EVALUATED,
    could_have_missed,
    equivalence_p,
    holm,
    verdict,
)

DIFFERENCE_UNITS = {"temperature": "K", "albedo": "1", "ndvi": "1"}
OUTSIDE = "not in one of the families to be compared"


def differences(date: Date, draws: Draws) -> pd.DataFrame:
    """Return the table `differences`: every pair of surfaces of one quantity and kind.

    Temperatures stand at one common time. `lower` and `upper` are of the pair alone, `lower_all`
    and `upper_all` hold for the whole family; the verdict rests on p adjusted after Holm within
    the family: the quantity and kind, or the part of it that `comparison.families` names.
    """
    settings = date.parameters.campaign.settings
    rows: list[dict[str, Any]] = []
    for (quantity, _), family in date.families.items():
        carried, note = at_common_time(date, family, draws)
        some = [_difference(date, carried[a.surface], carried[b.surface], note, draws)
                for a, b in combinations(family, 2)]
        for part in _families(date, some, lambda row: (row["surface"], row["other"])):
            judged = [row for row in part if row["verdict"] == ""]
            ends = simultaneous([row["result"] for row in judged], settings.statistics.coverage)
            judge(part, "difference", date, quantity)
            for row, (lower, upper) in zip(judged, ends, strict=True):
                row |= {"lower_all": float(lower), "upper_all": float(upper)}
        rows += _without(some, "result", "dof", "p")
    for row in rows:
        row["coverage"] = settings.statistics.coverage
    return table("differences", rows)


def ranks(date: Date, draws: Draws) -> pd.DataFrame:
    """Return the table `ranks`: the probability of each surface to stand at each place.

    Place 1 is the highest value; temperatures stand at one common time.
    """
    rows: list[dict[str, Any]] = []
    for (quantity, kind), family in date.families.items():
        carried, _ = at_common_time(date, family, draws)
        known = {name: g.result for name, g in carried.items() if g.result is not None}
        if not known:
            continue
        shares = rank_probabilities(list(known.values()))
        rows += [{"campaign": date.name, "quantity": quantity, "kind": kind, "surface": name,
                  "place": place, "probability": float(share)}
                 for name, some in zip(known, shares, strict=True)
                 for place, share in enumerate(some, start=1)]
    return table("ranks", rows)


def changes(now: Date, earlier: tuple[Date, ...], draws: Draws) -> pd.DataFrame:
    """Return the table `changes`: this date against each earlier one, surface by surface.

    A second control is judged by itself: where it moved against the first, every verdict of that
    pair of dates and quantity says so.
    """
    rows: list[dict[str, Any]] = []
    second = now.parameters.campaign.comparison.second_control
    for then in earlier:
        some = changes_between(now, then, draws)
        for quantity, kind in dict.fromkeys((r["quantity"], r["kind"]) for r in some):
            judged = [r for r in some if (r["quantity"], r["kind"]) == (quantity, kind)
                      and r.pop("judged")]
            checked = [r for r in judged if r["surface"] == second]
            others = [r for r in judged if r["surface"] != second]
            judge(checked, "change", now, quantity)
            for part in _families(now, others, lambda row: (row["surface"],)):
                judge(part, "change", now, quantity)
            _null_test(checked, others, now.parameters.campaign.comparison.control or "")
        rows += _without(some, "result", "dof", "p", "p_adjusted", "judged")
    for row in rows:
        row["coverage"] = now.parameters.campaign.settings.statistics.coverage
    return table("changes", rows)


def judge(rows: list[dict[str, Any]], name: str, date: Date, quantity: str) -> None:
    """Set the verdicts of one family in place: Holm over those that can be judged."""
    campaign = date.parameters.campaign
    coverage = campaign.settings.statistics.coverage
    relevant = campaign.relevant_change.of(quantity)
    open_rows = [row for row in rows if row["verdict"] == ""]
    apart = holm([row["p"] for row in open_rows])
    alike = holm([max(equivalence_p(row[name], row["u"], row["dof"], relevant),
                      float(np.mean(row["result"].judged >= relevant)),
                      float(np.mean(row["result"].judged <= -relevant))) for row in open_rows])
    for row, p, same in zip(open_rows, apart, alike, strict=True):
        row["p_adjusted"] = float(p)
        row["verdict"] = verdict(row[name], float(p), relevant, coverage=coverage,
                                 p_equivalent=float(same))
        row["could_have_missed"] = could_have_missed(row["u"], row["dof"], coverage=coverage)


def _without(rows: list[dict[str, Any]], *keys: str) -> list[dict[str, Any]]:
    """Return the rows without what only their verdicts needed; their draws are let go."""
    return [{name: x for name, x in row.items() if name not in keys} for row in rows]


def _families(date: Date, rows: list[dict[str, Any]], who: Any) -> list[list[dict[str, Any]]]:
    """Return the rows by family; what lies in none is shown and not judged."""
    families = date.parameters.campaign.comparison.families
    if not families:
        return [rows]
    parts: dict[str, list[dict[str, Any]]] = {name: [] for name in families}
    for row in rows:
        home = [name for name, members in families.items() if set(who(row)) <= set(members)]
        if home:
            parts[home[0]].append(row)
        elif row["verdict"] == "":
            row["note"] = "; ".join(t for t in (OUTSIDE, row["note"]) if t)
    return list(parts.values())


def _null_test(checked: list[dict[str, Any]], others: list[dict[str, Any]],
               control: str) -> None:
    """Say on every row what the two controls did against each other; nothing should have moved."""
    for row in checked:
        if not np.isfinite(row["change"]):
            text = f"the controls could not be held against each other: {row['note']}"
        elif row["lower"] <= 0 <= row["upper"]:
            continue
        else:
            text = (f"the controls moved apart: {row['surface']} against {control} by "
                    f"{row['change']:+.2g}, so this may be the control's own change")
        for other in others:
            other["note"] = "; ".join(t for t in (text, other["note"]) if t)


def _difference(date: Date, a: Group, b: Group, note: str, draws: Draws) -> dict[str, Any]:
    row: dict[str, Any] = {
        "campaign": date.name, "quantity": a.quantity, "kind": a.kind, "surface": a.surface,
        "other": b.surface, "unit": DIFFERENCE_UNITS[a.quantity], "difference": np.nan,
        "u": np.nan, "lower": np.nan, "upper": np.nan, "end_error": np.nan,
        "lower_all": np.nan, "upper_all": np.nan,
        "p_adjusted": np.nan, "could_have_missed": np.nan, "verdict": "", "note": ""}
    for group in (a, b):
        if group.result is None:
            return row | {"verdict": NOT_EVALUATED,
                          "note": f"{group.surface}: {'; '.join(group.notes)}"}
    assert a.result is not None and b.result is not None  # noqa: PT018
    terms: list[Result] = [zenith_term(date, a, b, draws, 1.0)] if a.quantity == "albedo" else []
    made = combine(lambda x, y, *t: x - y + sum(t), a.result, b.result, *terms)
    s = summarise(made, date.parameters.campaign.settings.statistics.coverage)
    late = [f"{g.surface}: {EXTRAPOLATED}" for g in (a, b) if EXTRAPOLATED in g.notes]
    barred = _barred(date, a, b)
    single = [g.surface for g in (a, b) if len({p.this.patch for p in g.used}) == 1]
    if single:
        late.append(f"pseudo-replication: one patch of {' and of '.join(single)}, so this holds "
                    f"for {'these patches' if len(single) > 1 else 'that patch'}")
    return row | {"difference": s.value, "u": s.u, "lower": s.lower, "upper": s.upper,
                  "end_error": s.end_error, "p": s.p_two_sided, "dof": s.dof, "result": made,
                  "verdict": NOT_COMPARABLE if barred else "",
                  "note": "; ".join(t for t in (*barred, note, *late) if t)}


def _barred(date: Date, a: Group, b: Group) -> list[str]:
    """Return why two surfaces of one date cannot be compared: NDVI of other bands or skies."""
    if a.quantity != "ndvi":
        return []
    skies = [sky_of(date, g) for g in (a, b)]
    return [OTHER_BANDS] * (bands(a) != bands(b)) + [
        f"the sky differs: {SKY_WORDS.get(skies[0])} over {a.surface}, {SKY_WORDS.get(skies[1])} "
        f"over {b.surface}"] * (set(skies) == {"clear", "diffuse"})
