"""The page that lists every report of a project, with key numbers and links to each."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import pandas as pd

from . import wording as w
from .markup import Cell, Group, Html, Row, grouped_table, paragraph, table
from .page import render
from .phrases import SHOWN


@dataclass(frozen=True)
class Entry:
    """One report: its address from the page, its run's facts, its tables surfaces and changes."""

    address: str
    facts: Mapping[str, Any]
    surfaces: pd.DataFrame
    changes: pd.DataFrame


def contents_page(entries: Sequence[Entry]) -> str:
    """Return the page as HTML, campaigns by date; equal reports give equal bytes."""
    ordered = sorted(entries, key=lambda e: (str(e.facts["date"]), str(e.facts["campaign"])))
    blocks = [_campaigns(ordered), _values(ordered)]
    facts = {"line": f"{w.plural(len(ordered), 'report')} in this folder"}
    return render("contents.html.j2", facts, [], blocks=blocks,
                  links=frozenset(e.address for e in ordered))


def _campaigns(entries: Sequence[Entry]) -> Html:
    heads = {"Campaign": "long", "Date": "short", "Site": "text", "Passes": "number",
                      "Evaluated": "short", "Changed": "text"}
    rows: list[Row] = []
    for entry in entries:
        known = entry.surfaces["status"].ne("not evaluated")
        judged = entry.changes["verdict"].fillna("").ne("")
        changed = entry.changes["verdict"].isin(SHOWN)
        rows.append((
            _linked(entry), w.date_text(str(entry.facts["date"])), str(entry.facts["site"]),
            w.count(int(entry.surfaces["n_passes"].sum())),
            f"{w.count(int(known.sum()))} of {w.count(len(known))} values",
            f"{w.count(int(changed.sum()))} of {w.count(int(judged.sum()))} judged"
            if judged.any() else Cell("none judged", quiet=True)))
    return table("Campaigns, by date.", heads, rows, empty="There is no report yet.")


def _linked(entry: Entry) -> Cell:
    return Cell(str(entry.facts["title"]), link=entry.address)


def _values(entries: Sequence[Entry]) -> Html:
    """Return value ± U of every surface on every date, a group a surface."""
    labels = {name: label for e in entries for name, label in e.facts["surfaces"].items()}
    frames = [e.surfaces.assign(place=place) for place, e in enumerate(entries)]
    known = pd.concat(frames).dropna(subset=["value"]) if frames else pd.DataFrame()
    if known.empty:
        return paragraph("No surface has a value yet.", "empty")
    families = w.families(known)
    groups: list[Group] = []
    for surface, block in known.groupby(known["surface"].astype(str)):
        rows: list[Row] = []
        for place, some in block.groupby("place"):
            told = {(row["quantity"], row["kind"]): w.interval(
                row["value"], row["lower"], row["upper"], w.places(row["quantity"]))
                for row in some.to_dict("records")}
            entry = entries[int(str(place))]
            rows.append([_linked(entry), w.date_text(str(entry.facts["date"])),
                         *(told.get(pair, "") for pair, _ in families)])
        groups.append((w.label(surface, labels), rows))
    heads = {"Campaign": "long", "Date": "short"} | {
        w.heading(*pair, str(some["unit"].iloc[0])): "number" for pair, some in families}
    return grouped_table("Value ± U of each surface at its passes’ own times; weather differs "
                         "between dates, so read changes in the reports.", heads, groups, empty="")
