"""What every floor shares: errors, sourced constants, estimates and the contracts of the tables."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
import pandas as pd
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
IntArray = NDArray[np.int64]
Distribution = Literal["normal", "rectangular"]


class InputError(Exception):
    """The user's input is at fault; each fault is one located sentence that names its repair.

    Parameters
    ----------
    *faults : str
        One sentence a fault: file, key path or sheet row, the value got, what to write.
    """

    def __init__(self, *faults: str) -> None:
        self.faults = faults
        super().__init__("\n".join(faults))


def shown_faults(faults: Sequence[str], most: int = 200) -> list[str]:
    """Return the faults to show, at most so many, and a line that counts the rest.

    Examples
    --------
    >>> shown_faults(["one", "two", "three"], most=2)
    ['one', 'two', '... and 1 more; mend these first']
    """
    rest = len(faults) - most
    return [*faults[:most], *([f"... and {rest:,} more; mend these first"] if rest > 0 else [])]


@dataclass(frozen=True)
class Sourced:
    """A constant with its standard uncertainty, unit and source together."""

    value: float
    u: float
    unit: str
    source: str


@dataclass(frozen=True)
class Input:
    """One uncertain input of a pass estimate.

    `scope` names what the error belongs to (a calibration, a surface's emissivity, a day's sky, a
    pass): equal scopes share one vector of draws, in every pass, surface and campaign.
    """

    name: str
    value: float
    u: float
    scope: str
    source: str
    distribution: Distribution = "normal"

    def __post_init__(self) -> None:
        if not (np.isfinite(self.value) and np.isfinite(self.u) and self.u >= 0):
            raise ValueError(f"input {self.name!r} needs a finite value and u >= 0, "
                             f"got {self.value!r} and {self.u!r}")


@dataclass(frozen=True)
class Estimate:
    """A mean of correlated records: value, standard uncertainty, counts, and how it was made."""

    value: float
    u: float
    unit: str
    n: int
    n_eff: float
    method: str

    def __post_init__(self) -> None:
        if not self.u >= 0:
            raise ValueError(f"an estimate needs u >= 0, got {self.u!r}")
        if not 1 <= self.n_eff <= self.n:
            raise ValueError(f"an estimate needs 1 <= n_eff <= n, got {self.n_eff!r} of {self.n!r}")


# The tables a run hands over and publishes: column -> kind.
# text: str, "" where there is none; number: float, NaN where not evaluated; count: int;
# time: datetime64[ns, UTC]. Units stand in the column name or in the table's `unit` column.
TABLES: dict[str, dict[str, str]] = {
    "surfaces": {
        "campaign": "text", "surface": "text", "quantity": "text", "kind": "text", "unit": "text",
        "value": "number", "u": "number", "lower": "number", "upper": "number",
        "coverage": "number", "k": "number", "dof": "number", "n_patches": "count",
        "n_passes": "count", "n_records": "count", "n_effective": "number",
        "u_at_least": "number", "spread": "number", "end_error": "number", "needed": "number",
        "status": "text", "note": "text",
    },
    "passes": {
        "campaign": "text", "surface": "text", "patch": "text", "pass": "text",
        "quantity": "text", "kind": "text", "mode": "text", "instrument": "text", "unit": "text",
        "start_utc": "time", "stop_utc": "time", "value_raw": "number", "value": "number",
        "u_within": "number", "n_records": "count", "n_effective": "number",
        "zenith_deg": "number", "flags": "text", "status": "text", "note": "text",
    },
    "dwells": {
        "campaign": "text", "surface": "text", "patch": "text", "pass": "text", "dwell": "count",
        "start_utc": "time", "stop_utc": "time", "value": "number", "u": "number",
        "n_records": "count",
    },
    "budget": {
        "campaign": "text", "surface": "text", "quantity": "text", "kind": "text",
        "scope": "text", "source": "text", "unit": "text", "u_input": "number",
        "contribution": "number", "share": "number", "narrower": "number",
    },
    "ledger": {
        "campaign": "text", "logger": "text", "file": "text", "surface": "text", "patch": "text",
        "pass": "text", "disposition": "text", "reason": "text", "records": "count",
    },
    "waterfall": {
        "campaign": "text", "logger": "text", "file": "text", "column": "text",
        "surface": "text", "patch": "text", "pass": "text", "disposition": "text",
        "reason": "text", "records": "count", "remaining": "count",
    },
    "checks": {
        "campaign": "text", "check": "text", "logger": "text", "column": "text",
        "surface": "text", "pass": "text", "severity": "text", "records": "count",
        "message": "text", "source": "text",
    },
    "clocks": {
        "campaign": "text", "logger": "text", "method": "text", "offset_s": "number",
        "u_s": "number", "drift_ppm": "number", "status": "text", "note": "text",
    },
    "differences": {
        "campaign": "text", "quantity": "text", "kind": "text", "surface": "text",
        "other": "text", "unit": "text", "difference": "number", "u": "number",
        "lower": "number", "upper": "number", "coverage": "number",
        "end_error": "number", "lower_all": "number", "upper_all": "number",
        "p_adjusted": "number",
        "could_have_missed": "number", "verdict": "text", "note": "text",
    },
    "ranks": {
        "campaign": "text", "quantity": "text", "kind": "text", "surface": "text",
        "place": "count", "probability": "number",
    },
    "changes": {
        "campaign": "text", "earlier": "text", "quantity": "text", "kind": "text",
        "surface": "text", "control": "text", "method": "text", "unit": "text",
        "change": "number", "u": "number", "lower": "number", "upper": "number",
        "coverage": "number", "end_error": "number", "comparability": "text",
        "could_have_missed": "number",
        "verdict": "text", "note": "text",
    },
    "trends": {
        "campaign": "text", "quantity": "text", "kind": "text", "surface": "text",
        "control": "text", "method": "text", "unit": "text", "dates": "count", "first": "text",
        "last": "text", "slope": "number", "u": "number", "lower": "number", "upper": "number",
        "coverage": "number", "p": "number", "verdict": "text", "note": "text",
    },
    "corrections": {
        "campaign": "text", "surface": "text", "pass": "text", "quantity": "text",
        "kind": "text", "unit": "text", "step": "text", "value": "number",
    },
    "histograms": {
        "campaign": "text", "surface": "text", "patch": "text", "pass": "text",
        "quantity": "text", "kind": "text", "unit": "text", "lower": "number", "upper": "number",
        "n_records": "count",
    },
    "derived": {
        "campaign": "text", "surface": "text", "product": "text", "form": "text", "unit": "text",
        "value": "number", "u": "number", "lower": "number", "upper": "number",
        "coverage": "number", "status": "text", "note": "text",
    },
    "geometry": {
        "campaign": "text", "surface": "text", "patch": "text", "pass": "text",
        "height_m": "number", "role": "text", "foreign": "number", "contamination": "number",
        "shade": "number", "effect": "number", "note": "text",
    },
}

PUBLISHED = tuple(TABLES)


def table(name: str, rows: Sequence[Mapping[str, Any]]) -> pd.DataFrame:
    """Return `rows` as the table `name`, columns in contract order and of the contract's kinds.

    Raises
    ------
    ValueError
        If a row lacks a column of the contract or brings one that it does not know.
    """
    contract = TABLES[name]
    for row in rows:
        if row.keys() != contract.keys():
            odd = sorted(row.keys() ^ contract.keys())
            raise ValueError(f"table {name!r}: row and contract differ in {', '.join(odd)}")
    frame = pd.DataFrame(rows, columns=list(contract))
    for column, kind in contract.items():
        frame[column] = _as_kind(frame[column], kind)
    return frame


def require(frame: pd.DataFrame, name: str) -> pd.DataFrame:
    """Return `frame` unchanged if it keeps the contract of the table `name`.

    Raises
    ------
    ValueError
        If a column is missing, or text holds a missing value.
    """
    missing = [column for column in TABLES[name] if column not in frame.columns]
    if missing:
        raise ValueError(f"table {name!r} lacks column(s) {', '.join(missing)}")
    for column, kind in TABLES[name].items():
        if kind == "text" and frame[column].isna().any():
            raise ValueError(f"table {name!r}: column {column!r} holds a missing text")
    return frame


def _as_kind(values: pd.Series, kind: str) -> pd.Series:
    if kind == "text":
        return values.astype(object)
    if kind == "count":
        return values.astype("int64")
    if kind == "time":
        return pd.to_datetime(values, utc=True).dt.as_unit("ns")
    return values.astype("float64")
