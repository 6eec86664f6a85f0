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
from surveykit.intake import cells, dialect
from surveykit.intake.counted import counted_times
from surveykit.intake.params.instruments import Layout
from surveykit.intake.records import NO_TIME_NS
from surveykit.intake.sniffing_words import quantity_of, unit_of
from surveykit.intake.times import DATES, NO_OFFSET, read_times

SAMPLE_BYTES, SAMPLE_LINES, LEAST_SHARE = 256 * 1024, 400, 0.8
DELIMITERS = ("\t", ";", "|", ",")
_NUMBER = re.compile(r"[+-]?(\d+([.,]\d*)?|[.,]\d+)([eE][+-]?\d+)?")
_MISSING = re.compile(r"|-?9{3,}(\.9*|,9*)?|-?6999|[\"']?(nan|na|n/a|null|none|-?inf|-+|\*+)[\"']?"
                      r"|#.*", re.IGNORECASE)
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
    layout, fields, share = _delimiter(lines, path)
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
    readings = [cell for name, column in table.items() if name not in time.columns
                for cell in column]
    layout = layout.model_copy(update={
        "encoding": encoding, "skip_lines": head, "unit_lines": first - head - 1,
        "decimal": "," if layout.delimiter != "," and any(
            re.fullmatch(r"[+-]?\d*,\d+", cell) for cell in readings) else ".",
        "missing": tuple(sorted({*layout.missing} | {
            cell for cell in readings if _MISSING.fullmatch(cell)
            and (cell.startswith("-") or not _NUMBER.fullmatch(cell))}))})
    columns = (_column(name, units[at], table[name], layout) for at, name in enumerate(header)
               if name and name not in time.columns)
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


def _delimiter(lines: list[str], path: Path) -> tuple[Layout, int, float]:
    """Return the delimiter, the number of fields and the share of the lines that have them."""
    later = [line for line in lines[len(lines) // 4:] if line.strip()]
    for delimiter in DELIMITERS:
        layout = Layout(delimiter=delimiter)
        counts = Counter(len(dialect.cells_of(line, layout)) for line in later)
        fields, most = counts.most_common(1)[0] if counts else (0, 0)
        if fields > 1 and most >= LEAST_SHARE * len(later):
            return layout, fields, most / len(later)
    raise InputError(f"{path}: the lines have no regular number of columns, be it with tab, "
                     "semicolon, bar or comma; name a logger's file of delimited text")


def _is_record(row: list[str]) -> bool:
    numbers = sum(bool(_NUMBER.fullmatch(cell)) for cell in row)
    readings = sum(bool(re.match(r"[+-]?\d", cell)) for cell in row)
    missing = sum(bool(_MISSING.fullmatch(cell)) for cell in row)
    return numbers >= 1 and 2 * (readings + missing) > len(row)


def _fits(texts: list[str], form: str) -> bool:
    wall, _ = read_times(pd.Series(texts, dtype=object), form)
    return bool((wall != NO_TIME_NS).mean() >= LEAST_SHARE)


def _time(table: dict[str, list[str]], path: Path) -> TimeGuess:
    dated = [f"{day} {clock}" for day in DATES for clock in _CLOCKS]
    pairs = [(day, clock) for day in table for clock in table if day != clock
             and re.search(r"\d[-./]\d", table[day][0]) and ":" in table[clock][0]]
    for columns in (*((name,) for name in table), *pairs):
        texts = [" ".join(parts) for parts in zip(*(table[name] for name in columns), strict=True)]
        if re.match(r"\s*\d{4}-\d\d-\d\d[T ]\d", texts[0]) and _fits(texts, "iso8601"):
            _, offsets = read_times(pd.Series(texts, dtype=object), "iso8601")
            return TimeGuess(columns, "iso8601", bool((offsets != NO_OFFSET).all()), (), texts[0])
        fitting = [form for form in dated if _fits(texts, form)]
        if fitting:
            return TimeGuess(columns, fitting[0], False, tuple(fitting[1:]), texts[0])
    counted = _counted(table)
    if counted is None:
        raise InputError(f"{path}: no column looks like times; write the entry by hand, with the "
                         "format of its times")
    return counted


def _counted(table: dict[str, list[str]]) -> TimeGuess | None:
    """Return the columns that count: seconds since 1970, or year, day of year and hhmm."""
    numbers = {name: pd.to_numeric(pd.Series(texts).str.replace(",", "."), errors="coerce")
               for name, texts in table.items()}
    for name, values in numbers.items():
        if values.between(6e8, 7e9).mean() >= LEAST_SHARE and values.is_monotonic_increasing:
            return TimeGuess((name,), "epoch_s", True, (), table[name][0])
    names = list(numbers)
    for at, name in enumerate(names[:-1]):
        if not re.search("day|doy|jul", name, re.IGNORECASE):
            continue
        for first in range(max(at - 1, 0), at + 1):  # with the column of years before it, without
            columns = tuple(names[first: at + 2])
            wall, _ = counted_times([numbers[one].to_numpy(float) for one in columns],
                                    "day_of_year", 2024)  # of 366 days
            if (wall != NO_TIME_NS).mean() >= LEAST_SHARE:
                return TimeGuess(columns, "day_of_year", False, (),
                                 " ".join(table[one][0] for one in columns))
    return None


def _column(name: str, unit: str, texts: list[str], layout: Layout) -> ColumnGuess | None:
    values = cells.numbers_of(pd.Series(texts, dtype=object), layout).values  # noqa: PD011
    if np.isnan(values).all():
        return None
    low, median, high = (float(v) for v in np.nanquantile(values, [0, 0.5, 1]))
    quantity = quantity_of(name)
    return ColumnGuess(name, quantity, unit_of(name, unit, quantity, median), low, median, high)
