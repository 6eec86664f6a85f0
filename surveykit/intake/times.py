"""Times in logs: from what is written to UTC."""

from __future__ import annotations

import re
from collections.abc import Callable
from datetime import datetime
from zoneinfo import ZoneInfo

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from surveykit.core import BoolArray, InputError, IntArray
from surveykit.intake.records import NO_TIME_NS, NS

NO_OFFSET = -(2**31)
FIRST_NS, END_NS = (int(np.datetime64(year, "ns").astype(np.int64)) for year in ("1700", "2200"))
DATES = ("%Y-%m-%d", "%d.%m.%Y", "%d/%m/%Y", "%m/%d/%Y", "%Y/%m/%d", "%d-%m-%Y", "%d.%m.%y",
         "%d/%m/%y", "%m/%d/%y")  # as people and loggers write them
_OFFSET = re.compile(r"^\s*([\d-]+(?:[T ]\s*[\d:.,]+)?)\s*"
                     r"(Z|[+-](?:[01]\d|2[0-3])(?::?[0-5]\d)?)?\s*$", re.ASCII)
_WIDTHS = {"Y": 4, "m": 2, "d": 2, "H": 2, "M": 2, "S": 2}

Offsets = NDArray[np.int32]
Locate = Callable[[BoolArray], str]


def read_times(column: pd.Series, form: str) -> tuple[IntArray, Offsets]:
    """Return times as written, and the offsets written with them.

    Parameters
    ----------
    column : Series, shape (n,)
        datetime64, or text.
    form : str
        "iso8601" or a strptime format.

    Returns
    -------
    wall_ns : ndarray of int64, shape (n,)
        Time as written, in ns since 1970-01-01 00:00 of the same clock; NO_TIME_NS where the
        text is no time.
    offset_s : ndarray of int32, shape (n,)
        Offset from UTC as written; NO_OFFSET where none is.
    """
    if column.dtype.kind != "M":
        texts = column.to_numpy(dtype=object)
        if form != "iso8601":
            return _formatted(texts, form)
        column = _iso(texts)
        if column.dtype.kind != "M":
            return _of_several_offsets(texts)
    offsets = np.full(len(column), NO_OFFSET, dtype=np.int32)
    zone = column.dt.tz
    if zone is not None:
        offsets[:] = int(zone.utcoffset(None).total_seconds())
        column = column.dt.tz_localize(None)
    wall = _in_ns(column)
    offsets[wall == NO_TIME_NS] = NO_OFFSET
    return wall, offsets


