"""What one row of the field sheet cannot see alone: the day, a patch's rows, overlaps."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from datetime import datetime

from surveykit.intake.params import Campaign
from surveykit.intake.serving import Service
from surveykit.intake.sheet_times import SheetTime
from surveykit.intake.sheet_words import Entry
from surveykit.intake.times import DATES

Times = Mapping[int, Mapping[str, SheetTime]]


def day_faults(rows: Sequence[tuple[int, Mapping[str, str]]], times: Times,
               campaign: Campaign) -> tuple[list[str], list[str]]:
    """Return faults and notices of the columns `date` and `campaign`, where they are filled."""
    faults, notices = [], []
    dated = [(row, cells["date"]) for row, cells in rows if cells["date"]]
    wrong = [(row, text) for row, text in dated if not _is_date(text, campaign.date)]
    if wrong:
        faults.append(f"row {wrong[0][0]}: date {wrong[0][1]!r}{_more(wrong)}: the sheet is from "
                      f"another day than the campaign, {campaign.date}; take the right sheet, or "
                      "correct the date")
    others = [(row, cells["campaign"]) for row, cells in rows
              if cells["campaign"] not in ("", campaign.campaign)]
    if others:
        faults.append(f"row {others[0][0]}: campaign {others[0][1]!r}{_more(others)}: the sheet "
                      f"belongs to another campaign than {campaign.campaign}")
    if not dated and not any(time.full for row in times.values() for time in row.values()):
        notices.append("the sheet does not say its date")
    return faults, notices


def _more(rows: Sequence[object]) -> str:
    more = len(rows) - 1
    return f" (and {more} more row{'s' if more > 1 else ''})" if more else ""


def _is_date(text: str, day: str) -> bool:
    for form in DATES:
        try:
            if datetime.strptime(text, form).strftime("%Y-%m-%d") == day:  # noqa: DTZ007
                return True
        except ValueError:
            continue
    return False


def patch_faults(entries: Iterable[Entry]) -> Iterator[tuple[int, str]]:
    """Yield (row, fault): a patch belongs to one surface and has one size."""
    first: dict[str, Entry] = {}
    sized: dict[str, Entry] = {}
    for entry in entries:
        if entry.entry != "pass":
            continue
        before = first.setdefault(entry.patch, entry)
        if before.surface != entry.surface:
            yield entry.row, (
                f"patch {entry.patch!r} is on surface {entry.surface}, but row {before.row} says "
                f"{before.surface}; a patch belongs to one surface")
        if entry.length_m == entry.length_m:
            earlier = sized.setdefault(entry.patch, entry)
            if repr((earlier.width_m, earlier.length_m)) != repr((entry.width_m, entry.length_m)):
                yield entry.row, (f"patch {entry.patch!r} is {_size(entry)}, but row {earlier.row} "
                                  f"says {_size(earlier)}; write the size once")


def _size(entry: Entry) -> str:
    if entry.width_m != entry.width_m:
        return f"a disc of {entry.length_m:g} m"
    return f"{entry.width_m:g} m by {entry.length_m:g} m"


def swap_faults(entries: Iterable[Entry]) -> Iterator[tuple[int, str]]:
    """Yield (row, fault): the swaps of an instrument go in pairs, normal then inverted."""
    waiting: dict[str, Entry] = {}
    for entry in sorted(entries, key=lambda entry: (entry.start_ns, entry.row)):
        if entry.entry != "swap":
            continue
        first = waiting.pop(entry.instrument, None)
        if (entry.reading > 0) != (first is None):
            yield entry.row, (f"swap of {entry.instrument}: the rows go in pairs, normal then "
                              "inverted; correct the reading, or add the row that is missing")
        elif first is None:
            waiting[entry.instrument] = entry
    for entry in waiting.values():
        yield entry.row, (f"swap of {entry.instrument}: the inverted row of this pair is missing; "
                          "add it, or take this one out")


def overlap_faults(entries: Iterable[Entry], services: Mapping[int, Service],
                   times: Times) -> Iterator[tuple[int, str]]:
    """Yield (row, fault): passes of one logger and quantity must not overlap."""
    last: dict[tuple[str, str], Entry] = {}
    told: set[tuple[int, int]] = set()
    for entry in sorted(entries, key=lambda entry: (entry.start_ns, entry.row)):
        for logger in services[entry.row].loggers if entry.row in services else ():
            before = last.get((entry.quantity, logger))
            if before and entry.start_ns < before.stop_ns and (before.row, entry.row) not in told:
                told.add((before.row, entry.row))
                yield entry.row, (
                    f"starts at {times[entry.row]['start'].wall:%H:%M:%S}, before the pass of row "
                    f"{before.row} with the same instrument ({logger}) and quantity "
                    f"({entry.quantity}) stops at {times[before.row]['stop'].wall:%H:%M:%S}; "
                    "correct one of the times")
            if before is None or entry.stop_ns > before.stop_ns:
                last[entry.quantity, logger] = entry
