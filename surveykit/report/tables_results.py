"""Tables of results: surfaces, passes, differences, changes, trends, products, heights.

Each function takes a table of `core.TABLES` and returns `Html`. `labels` maps the name of a
surface, or of an earlier campaign, to what stands for it. Where the arms of an interval differ by
more than a fifth, both ends stand in place of U.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Mapping
from dataclasses import replace
from typing import Any

import pandas as pd

from . import wording as w
from .markup import Cell, Columns, Group, Html, Notes, Row, grouped_table, paragraph, table

Labels = Mapping[str, str] | None
NONE = Cell("none", quiet=True)
N = w.NO_BREAK
PRODUCT_PLACES = {"K": 1, "degC": 1, "1": 3}  # decimals of a derived product by its unit, else 0


def surface_overview(surfaces: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a surface, one column a quantity and kind, notes by letter below."""
    families = w.families(surfaces)
    written = {pair: _values(block) for pair, block in families}
    notes, rows = Notes(labels), []
    for name in dict.fromkeys(surfaces["surface"]):
        cells: list[str | Cell] = [w.label(name, labels)]
        for pair, block in families:
            found = block[block["surface"] == name]
            if found.empty:
                cells.append(Cell("not surveyed", quiet=True))
                continue
            row = found.iloc[0]
            cell = _unless_gone(row, written[pair][found.index[0]])
            cells.append(replace(cell, note=notes.letter(_note(row))))
        rows.append(cells)
    caption = f"Mean of each surface ± U ({_coverage(surfaces)}), at its passes’ own times."
    return table(caption, {"Surface": "text"} | _numbers(
        *(w.heading(*pair, block["unit"].iloc[0]) for pair, block in families)), rows,
        empty="No surface was surveyed.", notes=notes.listed())