def _in_ns(column: pd.Series) -> IntArray:
    """Return datetime64 of any unit in ns; no time outside the years 1700 to 2199."""
    scale = {"s": NS, "ms": 1_000_000, "us": 1000, "ns": 1}[column.dt.unit]
    values = column.to_numpy().view(np.int64)
    inside = (values >= FIRST_NS // scale) & (values < END_NS // scale)
    return values * scale if inside.all() else np.where(inside, values * scale, NO_TIME_NS)


def _iso(texts: NDArray[np.object_]) -> pd.Series:
    if any("," in text for text in texts if isinstance(text, str)):
        texts = np.array([text.replace(",", ".") if isinstance(text, str) else text
                          for text in texts], dtype=object)
    try:
        return pd.Series(pd.to_datetime(pd.Series(texts, dtype=object), format="ISO8601",
                                        errors="coerce"))
    except ValueError:  # more than one offset
        return pd.Series(texts)


def _of_several_offsets(texts: NDArray[np.object_]) -> tuple[IntArray, Offsets]:
    """Read ISO 8601 times and their offsets apart; each different offset once."""
    parts = pd.Series(texts, dtype=object).str.extract(_OFFSET)
    wall = _in_ns(_iso(parts[0].to_numpy(dtype=object)))
    code, different = pd.factorize(parts[1].fillna(""))
    offset_s = [_offset_s(str(text)) for text in different]
    offsets = np.array(offset_s, dtype=np.int32)[code]
    offsets[wall == NO_TIME_NS] = NO_OFFSET
    return wall, offsets


def _offset_s(text: str) -> int:
    if not text:
        return NO_OFFSET
    offset = datetime.fromisoformat(f"2000-01-01T00:00{text}").utcoffset()
    return int(offset.total_seconds()) if offset is not None else NO_OFFSET


def _with_offsets(texts: NDArray[np.object_], form: str) -> tuple[IntArray, Offsets]:
    """Read times whose format holds an offset, one by one."""
    walls: list[datetime | None] = [None] * len(texts)
    offsets = np.full(len(texts), NO_OFFSET, dtype=np.int32)
    for i, text in enumerate(texts):
        try:
            time = datetime.strptime(text.strip(), form)  # noqa: DTZ007 - form has %z
        except (ValueError, AttributeError):
            continue
        offset = time.utcoffset()
        if offset is not None:
            offsets[i] = int(offset.total_seconds())
        walls[i] = time.replace(tzinfo=None)
    return _in_ns(pd.Series(np.array(walls, dtype="datetime64[us]"))), offsets


def _formatted(texts: NDArray[np.object_], form: str) -> tuple[IntArray, Offsets]:
    if "%z" in form.lower():
        return _with_offsets(texts, form)
    wall = _sliced(texts, form)
    rest = (wall == NO_TIME_NS) & pd.notna(texts)
    if rest.any():
        stripped = np.array([str(text).strip() for text in texts[rest]], dtype=object)
        times = pd.to_datetime(pd.Series(stripped, dtype=object), format=form, errors="coerce")
        wall[rest] = _in_ns(times)
    return wall, np.full(len(texts), NO_OFFSET, dtype=np.int32)


def _sliced(texts: NDArray[np.object_], form: str) -> IntArray:
    """Read times of fixed width by the places of their digits: far faster than one by one."""
    wall = np.full(len(texts), NO_TIME_NS, dtype=np.int64)
    places = _places(form)
    try:
        table = texts.astype("S") if len(texts) else np.zeros(0, dtype="S1")
    except UnicodeEncodeError:
        return wall
    width = table.dtype.itemsize
    if places is None or not len(texts) or width < places["end"]:
        return wall
    cells = np.ascontiguousarray(table.view(np.uint8).reshape(len(texts), width).T)
    good = np.ones(len(texts), dtype=np.bool_)
    for at, character in enumerate(places["literals"]):
        if character:
            good &= cells[at] == character

    def number(at: int, digits: int) -> NDArray[np.int32]:
        value = np.zeros(len(texts), dtype=np.int32)
        for digit in cells[at: at + digits] - np.uint8(48):
            np.logical_and(good, digit < 10, out=good)
            value *= np.int32(10)
            value += digit
        return value

    part = {name: number(places[name], digits) for name, digits in _WIDTHS.items()}
    fraction = np.zeros(len(texts), dtype=np.int64)
    scale = 100_000_000
    ended = np.zeros(len(texts), dtype=np.bool_)
    for column in range(places["end"], width):
        digit = cells[column].astype(np.int64) - 48
        ended |= cells[column] == 0
        good &= ended | ((digit >= 0) & (digit < 10) & places["fraction"] & (scale > 0))
        fraction += np.where(ended, 0, digit) * scale
        scale //= 10
    if places["fraction"]:
        good &= cells[places["end"]] != 0 if width > places["end"] else False
    good &= (part["m"] >= 1) & (part["m"] <= 12) & (part["H"] < 24) & (part["M"] < 60)
    good &= part["S"] < 60
    day, good = _days(part["Y"], part["m"], part["d"], good)
    seconds = day * 86400 + (part["H"] * 3600 + part["M"] * 60 + part["S"])
    good &= (seconds >= FIRST_NS // NS) & (seconds < END_NS // NS)
    wall[good] = (seconds * NS + fraction)[good]
    return wall


def _days(year: NDArray[np.int32], month: NDArray[np.int32], day: NDArray[np.int32],
          good: BoolArray) -> tuple[IntArray, BoolArray]:
    """Return days since 1970, each different month looked up once, and which are days."""
    code = np.where(good, year * 12 + month - 1, 1970 * 12)
    first, last = int(code.min()), int(code.max())
    months = (np.arange(first, last + 2) - 1970 * 12).astype("datetime64[M]")
    begin = months.astype("datetime64[D]").astype(np.int64)
    within = (day >= 1) & (day <= np.diff(begin)[code - first])
    return begin[code - first] + day - 1, good & within


def _places(form: str) -> dict | None:
    """Return where each part of a fixed-width format stands; None if it is not of fixed width."""
    fraction = form.endswith("%f")
    found: dict = {"literals": [], "fraction": fraction}
    for piece in re.findall(r"%.|.", form.removesuffix("%f"), re.DOTALL):
        if len(piece) == 1:
            found["literals"].append(ord(piece))
        elif piece[1] in _WIDTHS and piece[1] not in found:
            found[piece[1]] = len(found["literals"])
            found["literals"] += [0] * _WIDTHS[piece[1]]
        else:
            return None
    found["end"] = len(found["literals"])
    return found if found.keys() >= _WIDTHS.keys() and max(found["literals"]) < 128 else None


def to_utc(wall_ns: IntArray, offset_s: Offsets, zone: str, locate: Locate) -> IntArray:
    """Return times in UTC, in ns; NO_TIME_NS stays.

    Parameters
    ----------
    wall_ns, offset_s : ndarray, shape (n,)
        From `read_times`.
    zone : str
        IANA name or UTC.
    locate : callable
        From a mask of the records at fault to the words that name the first of them.

    Raises
    ------
    InputError
        If a time without an offset does not exist in the zone or occurs twice, or if an offset in
        the log is not the zone's at that time.
    """
    with_offset = offset_s != NO_OFFSET
    utc = wall_ns
    if with_offset.any():
        utc = wall_ns.copy()
        utc[with_offset] -= offset_s[with_offset].astype(np.int64) * NS
        there = pd.DatetimeIndex(utc.view("datetime64[ns]"), tz="UTC").tz_convert(ZoneInfo(zone))
        wrong = with_offset & (there.tz_localize(None).asi8 != wall_ns)
        if wrong.any():
            first = int(np.flatnonzero(wrong)[0])
            raise InputError(
                f"{locate(wrong)}: the log writes the offset {_hours(int(offset_s[first]))}, "
                f"but the zone {zone} has {there[first].strftime('%z') or '+0000'} then; "
                "write the zone the logger writes in under time.zone")
    if zone != "UTC" and not with_offset.all():
        utc = np.where(with_offset, utc, _localized(wall_ns, ~with_offset, zone, locate))
    return utc


def _localized(wall_ns: IntArray, plain: BoolArray, zone: str, locate: Locate) -> IntArray:
    wall = pd.DatetimeIndex(np.where(plain, wall_ns, NO_TIME_NS).view("datetime64[ns]"))
    utc = wall.tz_localize(ZoneInfo(zone), ambiguous="NaT", nonexistent="NaT")
    lost: BoolArray = np.asarray(utc.isna()) & np.asarray(wall.notna())
    if lost.any():
        first = wall[lost][0]
        gap = pd.isna(first.tz_localize(ZoneInfo(zone), nonexistent="NaT", ambiguous=True))
        what = ("does not exist (clocks go forward)" if gap else
                "occurs twice (clocks go back)")
        raise InputError(f"{locate(lost)}: the time {first.isoformat(sep=' ')} {what} in {zone}; "
                         "let the logger write UTC, or times with their offset; where it kept one "
                         "offset all day, write that as its zone, such as Etc/GMT-1 for +01:00")
    return utc.asi8


def _hours(offset_s: int) -> str:
    sign, minutes = "-" if offset_s < 0 else "+", abs(offset_s) // 60
    return f"{sign}{minutes // 60:02d}{minutes % 60:02d}"
