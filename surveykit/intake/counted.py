"""Times that a logger counts: seconds since 1970, or days of a year with hours and minutes."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from surveykit.core import FloatArray, IntArray
from surveykit.intake.records import NO_TIME_NS, NS
from surveykit.intake.times import END_NS, FIRST_NS, NO_OFFSET, Offsets

US = 1_000_000
FIRST_YEAR, LAST_YEAR = 1950, 2199


def counted_times(parts: Sequence[FloatArray], form: str,
                  year: int | None) -> tuple[IntArray, Offsets]:
    """Return times as written, to the microsecond, and that none has an offset.

    Parameters
    ----------
    parts : sequence of ndarray, shape (n,)
        The columns as numbers, NaN where there is none.
    form : str
        "epoch_s": seconds since 1970. "day_of_year": day with its fraction (1.5 is noon of
        1 January); day, hhmm; year, day, hhmm; or year, day, hhmm, seconds. hhmm is 930 at half
        past nine; 2400 ends its day.
    year : int or None
        Year of days that stand without one.

    Returns
    -------
    wall_ns : ndarray of int64, shape (n,)
        Time as written, in ns since 1970-01-01 00:00 of the same clock; NO_TIME_NS where the
        numbers are no time.
    offset_s : ndarray of int32, shape (n,)
        NO_OFFSET.

    Examples
    --------
    >>> import numpy as np
    >>> wall, _ = counted_times([np.array([205.0]), np.array([1430.0])], "day_of_year", 2025)
    >>> wall.view("datetime64[ns]").astype("datetime64[s]")
    array(['2025-07-24T14:30:00'], dtype='datetime64[s]')
    """
    seconds = parts[0] if form == "epoch_s" else _of_year(parts, year)
    with np.errstate(invalid="ignore"):
        good = (seconds >= FIRST_NS / NS) & (seconds < END_NS / NS)
    micro = np.rint(np.where(good, seconds, 0.0) * US).astype(np.int64)
    return (np.where(good, micro * 1000, NO_TIME_NS),
            np.full(len(seconds), NO_OFFSET, dtype=np.int32))


def _of_year(parts: Sequence[FloatArray], year: int | None) -> FloatArray:
    """Return seconds since 1970; NaN where a part is out of its range."""
    first, *rest = parts
    years = first if len(parts) > 2 else np.full(len(first), float(year or 0))
    day = rest[0] if len(parts) > 2 else first
    clock = rest[-1 if len(parts) < 4 else 1] if rest else np.zeros(len(first))
    second = rest[2] if len(parts) == 4 else np.zeros(len(first))
    with np.errstate(invalid="ignore"):
        good = (years >= FIRST_YEAR) & (years <= LAST_YEAR) & (years % 1 == 0)
        hour, minute = clock // 100, clock % 100
        good &= (clock >= 0) & (clock <= 2400) & (clock % 1 == 0) & (minute < 60)
        good &= (second >= 0) & (second < 60) & ((second == 0) | (clock < 2400))
        begin = (np.where(good, years, 1970).astype(np.int64) - 1970).astype("datetime64[Y]")
        first_day = begin.astype("datetime64[D]").astype(np.int64)
        length = (begin + 1).astype("datetime64[D]").astype(np.int64) - first_day
        good &= (day >= 1) & (day < length + 1) & ((day % 1 == 0) | (not rest))
    seconds = (first_day + day - 1) * 86400.0 + hour * 3600 + minute * 60 + second
    return np.where(good, seconds, np.nan)
