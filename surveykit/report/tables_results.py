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
from .markup import Cell, Column, Group, Html, grouped_table, table

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
    caption = f"Mean of each surface ± U ({_coverage(surfaces)}), at its passes’ own times."
    return table(caption, heads, rows, empty="No surface was surveyed.",
                 notes=[(letter, w.sentence_case(note)) for note, letter in letters.items()])


def surface_table(surfaces: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a surface, grouped by quantity: value ± U, k, counts, status and why."""
    groups: list[Group] = []
    for (quantity, kind), block in w.families(surfaces):
        values = _values(block)
        groups.append((_heading(quantity, kind, block), [
            [w.label(row["surface"], labels), values[index], w.number(row["k"], 2),
             _dof(row["dof"]), w.count(row["n_patches"]), w.count(row["n_passes"]),
             w.count(row["n_records"]), _word(row["status"], _note(row))]
            for index, row in block.iterrows()]))
    heads = [_surface_column(surfaces, labels), _with_u("Value"), Column("k", "number"),
             Column("Degrees of freedom", "number"), Column("Patches", "number"),
             Column("Passes", "number"), Column("Records", "number"), Column("Status", "long")]
    return grouped_table(f"Surfaces: mean ± U, {_coverage(surfaces)}, U = k times the standard "
                         "uncertainty.", heads, groups, empty="No surface was surveyed.")


def pass_table(passes: pd.DataFrame, labels: Labels = None, time_zone: str = "UTC") -> Html:
    """Return one row a pass, grouped by quantity: when, value, uncertainty within the pass."""
    groups: list[Group] = []
    for (quantity, kind), block in w.families(passes.sort_values(["start_utc", "pass"])):
        shared = _shared_flags(block)
        groups.append((_heading(quantity, kind, block)
                       + (f"; every pass: {', '.join(shared)}" if shared else ""), [
            [row["pass"], w.label(row["surface"], labels),
             f"{row['start_utc'].tz_convert(time_zone):%H:%M:%S}",
             f"{row['stop_utc'].tz_convert(time_zone):%H:%M:%S}",
             w.number(row["value"], w.places(quantity)) or NONE,
             w.expanded(row["u_within"], w.places(quantity) + 1), w.count(row["n_records"]),
             w.number(row["n_effective"], 0), w.number(row["zenith_deg"], 0),
             _word(row["status"], "; ".join(filter(None, (row["note"], *(
                 flag for flag in row["flags"].split("; ") if flag not in shared)))))]
            for row in block.to_dict("records")]))
    heads = [Column("Pass", "short"), _surface_column(passes, labels), Column("From", "number"),
             Column("To", "number"), Column("Value", "number"),
             Column(f"u{w.NO_BREAK}within", "number"), Column("Records", "number"),
             Column("Effective", "number"),
             Column(f"Zenith,{w.NO_BREAK}°", "number"), Column("Status")]
    return grouped_table(
        f"Passes in order of time ({time_zone}), after trimming. u within: standard uncertainty of "
        "the pass mean from its own records; effective: records reduced for their correlation; "
        "zenith: of the sun.",
        heads, groups, empty="No pass could be matched with records.")


def difference_table(differences: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a pair, grouped by quantity: difference ± U, p, what was missed, verdict."""
    groups: list[Group] = []
    for (quantity, kind), block in w.families(differences):
        values = _values(block, "difference", sign=True)
        groups.append((_heading(quantity, kind, block), [
            [f"{w.label(row['surface'], labels)} {w.MINUS} {w.label(row['other'], labels)}",
             values[index], _word(row["verdict"], row["note"]), w.probability(row["p_adjusted"]),
             w.expanded(row["could_have_missed"], w.places(quantity))]
            for index, row in block.iterrows()]))
    heads = [Column("Pair"), _with_u("Difference"),
             Column("Verdict", "long"), Column(f"p,{w.NO_BREAK}adjusted", "number"),
             Column("Could have missed", "number")]
    return grouped_table(
        f"Differences between surfaces of this campaign, {_coverage(differences)}; p after Holm "
        "within each quantity; a verdict also weighs the difference against the relevant one.",
        heads, groups, empty="No two surfaces could be compared.")


def change_table(changes: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a surface and method, grouped by date and quantity: change ± U, verdict."""
    groups: list[Group] = []
    for earlier in dict.fromkeys(changes["earlier"]):
        for (quantity, kind), block in w.families(changes[changes["earlier"] == earlier]):
            values = _values(block, "change", sign=True)
            groups.append((f"{_heading(quantity, kind, block)}, since {earlier}", [
                [w.label(row["surface"], labels), values[index], *_judged(row), row["method"]]
                for index, row in block.iterrows()]))
    heads = [_surface_column(changes, labels), _with_u("Change"),
             Column("Verdict", "long"), Column("Conditions", "long"), Column("Method")]
    controls = [w.label(name, labels) for name in dict.fromkeys(changes["control"]) if name]
    against = f"; control: {w.listing(controls)}" if controls else ""
    return grouped_table(f"Changes since earlier campaigns, {_coverage(changes)}{against}.", heads,
                         groups,
                         empty="No earlier campaign was named, so no change was looked for.")


def budget_table(budget: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a source, grouped by surface and quantity, the largest share first."""
    groups: list[Group] = []
    for (quantity, kind), block in w.families(budget):
        for name in dict.fromkeys(block["surface"]):
            rows = block[block["surface"] == name].sort_values(
                ["share", "source"], ascending=[False, True], kind="stable")
            groups.append((f"{w.label(name, labels)}, {_heading(quantity, kind, rows, 'K')}", [
                [row["source"], w.expanded(row["contribution"], w.places(quantity) + 1),
                 w.percent(row["share"]), row["scope"]] for row in rows.to_dict("records")]))
    heads = [Column("Source"), Column("Contribution to u", "number"),
             Column("Share of variance", "number"), Column("Error shared as", "code")]
    return grouped_table("Sources of uncertainty: what each adds to the standard uncertainty u.",
                         heads, groups, empty="No uncertainty budget could be drawn up.")


def _values(block: pd.DataFrame, column: str = "value", *, sign: bool = False) -> dict[Any, Cell]:
    """Write a block's values ± U, what follows the value given the same room in every row."""
    texts = {index: w.interval(row[column], row["lower"], row["upper"], w.places(row["quantity"]),
                               sign=sign).partition(w.NO_BREAK) for index, row in block.iterrows()}
    room = max((_room(tail) for _, _, tail in texts.values()), default=0.0)
    return {index: Cell(value, tail=tail, room=room) if value else NONE
            for index, (value, _, tail) in texts.items()}


def _room(tail: str) -> float:
    """About how many digits wide a tail is: spaces, marks and points are half as wide."""
    return sum(0.5 if c in f"{w.NO_BREAK}.()" else 1.0 for c in tail) + 0.8 if tail else 0.0


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
    levels = [f"{100 * level:g}{w.NO_BREAK}%" for level in sorted({*frame["coverage"].dropna()})]
    return "coverage " + w.listing(levels or ["not stated"])


def _shared_flags(passes: pd.DataFrame) -> list[str]:
    """The flags that all of several passes carry, in their order; told once in the heading."""
    flags = [text.split("; ") for text in passes["flags"]]
    shared = {*flags[0]}.intersection(*flags) if len(flags) > 1 else set()
    return [flag for flag in flags[0] if flag and flag in shared]


def _dof(dof: float) -> str:
    return f">{w.NO_BREAK}1000" if 1000 < dof < math.inf else w.number(dof, 0)


def _surface_column(frame: pd.DataFrame, labels: Labels) -> Column:
    """Surfaces stay on one line unless a label is long."""
    longest = max((len(w.label(name, labels)) for name in frame["surface"]), default=0)
    return Column("Surface", "short" if longest <= 24 else "text")


def _with_u(name: str) -> Column:
    return Column(f"{name} ± U".replace(" ", w.NO_BREAK), "number")


def _judged(row: pd.Series) -> tuple[Cell, str]:
    """Verdict and conditions; the note says why there is no verdict, else how conditions differ."""
    verdict, note, conditions = row["verdict"], row["note"], row["comparability"]
    if verdict in ("not evaluated", "not comparable"):
        return Cell(f"{verdict}: {note}" if note else verdict), conditions
    missed = w.expanded(row["could_have_missed"], w.places(row["quantity"]))
    if verdict == "no difference shown" and missed:
        verdict = f"{verdict} (could have missed up to {missed})"
    return (Cell(verdict or "not judged", quiet=not verdict),
            ": ".join(filter(None, (conditions, note))))


def _heading(quantity: str, kind: str, block: pd.DataFrame, degrees: str = "degC") -> str:
    """A group's heading with its unit; uncertainties of a temperature in degC are in K."""
    unit = block["unit"].iloc[0]
    written = w.unit_text(degrees if unit == "degC" else unit)
    return w.quantity_text(quantity, kind) + (f", {written}" if written else "")


def _word(word: str, why: str) -> str:
    return ("; " if word == "ok" else ": ").join(filter(None, (word, why)))


def _letter(n: int) -> str:
    return chr(ord("a") + n % 26) * (n // 26 + 1)
