"""Tables of results: surfaces, passes, differences, changes, sources of uncertainty.

Each function takes a table of `core.TABLES` and returns `Html`. `labels` maps a surface's name to
the label that the user gave it. Where the arms of an interval differ by more than a fifth, both
ends stand in place of U.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import replace
from typing import Any

import pandas as pd

from . import wording as w
from .markup import Cell, Column, Html, table

Labels = Mapping[str, str] | None
NONE = Cell("none", quiet=True)


def surface_overview(surfaces: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a surface, one column a quantity and kind, notes by letter below."""
    families = w.families(surfaces)
    written = {pair: _values(block) for pair, block in families}
    letters: dict[str, str] = {}
    rows = []
    for name in dict.fromkeys(surfaces["surface"]):
        cells: list[str | Cell] = [w.label(name, labels)]
        for pair, block in families:
            found = block[block["surface"] == name]
            if found.empty:
                cells.append(Cell("not surveyed", quiet=True))
                continue
            row = found.iloc[0]
            note = _note(row)
            letter = letters.setdefault(note, _letter(len(letters))) if note else ""
            gone = row["status"] == "not evaluated"
            cell = Cell("not evaluated", quiet=True) if gone else written[pair][found.index[0]]
            cells.append(replace(cell, note=letter))
        rows.append(cells)
    units = {pair: w.unit_text(block["unit"].iloc[0]) for pair, block in families}
    heads = [Column("Surface"), *(Column(w.quantity_text(*pair) + (f", {u}" if u else ""), "number")
                                  for pair, u in units.items())]
    caption = f"Mean of each surface ± U, {_coverage(surfaces)}, over its passes' own times."
    return table(caption, heads, rows, empty="No surface was surveyed.",
                 notes=[(letter, w.sentence_case(note)) for note, letter in letters.items()])


