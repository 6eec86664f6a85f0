"""The page that lists every report of a project, with key numbers and links to each."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from html import escape
from typing import Any

import pandas as pd

from . import wording as w
from .markup import Cell, Column, Html, Row, grouped_table, table
from .page import render
from .typeset import typeset

CHANGED = ("higher", "lower", "higher, small", "lower, small")


@dataclass(frozen=True)
class Entry:
    """One report: its address from the page, its run's facts, its tables surfaces and changes."""

    address: str
    facts: Mapping[str, Any]
    surfaces: pd.DataFrame
    changes: pd.DataFrame


@dataclass(frozen=True)
class _Linked(Cell):
    address: str = ""

    @property
    def html(self) -> str:
        return f'<a href="{escape(self.address)}">{escape(typeset(self.text))}</a>'


def contents_page(entries: Sequence[Entry]) -> str:
    """Return the page as HTML, campaigns by date; equal reports give equal bytes."""
    ordered = sorted(entries, key=lambda e: (str(e.facts["date"]), str(e.facts["campaign"])))
    blocks = [_campaigns(ordered), _values(ordered)]
    facts = {"line": f"{w.plural(len(ordered), 'report')} in this folder"}
    return render("contents.html.j2", facts, [], blocks=blocks,
                  links=frozenset(e.address for e in ordered))


def _campaigns(entries: Sequence[Entry]) -> Html:
    columns = [Column("Campaign", "long"), Column("Date", "short"), Column("Site"),
               Column("Passes", "number"), Column("Evaluated", "short"), Column("Changed", "text")]
    rows: list[Row] = []
    for entry in entries:
        known = entry.surfaces["status"].ne("not evaluated")
        judged = entry.changes["verdict"].fillna("").ne("")
        changed = entry.changes["verdict"].isin(CHANGED)
        rows.append((
            _Linked(str(entry.facts["title"]), address=entry.address),
            w.date_text(str(entry.facts["date"])), str(entry.facts["site"]),
            w.count(int(entry.surfaces["n_passes"].sum())),
            f"{w.count(int(known.sum()))} of {w.count(len(known))} values",
            f"{w.count(int(changed.sum()))} of {w.count(int(judged.sum()))} judged"
            if judged.any() else Cell("none judged", quiet=True)))
    return table("Campaigns, by date", columns, rows, empty="There is no report yet.")


def _values(entries: Sequence[Entry]) -> Html:
    """Return value ± U of every surface on every date, a group a surface."""
    labels: dict[str, str] = {}
    dates: dict[str, dict[int, dict[str, str]]] = {}
    kinds: dict[tuple[str, str], None] = {}
    for place, entry in enumerate(entries):
        labels |= {str(k): str(v) for k, v in entry.facts["surfaces"].items()}
        for row in entry.surfaces.to_dict("records"):
            quantity, kind = str(row["quantity"]), str(row["kind"])
            text = w.interval(float(row["value"]), float(row["lower"]), float(row["upper"]),
                              w.places(quantity))
            if text:
                kinds[(quantity, kind)] = None
                by_place = dates.setdefault(str(row["surface"]), {})
                by_place.setdefault(place, {})[w.quantity_text(quantity, kind)] = text
    order = [*w.PLACES]
    heads = [w.quantity_text(*pair) for pair in sorted(
        kinds, key=lambda pair: (order.index(pair[0]) if pair[0] in order else 9, pair[1]))]
    units = {w.quantity_text(q, k): w.unit_text("degC") if q == "temperature" else ""
             for q, k in kinds}
    columns = [Column("Campaign", "long"), Column("Date", "short"), *(
        Column(f"{head}, {units[head]}" if units[head] else head, "number") for head in heads)]
    groups: list[tuple[str, list[Row]]] = [(w.label(surface, labels), [
        (_Linked(str(entries[place].facts["title"]), address=entries[place].address),
         w.date_text(str(entries[place].facts["date"])),
         *(texts.get(head, "") for head in heads))
        for place, texts in by_date.items()]) for surface, by_date in sorted(dates.items())]
    return grouped_table("Value ± U of each surface at its passes’ own times; weather differs "
                         "between dates, so read changes in the reports", columns, groups,
                         empty="No surface has a value yet.")