def surface_table(surfaces: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a surface, grouped by quantity: value ± U, k, counts, status and why."""
    notes = Notes(labels)

    def row(one: Any, value: Cell) -> Row:
        return [w.label(one["surface"], labels), value, w.number(one["k"], 2), _dof(one["dof"]),
                w.count(one["n_patches"]), w.count(one["n_passes"]), w.count(one["n_records"]),
                Cell(one["status"], note=notes.letter(_note(one)))]

    heads = {"Surface": _width(surfaces, labels)} | _numbers(
        _with_u("Value"), "k", "Degrees of freedom", "Patches", "Passes", "Records") | {
        "Status": "short"}
    return grouped_table(f"Surfaces: mean ± U, {_coverage(surfaces)}, U = k times the standard "
                         "uncertainty.", heads, _groups(surfaces, row), notes=notes.listed(),
                         empty="No surface was surveyed.")


def pass_table(passes: pd.DataFrame, labels: Labels = None, time_zone: str = "UTC") -> Html:
    """Return one row a pass, grouped by quantity: when, value, uncertainty within the pass."""
    notes, groups = Notes(labels), []
    for (quantity, kind), block in w.families(passes.sort_values(["start_utc", "pass"])):
        shared = _shared_flags(block)
        groups.append((w.heading(quantity, kind, block["unit"].iloc[0])
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
    heads = {"Pass": "short", "Surface": _width(passes, labels)} | _numbers(
        "From", "To", "Value", f"u{N}within", "Records", "Effective", f"Zenith,{N}°") | {
        "Status": "short"}
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

    heads = {"Pair": "text"} | _numbers(
        _with_u("Difference"), *(["All pairs at once"] if every else [])) | {
        "Verdict": "text"} | _numbers(f"p,{N}adjusted", "Could have missed")
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
                rest = [f"{one['method']} {values[index].text}{N}{values[index].tail}".strip()
                        for index, one in some.iterrows() if index != lead.name]
                gone = lead["verdict"] in ("not evaluated", "not comparable")
                why = notes.letter(*lead["note"].split("; "))
                rows.append([w.label(str(name), labels), values[lead.name],
                             Cell(lead["verdict"] or "not judged", quiet=not lead["verdict"],
                                  note=why if gone else ""),
                             w.expanded(lead["could_have_missed"], w.places(quantity)),
                             Cell(lead["comparability"], note="" if gone else why), lead["method"]
                             + (f"; in place of it: {', '.join(rest)}" if rest else "")])
            groups.append((f"{w.heading(quantity, kind, block['unit'].iloc[0])}, since "
                           f"{w.label(earlier, labels)}", rows))
    heads = {
        "Surface": _width(changes, labels), _with_u("Change"): "number", "Verdict": "text",
        "Could have missed": "number", "Conditions": "short",
        "Method, and what others give": "long"}
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

    heads = {"Surface": _width(trends, labels), _with_u("Slope"): "number",
                      "Method": "text", "Dates": "number", "p": "number", "Verdict": "text"}
    return grouped_table(
        f"Lines through the dates, {_coverage(trends)}, weather taken off as for changes; a trend "
        "is established where the line that knows each date’s uncertainty and the one that takes "
        "it from the scatter agree.", heads, _groups(trends, row, "slope"), notes=notes.listed(),
        empty="A line needs a value on three dates or more, so none was drawn.")


def derived_table(derived: pd.DataFrame, labels: Labels = None) -> Html:
    """Return a table a product: one row a surface, one column a form, value ± U with its notes.

    A caution has the hottest records in place of a mean, and an upper bound in place of U.
    """
    made = []
    for (product, unit), block in derived.groupby(["product", "unit"], sort=False):
        hottest = product == "caution"
        about = ("95th percentile of the records, and what it may reach with U" if hottest else
                 f"value ± U, {_coverage(block)}")
        values = _values(block, digits=0 if product == "sri" else PRODUCT_PLACES.get(str(unit), 0))
        forms, notes = [*dict.fromkeys(block["form"])], Notes(labels)
        rows = {name: dict.fromkeys(forms, Cell("", quiet=True)) for name in block["surface"]}
        for index, row in block.iterrows():
            note = re.sub(r" [\d.]+ degC \(", " (", row["note"]) if hottest else row["note"]
            rows[row["surface"]][row["form"]] = replace(
                _unless_gone(row, values[index]), note=notes.letter(note))
        made.append(table(
            f"{w.sentence_case(w.heading(w.product_text(str(product)), '', str(unit)))[:-1]}: "
            f"{about}.", {"Surface": _width(block, labels)} | _numbers(
                *(form[:1].upper() + form[1:] or "Value" for form in forms)),
            [[w.label(surface, labels), *cells.values()] for surface, cells in rows.items()],
            notes=notes.listed(), empty=""))
    return Html("".join(one.html for one in made), "\n".join(one.text for one in made)) if made \
        else paragraph("Nothing was asked for beside the measured quantities (key derived of the "
                       "parameter file).", "empty")


def geometry_table(geometry: pd.DataFrame, labels: Labels = None) -> Html:
    """Return one row a patch: the height used and the best one, with what each would cost."""
    notes, rows = Notes(labels), list[Row]()
    order = [*dict.fromkeys(geometry["surface"])]
    for (surface, patch), block in geometry.sort_values(
            "surface", key=lambda names: names.map(order.index), kind="stable").groupby(
            ["surface", "patch"], sort=False):
        used, best = (block[block["role"] == role] for role in ("used", "best"))
        ends = [[w.number(100 * float(some["height_m"].mean()), 0),
                 w.percent(float(some["effect"].mean()))] for some in (used, best)]
        rows.append([str(patch), w.label(surface, labels), *ends[0],
                     w.percent(float(used["foreign"].mean())), *ends[1],
                     Cell(used["note"].iloc[0].split(":")[0].split(",")[0] if len(used) else "",
                          note=notes.letter(*dict.fromkeys(used["note"])))])
    heads = {"Patch": "short", "Surface": "short"} | _numbers(
        f"Height,{N}cm", "Takes", "View beyond the patch", f"Best height,{N}cm", "Would take") | {
        "ASTM E1918": "long"}
    return table("Height of the albedo head over each patch, mean of its passes: what shade and "
                 "foreign ground take from albedo before correction, at the height used and at the "
                 "best one.", heads, rows, notes=notes.listed(),
                 empty="No albedo over a patch of known size: no height to weigh.")


def _groups(frame: pd.DataFrame, row: Callable[[Any, Cell], Row],
            column: str = "value") -> list[Group]:
    """One group a quantity and kind, a row of `frame` each, with its value ± U written."""
    groups: list[Group] = []
    for pair, block in w.families(frame):
        values = _values(block, column, sign=column != "value")
        groups.append((w.heading(*pair, block["unit"].iloc[0]),
                       [row(one, values[index]) for index, one in block.iterrows()]))
    return groups


def _values(block: pd.DataFrame, column: str = "value", *, sign: bool = False,
            digits: int | None = None) -> dict[Any, Cell]:
    """Write a block's values ± U, what follows the value given the same room in every row.

    A value with an upper bound alone stands as "value to bound".
    """
    texts = {}
    for index, row in block.iterrows():
        places = w.places(row["quantity"]) if digits is None else digits
        text = w.interval(row[column], row["lower"], row["upper"], places, sign=sign)
        if math.isnan(row["lower"]) and not math.isnan(row["upper"]):
            text += f"{N}to {w.number(row['upper'], places)}"
        texts[index] = text.partition(N)
    room = max((_room(tail) for _, _, tail in texts.values()), default=0.0)
    return {index: Cell(value, tail=tail, room=room) if value else NONE
            for index, (value, _, tail) in texts.items()}


def _room(tail: str) -> float:
    """About how many digits wide a tail is: spaces, marks and points are half as wide."""
    return sum(0.5 if c in f"{N}.()t" else 1.0 for c in tail) + 0.8 if tail else 0.0


def _unless_gone(row: Any, value: Cell) -> Cell:
    gone = row["status"] == "not evaluated"
    return Cell(row["status"], quiet=True) if gone else value


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
    levels = [f"{100 * level:g}{N}%" for level in sorted({*frame["coverage"].dropna()})]
    return "coverage " + w.listing(levels or ["not stated"])


def _shared_flags(passes: pd.DataFrame) -> list[str]:
    """The flags that all of several passes carry, in their order; told once in the heading."""
    flags = [text.split("; ") for text in passes["flags"]]
    shared = {*flags[0]}.intersection(*flags) if len(flags) > 1 else set()
    return [flag for flag in flags[0] if flag and flag in shared]


def _dof(dof: float) -> str:
    return f">{N}1000" if 1000 < dof < math.inf else w.number(dof, 0)


def _numbers(*headings: str) -> Columns:
    return dict.fromkeys(headings, "number")


def _width(frame: pd.DataFrame, labels: Labels) -> str:
    """Surfaces stay on one line unless a label is long."""
    longest = max((len(w.label(name, labels)) for name in frame["surface"]), default=0)
    return "short" if longest <= 24 else "text"


def _with_u(name: str) -> str:
    return f"{name} ± U".replace(" ", N)
