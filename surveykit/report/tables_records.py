"""Tables of how the numbers came about: checks, ledger, clocks, instruments, settings, inputs.

The first three take tables of `core.TABLES`, the others the rows of the run's facts.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import pandas as pd

from . import wording as w
from .markup import Html, grouped_table, table

SEVERITIES = ("refuse", "exclude", "flag", "note")
Rows = Sequence[Mapping[str, Any]]


def check_table(checks: pd.DataFrame, labels: Mapping[str, str] | None = None) -> Html:
    """Return one row a check that found something, the most severe first."""
    rank = {word: place for place, word in enumerate(SEVERITIES)}
    ordered = checks.assign(rank=checks["severity"].map(rank).fillna(len(rank))).sort_values(
        ["rank", "logger", "column", "surface", "pass", "check"], kind="stable")
    rows = []
    for row in ordered.to_dict("records"):
        where = [row["logger"], row["column"], w.label(row["surface"], labels), row["pass"]]
        rows.append([row["check"], row["severity"], ", ".join(filter(None, where)) or "campaign",
                     w.count(row["records"]) if row["records"] else "",
                     w.sentence_case(row["message"].removeprefix(f"{row['records']} records: ")
                                     .removeprefix("1 record: ")),
                     row["source"]])
    heads = {"Check": "text", "Severity": "text", "Where": "text", "Records": "number",
             "Finding": "long", "Source of the limit": "text"}
    return table("Checks that found something, the most severe first.", heads, rows,
                 empty="No check found anything to report.")


def ledger_table(ledger: pd.DataFrame) -> Html:
    """Return one row a logger and disposition: every record is in exactly one of them."""
    order = {"used": 0, "excluded": 1, "outside passes": 2}
    summed = ledger.groupby(["logger", "disposition", "reason"], as_index=False)["records"].sum()
    summed = summed.assign(order=summed["disposition"].map(order).fillna(3)).sort_values(
        ["order", "records", "reason"], ascending=[True, False, True], kind="stable")
    groups = []
    for logger, block in summed.groupby("logger", sort=True):
        total = int(block["records"].sum())
        groups.append((f"{logger}, {w.plural(total, 'record')}", [
            [row["disposition"], row["reason"], w.count(row["records"]),
             w.percent(row["records"] / total if total else float("nan"))]
            for row in block.to_dict("records")]))
    heads = {"Disposition": "text", "Reason": "text", "Records": "number", "Share": "number"}
    return grouped_table("What became of each logged record: one disposition, one reason.", heads,
                         groups, empty="No record was logged.")


def clock_table(clocks: pd.DataFrame) -> Html:
    """Return one row a logger: how its clock was set and how well it is known."""
    rows = [[row["logger"], row["method"], w.number(row["offset_s"], 1, sign=True),
             w.expanded(row["u_s"], 1), w.number(row["drift_ppm"], 1, sign=True), row["status"],
             row["note"]] for row in clocks.to_dict("records")]
    heads = {"Logger": "text", "Method": "text", f"Offset added,{w.NO_BREAK}s": "number",
             f"u,{w.NO_BREAK}s": "number", f"Drift,{w.NO_BREAK}10⁻⁶": "number",
             "Status": "text", "Note": "long"}
    return table("Clocks: seconds added to each logger’s time to reach UTC, with the standard "
                 "uncertainty u.", heads, rows, empty="No logger was read.")


def settings_table(settings: Rows) -> Html:
    """Return one row a setting, grouped by section, with its origin and source."""
    groups: dict[str, list[list[str]]] = {}
    for row in settings:
        parts = row["value"] if isinstance(row["value"], Mapping) else {"": row["value"]}
        groups.setdefault(str(row["section"]), []).extend(
            [f"{row['name']}.{key}" if key else row["name"], w.plain(value),
             w.unit_text(row["unit"]), row["origin"],
             "" if row["source"] == row["origin"] else row["source"]]
            for key, value in parts.items())
    heads = {"Setting": "code", "Value": "number", "Unit": "short", "Origin": "short",
             "Source": "long"}
    return grouped_table("Every setting of the method; “yours” marks one changed in the parameter "
                         "file.", heads, [*groups.items()], empty="No setting was handed over.")


def instrument_table(instruments: Rows) -> Html:
    """Return one row a channel, grouped by logger, with its calibration."""
    groups: dict[str, list[list[str]]] = {}
    for row in instruments:
        serial = f", serial {row['serial']}" if row["serial"] else ""
        groups.setdefault(f"{row['logger']}{serial}", []).append(
            [row["column"], str(row["quantity"]).replace("_", " "), w.unit_text(row["unit"]),
             w.plain(row["gain"]), f"{100 * row['u_gain']:.3g}{w.NO_BREAK}%",
             w.plain(row["offset"]), w.plain(row["u_offset"]), row["calibration"],
             row["calibration_date"], row["status"]])
    heads = {"Column": "code", "Quantity": "text", "Logged in": "short", "Gain": "number",
             "u of gain": "number", "Offset": "number", "u of offset": "number",
             "Calibration": "text", "Dated": "short", "Status": "text"}
    return grouped_table("Instruments and calibrations: value = offset + gain × reading; u of gain "
                         "is relative.", heads, [*groups.items()],
                         empty="No instrument was handed over.")


def inputs_table(inputs: Rows) -> Html:
    """Return one row an input file with its size and SHA-256."""
    rows = [[row["path"], w.count(row["bytes"]), row["sha256"]] for row in inputs]
    heads = {"File": "code", "Bytes": "number", "SHA-256": "code"}
    return table("Files that went in.", heads, rows, empty="No input file was handed over.")
