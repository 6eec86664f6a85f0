"""The field sheet: one row an entry, read into UTC and SI."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Entry:
    """One row of the field sheet."""

    row: int
    entry: str
    surface: str
    patch: str
    quantity: str
    mode: str
    instrument: str
    start_ns: int
    stop_ns: int
    edge_u_s: float
    height_m: float
    width_m: float
    length_m: float
    lanes: int
    reading: float
    reading_u: float
    note: str


@dataclass(frozen=True)
class Sheet:
    """The field sheet as read."""

    path: str
    sha256: str
    entries: tuple[Entry, ...]
    notices: tuple[str, ...]
