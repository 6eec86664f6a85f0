"""Tables of results: surfaces, passes, differences, changes, trends, products, heights.

Each function takes a table of `core.TABLES` and returns `Html`. `labels` maps the name of a
surface, or of an earlier campaign, to what stands for it. Where the arms of an interval differ by
more than a fifth, both ends stand in place of U.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import replace
from typing import Any

import pandas as pd

from . import wording as w
from .markup import Cell, Column, Group, Html, Notes, Row, grouped_table, paragraph, table

Labels = Mapping[str, str] | None
NONE = Cell("none", quiet=True)


def surface_overview(surfaces: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a surface, one column a quantity and kind, notes by letter below."""
    families = w.families(surfaces)
    written = {pair: _values(block) for pair, block in families}
    notes, rows = Notes(), []
    for name in dict.fromkeys(surfaces["surface"]):
        cells: list[str | Cell] = [w.label(name, labels)]
        for pair, block in families:
            found = block[block["surface"] == name]
            if found.empty:
                cells.append(Cell("not surveyed", quiet=True))
                continue
            row = found.iloc[0]
            gone = row["status"] == "not evaluated"
            cell = Cell("not evaluated", quiet=True) if gone else written[pair][found.index[0]]
            cells.append(replace(cell, note=notes.letter(_note(row))))
        rows.append(cells)
    units = {pair: w.unit_text(block["unit"].iloc[0]) for pair, block in families}
    heads = [Column("Surface"), *(Column(w.quantity_text(*pair) + (f", {u}" if u else ""), "number")
                                  for pair, u in units.items())]
    caption = f"Mean of each surface ± U ({_coverage(surfaces)}), at its passes’ own times."
    return table(caption, heads, rows, empty="No surface was surveyed.", notes=notes.listed())


