"""The published tables as CSV files with a Frictionless data package that describes them.

Full precision; times in ISO 8601 with Z; a missing number or text is an empty cell; an infinite
number (degrees of freedom) is INF, as Table Schema writes it.

References
----------
Frictionless Data, Data Package and Table Schema, version 1 (specs.frictionlessdata.io).
Climate and Forecast (CF) metadata conventions, standard name table (surface_temperature,
surface_albedo, normalized_difference_vegetation_index, solar_zenith_angle, time).
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import pandas as pd

from surveykit.core import TABLES, require

FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r")
TYPES = {"text": "string", "number": "number", "count": "integer", "time": "datetime"}
TITLES = {
    "surfaces": "One row a surface, quantity and kind: value with its uncertainty",
    "passes": "One row a pass",
    "dwells": "One row a single placement of the contact head",
    "budget": "One row a source of uncertainty of a surface",
    "ledger": "What became of each record",
    "waterfall": "What became of each reading of a channel, reason by reason",
    "checks": "Findings of the quality checks",
    "clocks": "How each logger's clock was set",
    "differences": "Differences between surfaces of this campaign",
    "ranks": "Probability of each surface to stand at each place, the highest first",
    "trends": "Lines through the dates of each surface, three dates or more",
    "changes": "Changes since earlier campaigns",
    "corrections": "From the raw to the final value of each pass, step by step",
    "histograms": "Readings of passes that fall into two groups: records between two edges",
    "derived": "What was asked for beside the measured quantities",
    "geometry": "Shade and foreign ground of each albedo pass against height, used and best",
}
CF_NAMES = {"temperature": "surface_temperature", "albedo": "surface_albedo",
            "ndvi": "normalized_difference_vegetation_index"}
COLUMN_CF = {"zenith_deg": "solar_zenith_angle", "start_utc": "time", "stop_utc": "time"}
# Numbers without a unit of their own: plain ratios and counts. Other numbers take the unit that
# stands in the row's column `unit`; a suffix of the name states the unit otherwise.
RATIOS = {"probability", "p", "needed", "coverage", "k", "dof", "n_effective", "share",
          "p_adjusted", "foreign", "contamination", "shade", "effect"}
SUFFIXES = {"_s": "s", "_ppm": "1e-6", "_deg": "degree", "_m": "m"}
DWELL_UNITS = {"value": "degC", "u": "K"}
NOTES = {
    "u": "standard uncertainty", "lower": "lower end of the interval at `coverage`",
    "upper": "upper end of the interval at `coverage`", "k": "coverage factor, U / u",
    "dof": "effective degrees of freedom; INF where no sampling took part",
    "u_at_least": "standard uncertainty known without repeats",
    "u_within": "standard uncertainty of the pass mean from its own records",
    "n_effective": "number of records, reduced for their correlation",
    "could_have_missed": "difference found with 80 % power at the 5 % level",
    "p_adjusted": "two-sided, after Holm within a quantity and kind",
    "spread": "standard deviation between passes (patches where there are several)",
    "end_error": "standard error of the interval's ends by Monte Carlo",
    "needed": "passes (patches where there are several) for a half-width of the relevant change; "
              "INF where shared errors alone are wider",
    "narrower": "by how much the half-width shrinks where this source is halved",
    "lower_all": "lower end of the interval that holds together with the whole family's",
    "upper_all": "upper end of the interval that holds together with the whole family's",
    "place": "1 is the highest", "p": "two-sided, of the slope alone",
    "share": "of the variance of the surface's value",
}


def write_tables(tables: Mapping[str, pd.DataFrame], folder: Path,
                 facts: Mapping[str, Any] | None = None) -> list[Path]:
    """Write one CSV a table and `datapackage.json`; return the paths written.

    Parameters
    ----------
    tables : mapping of str to DataFrame
        Tables of `core.TABLES`, by name; a table that is not given is not written.
    folder : Path
        Made where it does not exist.
    facts : mapping, optional
        `campaign` and `title` name the package.

    Raises
    ------
    ValueError
        If a table does not keep its contract.
    KeyError
        If a name is not a published table.
    """
    folder.mkdir(parents=True, exist_ok=True)
    written, resources = [], []
    for name in sorted(tables, key=[*TABLES].index):
        content = csv_text(tables[name], name).encode("utf-8")
        path = folder / f"{name}.csv"
        path.write_bytes(content)
        written.append(path)
        resources.append(_resource(name, content))
    about = facts or {}
    package = {
        "profile": "tabular-data-package", "name": about.get("campaign") or "campaign",
        "title": about.get("title") or "Surface survey",
        "description": "Numbers in full precision. Temperatures in degC, their differences and "
                       "uncertainties in K. Text that begins with a sign that a spreadsheet would "
                       "take for a formula carries a leading apostrophe.",
        "resources": resources,
    }
    path = folder / "datapackage.json"
    path.write_bytes((json.dumps(package, indent=2, ensure_ascii=False) + "\n").encode("utf-8"))
    return [*written, path]


def csv_text(frame: pd.DataFrame, name: str) -> str:
    """Return the table `name` as CSV text, columns in the contract's order.

    Raises
    ------
    ValueError
        If the table does not keep its contract.
    """
    contract = TABLES[name]
    shown = require(frame, name)[[*contract]].copy()
    for column, kind in contract.items():
        if kind == "text":
            shown[column] = shown[column].map(guarded).astype(object)
        elif kind == "time":
            shown[column] = shown[column].map(iso_utc).astype(object)
        elif kind == "number":
            shown[column] = shown[column].map(_number).astype(object)
    text: str = shown.to_csv(index=False, lineterminator="\n")
    return text


def guarded(text: str) -> str:
    r"""Return the text with a leading apostrophe where a spreadsheet would run it as a formula.

    Examples
    --------
    >>> guarded("=1+1"), guarded("lawn"), guarded("\tx") == "'\tx"
    ("'=1+1", 'lawn', True)
    """
    return f"'{text}" if text.startswith(FORMULA_STARTS) else text


def iso_utc(time: Any) -> str:
    """Return a time as ISO 8601 in UTC; "" where it is missing.

    Examples
    --------
    >>> iso_utc(pd.Timestamp("2025-07-24 12:00:01.5", tz="Europe/Lisbon"))
    '2025-07-24T11:00:01.500000Z'
    """
    if pd.isna(time):
        return ""
    text: str = time.tz_convert("UTC").floor("us").isoformat()
    return text.replace("+00:00", "Z")


def _number(value: Any) -> str:
    if pd.isna(value):
        return ""
    return repr(float(value)).replace("inf", "INF")


def _resource(name: str, content: bytes) -> dict[str, Any]:
    return {
        "profile": "tabular-data-resource", "name": name, "title": TITLES[name],
        "path": f"{name}.csv", "format": "csv", "mediatype": "text/csv", "encoding": "utf-8",
        "bytes": len(content), "hash": f"sha256:{hashlib.sha256(content).hexdigest()}",
        "schema": {"fields": [_field(name, *column) for column in TABLES[name].items()],
                   "missingValues": [""]},
    }


def _field(table: str, column: str, kind: str) -> dict[str, Any]:
    field: dict[str, Any] = {"name": column, "type": TYPES[kind]}
    if column in NOTES:
        field["description"] = NOTES[column]
    if kind == "number":
        field["unit"] = _unit(table, column)
    if column in COLUMN_CF:
        field["standard_name"] = COLUMN_CF[column]
    if column == "quantity":
        field["standard_names"] = CF_NAMES
    return field


def _unit(table: str, column: str) -> str:
    if column in RATIOS:
        return "1"
    for suffix, unit in SUFFIXES.items():
        if column.endswith(suffix):
            return unit
    if table == "dwells":
        return DWELL_UNITS.get(column, "1")
    return "as the column unit says"
