"""The kit: one entry a logger, one column a channel, and the channels they resolve to."""

from __future__ import annotations

import re
from collections.abc import Iterator
from datetime import UTC, datetime
from typing import Annotated, Any, Literal
from zoneinfo import ZoneInfo

from pydantic import BeforeValidator, Field

from surveykit.intake.params.base import TEXT_WRITE, Fault, Strict, Text, key, twice
from surveykit.intake.params.channels import Channel, channel
from surveykit.intake.params.heads import Column, Head
from surveykit.intake.params.quantities import MAIN
from surveykit.intake.params.settings import Settings

# one byte in every encoding, and in no number or time
DELIMITERS = "\t !#$%&()*,./:;<=>?@[\\]^_`{|}~"
COUNTED = ("epoch_s", "day_of_year")


def zone_fault(zone: str) -> str | None:
    """Return what is wrong with the name of a time zone, None if nothing is."""
    try:
        ZoneInfo(zone)
    except (ValueError, OSError, KeyError):
        return f"got {zone[:40]!r}; write UTC or an IANA name such as Europe/Lisbon"
    return None


class Layout(Strict):
    """How the logger's files are written."""

    delimiter: str = key("What separates the columns.", default=",", min_length=1, max_length=1,
                         write='one character in quotes, "," or ";" or "\\t"')
    decimal: Literal[".", ","] = key("Decimal mark.", default=".", write='"." or ","')
    skip_lines: int = key("Lines before the header.", default=0, ge=0, le=1000, unit="", whole=True)
    encoding: Literal["utf-8", "windows-1252", "latin-1"] = key(
        "Character encoding.", default="utf-8", write="utf-8, windows-1252 or latin-1")
    missing: Annotated[tuple[str, ...], Field(strict=False)] = key(
        "Codes of a missing reading, compared as text and as numbers.",
        default=("", "NAN", "-9999"), write='texts in quotes, such as ["", "NAN", "-9999"]')
    unit_lines: int = key(
        "Lines between the header and the records, such as one of units.", default=0, ge=0, le=20,
        unit="", whole=True)

    def faults(self) -> list[Fault]:
        """The delimiter separates, and is not the decimal mark."""
        if self.delimiter not in DELIMITERS:
            return [(("delimiter",), f"got {self.delimiter!r}; write one character in quotes, "
                     '"," or ";" or "\\t"')]
        if self.delimiter == self.decimal:
            return [(("delimiter",), f"got {self.delimiter!r}, which is the decimal mark as well; "
                     'write another delimiter, or decimal: "."')]
        return []


def one_or_more(data: Any) -> Any:
    """Return a list as it is, anything else as a list of one."""
    return data if isinstance(data, list | tuple) else [data]


class TimeColumn(Strict):
    """The column or columns of times."""

    column: Annotated[
        tuple[Text, ...], Field(strict=False, min_length=1, max_length=4),
        BeforeValidator(one_or_more, json_schema_input_type=Text | list[Text])] = key(
        "Header of the column of times; a list where date and time stand in columns of their own: "
        "format then describes them joined by a blank.",
        write="the header of the column of times, or a list such as [date, time]")
    format: Text = key(
        "iso8601, a strptime format, epoch_s (seconds since 1970 in UTC) or day_of_year (column: "
        "day with its fraction; [day, hhmm]; [year, day, hhmm]; or [year, day, hhmm, seconds]).",
        default="iso8601",
        write='iso8601, epoch_s, day_of_year, or a format such as "%d/%m/%Y %H:%M:%S"')
    zone: str = key("Time zone the logger writes in: UTC or an IANA name.",
                    write="UTC or an IANA name such as Europe/Lisbon")
    year: int | None = key("Year of a day_of_year that stands without one.", default=None,
                           ge=1950, le=2199, write="the year of the records, such as 2025")

    def faults(self) -> Iterator[Fault]:
        """The format must hold a whole date and time; the zone must exist."""
        count = len(self.column)
        yield from twice(("column",), self.column, "header")
        if self.format == "epoch_s":
            if count > 1:
                yield ("column",), f"got {count} columns; epoch_s is one column: write its header"
            if self.zone != "UTC":
                yield ("zone",), f"got {self.zone[:40]!r}; epoch_s counts in UTC: write UTC"
        elif self.format == "day_of_year":
            if (self.year is None) == (count < 3):
                yield ("year",), (
                    "missing; no column holds the year: write it, such as year: 2025"
                    if count < 3 else f"got {self.year} beside a column of years; leave it out")
        elif self.format != "iso8601" and not _holds_a_moment(self.format):
            yield ("format",), f"got {self.format!r}, which does not hold a whole date and time; " \
                               'write iso8601, or a format such as "%d/%m/%Y %H:%M:%S"'
        if self.year is not None and self.format != "day_of_year":
            yield ("year",), f"got {self.year}; only format day_of_year has a year: leave it out"
        wrong = zone_fault(self.zone)
        if wrong:
            yield ("zone",), wrong


def _holds_a_moment(form: str) -> bool:
    if not any(f"%{letter}" in form for letter in "YyGcx"):
        return False  # no year
    moment = datetime(2025, 7, 24, 13, 5, tzinfo=UTC)
    try:
        back = datetime.strptime(moment.strftime(form), form)  # noqa: DTZ007
    except (ValueError, re.error):  # re.error: a directive that stands twice
        return False
    return back.replace(tzinfo=UTC) == moment


class Instrument(Head):
    """One logger: one clock, one layout, one or more heads."""

    serial: Text | None = key("Serial number.", default=None, write=TEXT_WRITE + ", in quotes")
    layout: Layout = key("How its files are written.", default_factory=Layout,
                         write="{delimiter, decimal, skip_lines, encoding, missing}")
    time: TimeColumn = key("Its column of times.", write="{column, format, zone}")
    columns: dict[Text, Column] = key(
        "Its columns by header.", min_length=1,
        write="at least one column: its header, then {quantity, unit, ...}")
    interval_s: float | None = key(
        "Logging interval; absent: the median step.", default=None, gt=0, le=86400, unit="s")

    def faults(self) -> Iterator[Fault]:
        """One column a quantity; the time is a column of its own."""
        yield from super().faults()
        yield from self.misplaced("an entry", [c.quantity for c in self.columns.values()])
        seen: dict[str, str] = {}
        for header, column in self.columns.items():
            first = seen.setdefault(column.quantity, header)
            if first != header:
                yield ("columns", header), f"holds {column.quantity} as column {first!r} does; " \
                                           "keep one of the two"
            if column.quantity in MAIN and column.tau_s is None and self.tau_s is None:
                yield ("columns", header), (
                    f"time_constant_s missing; a column of {column.quantity} needs it (or t95_s), "
                    "here or in the entry: the ends of a pass are trimmed by it")
        for header in self.time.column:
            if header in self.columns:
                yield ("columns", header), "is a column of times; write another header"

    def channels(self, name: str, settings: Settings | None = None) -> tuple[Channel, ...]:
        """Return the channels of this entry, `name` in the kit, in the order of its columns."""
        return tuple(
            channel(name, header, column, self, self.serial or name, settings or Settings())
            for header, column in self.columns.items())