def surface_table(surfaces: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a surface, grouped by quantity: value ± U, k, counts, status and why."""
    notes = Notes(labels)

    def row(one: Any, value: Cell) -> Row:
        return [w.label(one["surface"], labels), value, w.number(one["k"], 2), _dof(one["dof"]),
                w.count(one["n_patches"]), w.count(one["n_passes"]), w.count(one["n_records"]),
                Cell(one["status"], note=notes.letter(_note(one)))]

    heads = [_surface_column(surfaces, labels), _with_u("Value"), Column("k", "number"),
             Column("Degrees of freedom", "number"), Column("Patches", "number"),
             Column("Passes", "number"), Column("Records", "number"), Column("Status", "short")]
    return grouped_table(f"Surfaces: mean ± U, {_coverage(surfaces)}, U = k times the standard "
                         "uncertainty.", heads, _groups(surfaces, row), notes=notes.listed(),
                         empty="No surface was surveyed.")


def pass_table(passes: pd.DataFrame, labels: Labels = None, time_zone: str = "UTC") -> Html:
    """Return one row a pass, grouped by quantity: when, value, uncertainty within the pass."""
    notes, groups = Notes(labels), []
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
             Cell(row["status"], note=notes.letter(*row["note"].split("; "), *(
                 flag for flag in row["flags"].split("; ") if flag not in shared)))]
            for row in block.to_dict("records")]))
    heads = [Column("Pass", "short"), _surface_column(passes, labels), Column("From", "number"),
             Column("To", "number"), Column("Value", "number"),
             Column(f"u{w.NO_BREAK}within", "number"), Column("Records", "number"),
             Column("Effective", "number"),
             Column(f"Zenith,{w.NO_BREAK}°", "number"), Column("Status", "short")]
    return grouped_table(
        f"Passes in order of time ({time_zone}), after trimming. u within: standard uncertainty of "
        "the pass mean from its own records; effective: records reduced for their correlation; "
        "zenith: of the sun.",
        heads, groups, notes=notes.listed(), empty="No pass could be matched with records.")


def difference_table(differences: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a pair, grouped by quantity: difference ± U, verdict, p, what was missed."""
    notes, every = Notes(labels), differences["lower_all"].notna().any()

    def row(one: Any, value: Cell) -> Row:
        places = w.places(one["quantity"])
        ends = [w.number(one[end], places, sign=True) for end in ("lower_all", "upper_all")]
        return [f"{w.label(one['surface'], labels)} {w.MINUS} {w.label(one['other'], labels)}",
                value, *([" to ".join(filter(None, ends))] if every else []),
                Cell(one["verdict"], note=notes.letter(*one["note"].split("; "))),
                w.probability(one["p_adjusted"]), w.expanded(one["could_have_missed"], places)]

    heads = [Column("Pair"), _with_u("Difference"),
             *([Column("All pairs at once", "number")] if every else []), Column("Verdict"),
             Column(f"p,{w.NO_BREAK}adjusted", "number"), Column("Could have missed", "number")]
    at_once = ("; all pairs at once: intervals that hold together with this coverage"
               if every else "")
    return grouped_table(
        f"Differences between surfaces of this campaign, {_coverage(differences)}{at_once}; p "
        "after Holm within each quantity; a verdict also weighs the difference against the "
        "relevant one.", heads, _groups(differences, row, "difference"),
        empty="No two surfaces could be compared.", notes=notes.listed())


def change_table(changes: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a surface, grouped by date and quantity: the judged change, the others."""
    notes, groups = Notes(labels), []
    for earlier in dict.fromkeys(changes["earlier"]):
        for (quantity, kind), block in w.families(changes[changes["earlier"] == earlier]):
            values = _values(block, "change", sign=True)
            rows: list[Row] = []
            for name, some in block.groupby("surface", sort=False):
                judged = some[some["verdict"] != ""]
                lead = judged.iloc[0] if len(judged) else some.iloc[0]
                rest = [f"{one['method']} {values[index].text}{w.NO_BREAK}{values[index].tail}"
                        for index, one in some.iterrows() if index != lead.name]
                gone = lead["verdict"] in ("not evaluated", "not comparable")
                why = notes.letter(*lead["note"].split("; "))
                rows.append([w.label(str(name), labels), values[lead.name],
                             Cell(lead["verdict"] or "not judged", quiet=not lead["verdict"],
                                  note=why if gone else ""),
                             w.expanded(lead["could_have_missed"], w.places(quantity)),
                             Cell(lead["comparability"], note="" if gone else why), lead["method"]
                             + (f"; in place of it: {', '.join(rest)}" if rest else "")])
            groups.append((f"{_heading(quantity, kind, block)}, since {w.label(earlier, labels)}",
                           rows))
    heads = [_surface_column(changes, labels), _with_u("Change"), Column("Verdict"),
             Column("Could have missed", "number"), Column("Conditions", "short"),
             Column("Method, and what others give", "long")]
    controls = [w.label(name, labels) for name in dict.fromkeys(changes["control"]) if name]
    against = f"; control: {w.listing(controls)}" if controls else ""
    return grouped_table(f"Changes since earlier campaigns, {_coverage(changes)}{against}.", heads,
                         groups, notes=notes.listed(),
                         empty="No earlier campaign was named, so no change was looked for.")


def trend_table(trends: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a surface and method, grouped by quantity: slope ± U, p and verdict."""
    notes = Notes(labels)

    def row(one: Any, value: Cell) -> Row:
        shown = one["verdict"].replace("no difference shown", "trend not established")
        why = [part.removeprefix("trend not established: ") for part in one["note"].split("; ")
               if part != "trend not established"]
        return [w.label(one["surface"], labels), value, one["method"], w.count(one["dates"]),
                w.probability(one["p"]),
                Cell(shown or "not judged", quiet=not shown, note=notes.letter(*why))]

    heads = [_surface_column(trends, labels), _with_u("Slope"), Column("Method"),
             Column("Dates", "number"), Column("p", "number"), Column("Verdict")]
    return grouped_table(
        f"Lines through the dates, {_coverage(trends)}, weather taken off as for changes; a trend "
        "is established where the line that knows each date’s uncertainty and the one that takes "
        "it from the scatter agree.", heads, _groups(trends, row, "slope"), notes=notes.listed(),
        empty="A line needs a value on three dates or more, so none was drawn.")


def derived_table(derived: pd.DataFrame, labels: Labels = None) -> Html:
    """Return a table a product: one row a surface, one column a form, value ± U with its notes."""
    made = []
    for (product, unit), block in derived.groupby(["product", "unit"], sort=False):
        values = _values(block, digits=3 if unit == "1" and product != "sri" else 0)
        forms, notes = [*dict.fromkeys(block["form"])], Notes(labels)
        rows = {name: dict.fromkeys(forms, Cell("", quiet=True)) for name in block["surface"]}
        for index, row in block.iterrows():
            gone = row["status"] == "not evaluated"
            cell = Cell(row["status"], quiet=True) if gone else values[index]
            rows[row["surface"]][row["form"]] = replace(cell, note=notes.letter(row["note"]))
        written, name = w.unit_text(str(unit)), w.product_text(str(product))
        made.append(table(
            f"{w.sentence_case(name)[:-1]}{f', {written}' if written else ''}: value ± U, "
            f"{_coverage(block)}.", [_surface_column(block, labels), *(
                Column(form[:1].upper() + form[1:] or "Value", "number") for form in forms)],
            [[w.label(surface, labels), *cells.values()] for surface, cells in rows.items()],
            notes=notes.listed(), empty=""))
    return Html("".join(one.html for one in made), "\n".join(one.text for one in made)) if made \
        else paragraph("Nothing was asked for beside the measured quantities (key derived of the "
                       "parameter file).", "empty")


def geometry_table(geometry: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a patch: the height used and the best one, with what each would cost."""
    notes, rows = Notes(labels), list[Row]()
    for (surface, patch), block in geometry.groupby(["surface", "patch"], sort=False):
        ends = {}
        for role in ("used", "best"):
            some = block[block["role"] == role]
            ends[role] = [w.number(100 * float(some["height_m"].mean()), 0),
                          w.percent(float(some["effect"].mean()))]
        used = block[block["role"] == "used"]
        rows.append([str(patch), w.label(surface, labels), *ends["used"],
                     w.percent(float(used["foreign"].mean())), *ends["best"],
                     Cell(used["note"].iloc[0].split(":")[0].split(",")[0] if len(used) else "",
                          note=notes.letter(*dict.fromkeys(used["note"])))])
    heads = [Column("Patch", "short"), Column("Surface", "short"),
             Column(f"Height,{w.NO_BREAK}cm", "number"), Column("Takes", "number"),
             Column("View beyond the patch", "number"),
             Column(f"Best height,{w.NO_BREAK}cm", "number"), Column("Would take", "number"),
             Column("ASTM E1918", "long")]
    return table("Height of the albedo head over each patch, mean of its passes: what shade and "
                 "foreign ground take from albedo before correction, at the height used and at the "
                 "best one.", heads, rows, notes=notes.listed(),
                 empty="No albedo over a patch of known size: no height to weigh.")


def _groups(frame: pd.DataFrame, row: Callable[[Any, Cell], Row],
            column: str = "value") -> list[Group]:
    """One group a quantity and kind, a row of `frame` each, with its value ± U written."""
    groups: list[Group] = []
    for (quantity, kind), block in w.families(frame):
        values = _values(block, column, sign=column != "value")
        groups.append((_heading(quantity, kind, block),
                       [row(one, values[index]) for index, one in block.iterrows()]))
    return groups


def _values(block: pd.DataFrame, column: str = "value", *, sign: bool = False,
            digits: int | None = None) -> dict[Any, Cell]:
    """Write a block's values ± U, what follows the value given the same room in every row."""
    texts = {index: w.interval(
        row[column], row["lower"], row["upper"],
        w.places(row["quantity"]) if digits is None else digits,
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
                        w.difference_unit(row["quantity"]))
    return "; ".join(filter(None, (row["note"], "no interval",
                                   f"standard uncertainty at least {known}")))


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


def _heading(quantity: str, kind: str, block: pd.DataFrame) -> str:
    """A group's heading with its unit."""
    written = w.unit_text(block["unit"].iloc[0])
    return w.quantity_text(quantity, kind) + (f", {written}" if written else "")