def surface_table(surfaces: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a surface and quantity: value ± U, k, counts, status and why."""
    rows = []
    for pair, block in w.families(surfaces):
        values = _values(block)
        for index, row in block.iterrows():
            rows.append([w.label(row["surface"], labels), w.quantity_text(*pair),
                         values[index], w.unit_text(row["unit"]),
                         w.number(row["k"], 2), w.number(row["dof"], 0), w.count(row["n_patches"]),
                         w.count(row["n_passes"]), w.count(row["n_records"]), row["status"],
                         _note(row)])
    heads = [Column("Surface"), Column("Quantity"), Column("Value ± U", "number"), Column("Unit"),
             Column("k", "number"), Column("Degrees of freedom", "number"),
             Column("Patches", "number"), Column("Passes", "number"), Column("Records", "number"),
             Column("Status"), Column("Note", "long")]
    return table(f"Surfaces: mean ± U, {_coverage(surfaces)}, U = k times the standard "
                 "uncertainty.", heads, rows, empty="No surface was surveyed.")


def pass_table(passes: pd.DataFrame, labels: Labels = None, time_zone: str = "UTC") -> Html:
    """Return one row a pass: when, how, value and its uncertainty within the pass."""
    rows = []
    for row in passes.sort_values(["start_utc", "pass"]).to_dict("records"):
        decimals = w.places(row["quantity"])
        rows.append([row["pass"], w.label(row["surface"], labels),
                     w.quantity_text(row["quantity"], row["kind"]),
                     f"{row['start_utc'].tz_convert(time_zone):%H:%M:%S}",
                     f"{row['stop_utc'].tz_convert(time_zone):%H:%M:%S}",
                     w.number(row["value"], decimals) or NONE,
                     w.unit_text(row["unit"]), w.figures(row["u_within"]),
                     w.count(row["n_records"]), w.figures(row["n_effective"]),
                     w.number(row["zenith_deg"], 0), row["status"],
                     "; ".join(filter(None, (row["note"], row["flags"])))])
    heads = [Column("Pass"), Column("Surface"), Column("Quantity"), Column("From", "number"),
             Column("To", "number"), Column("Value", "number"), Column("Unit"),
             Column("u within", "number"), Column("Records", "number"),
             Column("Effective", "number"), Column("Sun zenith, °", "number"), Column("Status"),
             Column("Note", "long")]
    return table(f"Passes in order of time ({time_zone}), after trimming; u within is the standard "
                 "uncertainty of the pass mean from its own records.", heads, rows,
                 empty="No pass could be matched with records.")


def difference_table(differences: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a pair: difference ± U, adjusted p, what could have been missed, verdict."""
    rows = []
    for pair, block in w.families(differences):
        values = _values(block, "difference", sign=True)
        for index, row in block.iterrows():
            missed = w.expanded(row["could_have_missed"], w.places(pair[0]))
            rows.append([f"{w.label(row['surface'], labels)} {w.MINUS} "
                         f"{w.label(row['other'], labels)}", w.quantity_text(*pair),
                         values[index], w.unit_text(row["unit"]),
                         w.probability(row["p_adjusted"]), missed, row["verdict"], row["note"]])
    heads = [Column("Pair"), Column("Quantity"), Column("Difference ± U", "number"), Column("Unit"),
             Column("p, adjusted", "number"), Column("Could have missed", "number"),
             Column("Verdict"), Column("Note", "long")]
    return table(f"Differences between surfaces of this campaign, {_coverage(differences)}; p "
                 "after Holm within each quantity; verdicts weigh the difference against the "
                 "relevant one.", heads, rows, empty="No two surfaces could be compared.")


def change_table(changes: pd.DataFrame, labels: Labels = None, *,
                 judged_only: bool = False) -> Html:
    """Return one row a surface, quantity and method: change ± U, comparability, verdict."""
    shown = changes[changes["verdict"] != ""] if judged_only else changes
    rows = []
    for pair, block in w.families(shown):
        values = _values(block, "change", sign=True)
        for index, row in block.iterrows():
            rows.append([w.label(row["surface"], labels), w.quantity_text(*pair),
                         values[index], w.unit_text(row["unit"]),
                         row["verdict"] or Cell("not judged", quiet=True), row["comparability"],
                         _method(row["method"], w.label(row["control"], labels)), row["earlier"],
                         row["note"]])
    heads = [Column("Surface"), Column("Quantity"), Column("Change ± U", "number"), Column("Unit"),
             Column("Verdict"), Column("Conditions"), Column("Method"), Column("Since"),
             Column("Note", "long")]
    return table(f"Changes since earlier campaigns, {_coverage(shown)}.", heads, rows,
                 empty="No earlier campaign was named, so no change was looked for.")


def budget_table(budget: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a source of uncertainty, the largest share of each surface first."""
    rows = []
    for pair, block in w.families(budget):
        ordered = block.sort_values(["surface", "share", "scope"], ascending=[True, False, True],
                                    kind="stable")
        for row in ordered.to_dict("records"):
            rows.append([w.label(row["surface"], labels), w.quantity_text(*pair), row["source"],
                         w.figures(row["contribution"]), w.unit_text(_difference_unit(row["unit"])),
                         w.percent(row["share"]), row["scope"]])
    heads = [Column("Surface"), Column("Quantity"), Column("Source"),
             Column("Contribution to u", "number"), Column("Unit"),
             Column("Share of variance", "number"), Column("Shared as", "code")]
    return table("Sources of uncertainty: what each adds to the standard uncertainty u.", heads,
                 rows, empty="No uncertainty budget could be drawn up.")


def _values(block: pd.DataFrame, column: str = "value", *, sign: bool = False) -> dict[Any, Cell]:
    """Write a block's values ± U, what follows the value given the same room in every row."""
    texts = {index: w.interval(row[column], row["lower"], row["upper"], w.places(row["quantity"]),
                               sign=sign).partition(" ") for index, row in block.iterrows()}
    room = max((len(tail) for _, _, tail in texts.values()), default=0)
    return {index: Cell(value, tail=tail, room=room) if value else NONE
            for index, (value, _, tail) in texts.items()}


def _note(row: pd.Series) -> str:
    """Why a row is qualified, with what is known of u where there is no interval."""
    at_least = row["u_at_least"]
    if row["status"] != "value only" or math.isnan(at_least):
        return str(row["note"])
    known = w.with_unit(w.expanded(at_least, w.places(row["quantity"])),
                        _difference_unit(row["unit"]))
    return "; ".join(filter(None, (row["note"], "no interval",
                                   f"standard uncertainty at least {known}")))


def _difference_unit(unit: str) -> str:
    return "K" if unit == "degC" else unit


def _coverage(frame: pd.DataFrame) -> str:
    levels = sorted({*frame["coverage"].dropna()})
    return "coverage " + w.listing([f"{100 * level:g} %" for level in levels] or ["not stated"])


def _method(method: str, control: str) -> str:
    return f"{method} {control}" if method == "ratio to control" else (
        f"{method} against {control}" if control else method)


def _letter(n: int) -> str:
    return chr(ord("a") + n % 26) * (n // 26 + 1)
