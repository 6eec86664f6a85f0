"""Times of the field sheet: wall time at the site, or full ISO 8601, to UTC."""

from __future__ import annotations

import re
from dataclasses import dataclass
from datetime import UTC, date, datetime, time, timedelta
from zoneinfo import ZoneInfo

from surveykit.intake.params.base import since_epoch_ns

_WALL = re.compile(r"(\d{1,2}):(\d{2})(?::(\d{2})(?:[.,](\d{1,6}))?)?(?:\s*([AaPp])\.?[Mm]\.?)?",
                   re.ASCII)
_ISO = re.compile(r"\d{4}-\d{2}-\d{2}[T ]\d{2}:\d{2}(:\d{2}(?:[.,]\d{1,6})?)?"
                  r"\s*(Z|[+-]\d{2}:?\d{2})?", re.ASCII)
_FRACTION = re.compile(r"\d*[.,]\d+", re.ASCII)
FORMS = "H:MM:SS, or a full time such as 2025-07-24T14:05:00"


@dataclass(frozen=True)
class SheetTime:
    """One time: UTC in ns by the sheet's watch, the wall time, whether seconds were written."""

    time_ns: int
    wall: datetime
    seconds: bool
    full: bool


def read_time(text: str, day: date, zone: str) -> SheetTime:
    """Return one time cell of the sheet.

    Parameters
    ----------
    text : str
        H:MM, H:MM:SS, either with AM or PM, or full ISO 8601 with or without an offset.
    day : date
        Date of a time that states none.
    zone : str
        Zone of a time that states no offset.

    Raises
    ------
    ValueError
        With what is wrong and what to write.

    Examples
    --------
    >>> read_time("2:05:30 PM", date(2025, 7, 24), "UTC").wall.isoformat()
    '2025-07-24T14:05:30'
    """
    wall = _WALL.fullmatch(text)
    if wall:
        local = datetime.combine(day, _time_of_day(text, *wall.groups(default="")))
        return SheetTime(_utc_ns(local, zone, text), local, bool(wall[3]), False)
    iso = _ISO.fullmatch(text)
    if iso:
        try:
            read = datetime.fromisoformat(re.sub(r"\s+(?=[Z+-])", "", text))
            if not 1950 <= read.year <= 2199:
                raise ValueError
        except ValueError:
            raise ValueError(f"{text!r} is no time; write {FORMS}") from None
        if read.tzinfo is None:
            return SheetTime(_utc_ns(read, zone, text), read, iso[1] is not None, True)
        local = read.astimezone(ZoneInfo(zone)).replace(tzinfo=None)
        return SheetTime(since_epoch_ns(read), local, iso[1] is not None, True)
    if _FRACTION.fullmatch(text):
        share = float(text.replace(",", ".")) % 1
        meant = (datetime(2000, 1, 1, tzinfo=UTC)
                 + timedelta(seconds=round(share * 86400))).strftime("%H:%M:%S")
        raise ValueError(f"{text!r} is a fraction of a day as spreadsheets store it, it would mean "
                         f"{meant}; write the time, and give the cells the format text")
    raise ValueError(f"{text!r} is no time; write {FORMS}")


def _time_of_day(text: str, hours: str, minute: str, second: str, fraction: str,
                 half: str) -> time:
    hour = int(hours)
    if half and not 1 <= hour <= 12:
        raise ValueError(f"{text!r} is no time: with AM or PM hours run from 1 to 12; "
                         f"write {FORMS}")
    if half:
        hour = hour % 12 + (12 if half in "Pp" else 0)
    try:
        return time(hour, int(minute), int(second or 0), int(fraction.ljust(6, "0")))
    except ValueError:
        raise ValueError(f"{text!r} is no time of day; write {FORMS}") from None


def _utc_ns(local: datetime, zone: str, text: str) -> int:
    """Return the only UTC time whose wall time in the zone is `local`."""
    found = set()
    for fold in (0, 1):
        utc = local.replace(tzinfo=ZoneInfo(zone), fold=fold).astimezone(UTC)
        if utc.astimezone(ZoneInfo(zone)).replace(tzinfo=None) == local:
            found.add(utc)
    if not found:
        raise ValueError(f"{text!r} does not exist in {zone} on {local:%Y-%m-%d} "
                         "(clocks go forward); write the time the watch should have shown")
    if len(found) > 1:
        first = min(found).astimezone(ZoneInfo(zone)).isoformat()
        raise ValueError(f"{text!r} occurs twice in {zone} on {local:%Y-%m-%d} (clocks go back); "
                         f"write it with its offset, such as {first}")
    return since_epoch_ns(found.pop())
