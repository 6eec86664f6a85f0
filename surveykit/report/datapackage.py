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
import tomllib
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

import pandas as pd

from surveykit.core import TABLES, require

FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r")
TYPES = {"text": "string", "number": "number", "count": "integer", "time": "datetime"}
TEXTS = tomllib.loads((Path(__file__).parent / "template/package.toml").read_text("utf-8"))
CF_NAMES = {"temperature": "surface_temperature", "albedo": "surface_albedo",
            "ndvi": "normalized_difference_vegetation_index"}
COLUMN_CF = {"zenith_deg": "solar_zenith_angle", "start_utc": "time", "stop_utc": "time"}
# Numbers without a unit of their own: plain ratios and counts. Other numbers take the unit that
# stands in the row's column `unit`; a suffix of the name states the unit otherwise.
RATIOS = {"probability", "p", "needed", "coverage", "k", "dof", "n_effective", "share",
          "p_adjusted", "foreign", "contamination", "shade", "effect"}
ENDINGS = {"_s": "s", "_ppm": "1e-6", "_deg": "degree", "_m": "m", "u_input": "of the input"}
DWELL_UNITS = {"value": "degC", "u": "K"}


def write_tables(tables: Mapping[str, pd.DataFrame], folder: Path,
                 facts: Mapping[str, Any]) -> list[Path]:
    """Write one CSV a table and `datapackage.json`; return the paths written.

    Parameters
    ----------
    tables : mapping of str to DataFrame
        Tables of `core.TABLES`, by name; a table that is not given is not written.
    folder : Path
        Made where it does not exist.
    facts : mapping
        `campaign` and `title` name the package.

    Raises
    ------
    ValueError
        If a name is not a published table, or a table does not keep its contract.
    """
    folder.mkdir(parents=True, exist_ok=True)
    written, resources = [], []
    for name in sorted(tables, key=[*TABLES].index):
        content = csv_text(tables[name], name).encode("utf-8")
        path = folder / f"{name}.csv"
        path.write_bytes(content)
        written.append(path)
        resources.append(_resource(name, content))
    package = {
        "profile": "tabular-data-package", "name": facts["campaign"], "title": facts["title"],
        "description": TEXTS["description"], "resources": resources,
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
    require(frame, name)
    text: str = pd.DataFrame({
        column: frame[column].map(WRITTEN[kind]).astype(object)
        for column, kind in TABLES[name].items()}).to_csv(index=False, lineterminator="\n")
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


WRITTEN: dict[str, Callable[[Any], str]] = {
    "text": guarded, "number": _number, "count": str, "time": iso_utc}


def _resource(name: str, content: bytes) -> dict[str, Any]:
    return {
        "profile": "tabular-data-resource", "name": name, "title": TEXTS["titles"][name],
        "path": f"{name}.csv", "format": "csv", "mediatype": "text/csv", "encoding": "utf-8",
        "bytes": len(content), "hash": f"sha256:{hashlib.sha256(content).hexdigest()}",
        "schema": {"fields": [_field(name, *column) for column in TABLES[name].items()],
                   "missingValues": [""]},
    }


def _field(table: str, column: str, kind: str) -> dict[str, Any]:
    field: dict[str, Any] = {"name": column, "type": TYPES[kind]}
    notes = TEXTS["columns"] | TEXTS.get(table, {})
    if column in notes:
        field["description"] = notes[column]
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
    if table == "dwells":
        return DWELL_UNITS[column]
    return next((unit for ending, unit in ENDINGS.items() if column.endswith(ending)),
                "as the column unit says")
