"""A first look at a logger's file: how it seems to be written. Every finding is a guess."""

from __future__ import annotations

import re
import zlib
from collections import Counter
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd

from surveykit.core import InputError
from surveykit.intake import dialect
from surveykit.intake.params.instruments import Layout
from surveykit.intake.records import NO_TIME_NS
from surveykit.intake.sniffing_words import quantity_of, unit_of
from surveykit.intake.times import read_times

SAMPLE_BYTES, SAMPLE_LINES, LEAST_SHARE = 256 * 1024, 400, 0.8
DELIMITERS = ("\t", ";", "|", ",")
_NUMBER = re.compile(r"[+-]?(\d+([.,]\d*)?|[.,]\d+)([eE][+-]?\d+)?")
_MISSING = re.compile(r"|-?9{3,}(\.9*|,9*)?|-?6999|[\"']?(nan|na|n/a|null|none|-?inf|-+|\*+)[\"']?"
                      r"|#.*", re.IGNORECASE)
_DATES = ("%Y-%m-%d", "%d.%m.%Y", "%d/%m/%Y", "%m/%d/%Y", "%Y/%m/%d", "%d-%m-%Y", "%d.%m.%y",
          "%d/%m/%y", "%m/%d/%y")
_CLOCKS = ("%H:%M:%S", "%H:%M", "%H:%M:%S.%f", "%H:%M:%S,%f", "%I:%M:%S %p", "%I:%M %p")


@dataclass(frozen=True)
class TimeGuess:
    """The columns of the time, its format, whether offsets stand in it, other formats that fit."""

    columns: tuple[str, ...]
    format: str
    offsets: bool
    others: tuple[str, ...]
    example: str


@dataclass(frozen=True)
class ColumnGuess:
    """A column of numbers: what it may hold ("" if its name says nothing), and its range."""

    header: str
    quantity: str
    unit: str
    low: float
    median: float
    high: float


@dataclass(frozen=True)
class Guess:
    """What a file seems to be."""

    layout: Layout
    header: tuple[str, ...]
    share: float
    time: TimeGuess
    columns: tuple[ColumnGuess, ...]


def look_at(path: Path) -> Guess:
    """Return how a logger's file seems to be written.

    Raises
    ------
    InputError
        If it cannot be read, or has no regular lines, no header, or no times.
    """
    lines, encoding = _lines(path)
    delimiter, fields, share = _delimiter(lines, path)
    layout = Layout(delimiter=delimiter, decimal="," if delimiter == "\t" else ".",
                    encoding=encoding)  # type: ignore[arg-type]
    rows = [dialect.cells_of(line, layout) for line in lines]
    first = next((at for at, row in enumerate(rows) if len(row) == fields and _is_record(row)),
                 None)
    if first is None:
        raise InputError(f"{path}: no line looks like a record of numbers; name a log with records")
    head = first
    while head and len(rows[head - 1]) == fields and first - head < 3:
        head -= 1
    if head == first:
        raise InputError(f"{path}, line {first + 1}: no header stands above the records; write one "
                         f"line that names the {fields} columns")
    header = tuple(rows[head])
    units = rows[head + 1] if first > head + 1 else [""] * fields
    records = [row for row in rows[first:] if len(row) == fields and row != rows[head]]
    table = {name: [row[at] for row in records] for at, name in enumerate(header)}
    time = _time(table, path)
    decimal = "," if delimiter != "," and any(
        re.fullmatch(r"[+-]?\d*,\d+", cell) for name, cells in table.items()
        if name not in time.columns for cell in cells) else "."
    missing = {"", "NAN", "-9999"} | {
        cell for name, cells in table.items() if name not in time.columns
        for cell in cells if not _NUMBER.fullmatch(cell) and _MISSING.fullmatch(cell)}
    layout = Layout(delimiter=delimiter, decimal=decimal,  # type: ignore[arg-type]
                    encoding=layout.encoding,
                    skip_lines=head, unit_lines=first - head - 1, missing=tuple(sorted(missing)))
    columns = [_column(name, units[at], table[name], decimal) for at, name in enumerate(header)
               if name and name not in time.columns]
    return Guess(layout, header, share, time, tuple(found for found in columns if found))


def _lines(path: Path) -> tuple[list[str], str]:
    try:
        data = dialect.open_bytes(path)[:SAMPLE_BYTES]
    except (OSError, EOFError, zlib.error) as error:
        raise InputError(f"{path}: cannot be read ({getattr(error, 'strerror', None) or error}); "
                         "name a logger's file") from None
    if b"\0" in data or not data.strip():
        raise InputError(f"{path}: is {'no text' if data.strip() else 'empty'}; "
                         "name a logger's file of delimited text")
    data = data[: data.rfind(b"\n") + 1] or data
    try:
        return data.decode("utf-8-sig").splitlines()[:SAMPLE_LINES], "utf-8"
    except UnicodeDecodeError:
        return data.decode("windows-1252", "replace").splitlines()[:SAMPLE_LINES], "windows-1252"


