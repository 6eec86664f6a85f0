"""Tables of how the numbers came about: checks, ledger, clocks, instruments, settings, inputs.

The first three take tables of `core.TABLES`, the others the rows of the run's facts.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import pandas as pd

from . import wording as w
from .markup import Cell, Column, Html, table

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
                     w.count(row["records"]), w.sentence_case(row["message"]), row["source"]])
    heads = [Column("Check"), Column("Severity"), Column("Where"), Column("Records", "number"),
             Column("Finding", "long"), Column("Source of the limit")]
    return table("Checks that found something, the most severe first.", heads, rows,
                 empty="No check found anything to report.")


def ledger_table(ledger: pd.DataFrame) -> Html:
    """Return one row a logger and disposition: every record is in exactly one of them."""
    totals = ledger.groupby("logger")["records"].sum()
    order = {"used": 0, "excluded": 1, "outside passes": 2}
    grouped = ledger.groupby(["logger", "disposition", "reason"], as_index=False)["records"].sum()
    grouped = grouped.assign(order=grouped["disposition"].map(order).fillna(3)).sort_values(
        ["logger", "order", "records", "reason"], ascending=[True, True, False, True])
    rows: list[list[str | Cell]] = []
    for logger, block in grouped.groupby("logger", sort=True):
        total = totals[logger]
        rows.extend([row["logger"], row["disposition"], row["reason"], w.count(row["records"]),
                     w.percent(row["records"] / total if total else float("nan"))]
                    for row in block.to_dict("records"))
        rows.append([str(logger), "all", "", w.count(int(total)), w.percent(1.0)])
    heads = [Column("Logger"), Column("Disposition"), Column("Reason"),
             Column("Records", "number"), Column("Share", "number")]
    return table("What became of each logged record; a record has one disposition and one reason.",
                 heads, rows, empty="No record was logged.")


def clock_table(clocks: pd.DataFrame) -> Html:
    """Return one row a logger: how its clock was set and how well it is known."""
    rows = [[row["logger"], row["method"], w.number(row["offset_s"], 1, sign=True),
             w.expanded(row["u_s"], 1), w.number(row["drift_ppm"], 1, sign=True), row["status"],
             row["note"]] for row in clocks.to_dict("records")]
    heads = [Column("Logger"), Column("Method"), Column("Offset added, s", "number"),
             Column("u, s", "number"), Column("Drift, 10⁻⁶", "number"), Column("Status"),
             Column("Note", "long")]
    return table("Clocks: seconds added to each logger's time to reach UTC, with the standard "
                 "uncertainty u.", heads, rows, empty="No logger was read.")


def settings_table(settings: Rows) -> Html:
    """Return one row a setting with its origin and source."""
    rows = [[row["name"], row["section"], w.plain(row["value"]), w.unit_text(row["unit"]),
             row["origin"], row["source"]] for row in settings]
    heads = [Column("Setting", "code"), Column("Section"), Column("Value", "number"),
             Column("Unit"), Column("Origin"), Column("Source", "long")]
    return table("Every setting of the method; origin “yours” marks one changed in the parameter "
                 "file.", heads, rows, empty="No setting was handed over.")


def instrument_table(instruments: Rows) -> Html:
    """Return one row a channel with its calibration."""
    rows = [[row["logger"], w.plain(row["serial"]), row["column"],
             str(row["quantity"]).replace("_", " "), w.plain(row["calibration"]),
             w.plain(row["calibration_date"]), w.plain(row["gain"]), _relative(row["u_gain"]),
             w.plain(row["offset"]), w.plain(row["u_offset"]), w.unit_text(row["unit"]),
             row["status"]] for row in instruments]
    heads = [Column("Logger"), Column("Serial"), Column("Column", "code"), Column("Quantity"),
             Column("Calibration"), Column("Dated"), Column("Gain", "number"),
             Column("u of gain", "number"), Column("Offset", "number"),
             Column("u of offset", "number"), Column("Logged in"), Column("Status")]
    return table("Instruments and calibrations: value = offset + gain × reading; u of gain is "
                 "relative.", heads, rows, empty="No instrument was handed over.")


def inputs_table(inputs: Rows) -> Html:
    """Return one row an input file with its size and SHA-256."""
    rows = [[row["path"], w.count(row["bytes"]), row["sha256"]] for row in inputs]
    heads = [Column("File", "code"), Column("Bytes", "number"), Column("SHA-256", "code")]
    return table("Files that went in.", heads, rows, empty="No input file was handed over.")


def versions_table(versions: Mapping[str, str]) -> Html:
    """Return one row a program that took part."""
    heads = [Column("Program"), Column("Version", "number")]
    return table("Programs that computed this report.", heads,
                 [[name, version] for name, version in sorted(versions.items())],
                 empty="No version was handed over.")


def _relative(u_gain: Any) -> str:
    return f"{100 * u_gain:.3g} %" if isinstance(u_gain, int | float) else w.plain(u_gain)