def _delimiter(lines: list[str], path: Path) -> tuple[str, int, float]:
    """Return the delimiter, the number of fields and the share of the lines that have them."""
    for delimiter in DELIMITERS:
        layout = Layout(delimiter=delimiter, decimal="," if delimiter != "," else ".")
        later = [line for line in lines[len(lines) // 4:] if line.strip()]
        counts = Counter(len(dialect.cells_of(line, layout)) for line in later)
        fields, most = counts.most_common(1)[0] if counts else (0, 0)
        if fields > 1 and most >= LEAST_SHARE * len(later):
            return delimiter, fields, most / len(later)
    raise InputError(f"{path}: the lines have no regular number of columns, be it with tab, "
                     "semicolon, bar or comma; name a logger's file of delimited text")


def _is_record(row: list[str]) -> bool:
    numbers = sum(bool(_NUMBER.fullmatch(cell)) for cell in row)
    readings = sum(bool(re.match(r"[+-]?\d", cell)) for cell in row)
    missing = sum(bool(_MISSING.fullmatch(cell)) for cell in row)
    return numbers >= 1 and 2 * (readings + missing) > len(row)


def _fits(cells: list[str], form: str) -> bool:
    wall, _ = read_times(pd.Series(cells, dtype=object), form)
    return bool((wall != NO_TIME_NS).mean() >= LEAST_SHARE)


def _time(table: dict[str, list[str]], path: Path) -> TimeGuess:
    dated = [f"{day} {clock}" for day in _DATES for clock in _CLOCKS]
    pairs = [(day, clock) for day in table for clock in table if day != clock
             and re.search(r"\d[-./]\d", table[day][0]) and ":" in table[clock][0]]
    for columns in (*((name,) for name in table), *pairs):
        cells = [" ".join(parts) for parts in zip(*(table[name] for name in columns), strict=True)]
        if re.match(r"\s*\d{4}-\d\d-\d\d[T ]\d", cells[0]) and _fits(cells, "iso8601"):
            _, offsets = read_times(pd.Series(cells, dtype=object), "iso8601")
            return TimeGuess(columns, "iso8601", bool((offsets > -86400).all()), (), cells[0])
        fitting = [form for form in dated if _fits(cells, form)]
        if fitting:
            return TimeGuess(columns, fitting[0], False, tuple(fitting[1:]), cells[0])
    counted = _counted(table)
    if counted is None:
        raise InputError(f"{path}: no column looks like times; write the entry by hand, with the "
                         "format of its times")
    return counted


def _counted(table: dict[str, list[str]]) -> TimeGuess | None:
    """Return the columns that count: seconds since 1970, or year, day of year and hhmm."""
    numbers = {name: pd.to_numeric(pd.Series(cells).str.replace(",", "."), errors="coerce")
               for name, cells in table.items()}
    for name, values in numbers.items():
        if values.between(6e8, 7e9).mean() >= LEAST_SHARE and values.is_monotonic_increasing:
            return TimeGuess((name,), "epoch_s", True, (), table[name][0])
    names = list(numbers)
    for at in range(len(names) - 1):
        day, clock = numbers[names[at]], numbers[names[at + 1]]
        whole = (day % 1 == 0) & (clock % 1 == 0)
        fits = whole & day.between(1, 366) & clock.between(0, 2400) & (clock % 100 < 60)
        if fits.mean() < LEAST_SHARE or not re.search("day|doy|jul", names[at], re.IGNORECASE):
            continue
        year = numbers[names[at - 1]] if at else day
        has_year = bool(at and year.between(1990, 2100).mean() >= LEAST_SHARE)
        columns = tuple(names[at - has_year: at + 2])
        return TimeGuess(columns, "day_of_year", False, (),
                         " ".join(table[name][0] for name in columns))
    return None


def _column(name: str, unit: str, cells: list[str], decimal: str) -> ColumnGuess | None:
    values = np.array([float(cell.replace(decimal, ".")) if _NUMBER.fullmatch(cell)
                       and not _MISSING.fullmatch(cell) and (decimal == "," or "," not in cell)
                       else np.nan for cell in cells])
    good = values[np.isfinite(values)]
    if not good.size:
        return None
    low, median, high = (float(v) for v in np.quantile(good, [0, 0.5, 1]))
    quantity = quantity_of(name, median)
    return ColumnGuess(name, quantity, unit_of(name, unit, quantity, median), low, median, high)
