"""Records of one logger: what every reader hands over and every later floor takes."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from surveykit.core import BoolArray, FloatArray, IntArray

NS = 1_000_000_000
NO_TIME_NS = -(2**63)
"""Time of a record whose time cannot be read (numpy's NaT)."""

MARKS = (
    "unreadable line",
    "unreadable time",
    "time stepped back",
    "repeated record",
    "conflicting records",
)
"""Reasons a reader can give, in the order in which a record's first one counts."""


@dataclass(frozen=True)
class FileFacts:
    """One raw file: path under the project root, SHA-256, size in bytes, number of records.

    `head_lines` counts lines that repeat the file's head, as a restarted logger writes them; they
    are no records.
    """

    path: str
    sha256: str
    size: int
    records: int
    head_lines: int = 0


@dataclass(frozen=True, eq=False)
class Records:
    """All records of one logger, ordered by time; equal times keep file and line order.

    Attributes
    ----------
    logger : str
        The logger's name in the parameter file.
    time_ns : ndarray of int64, shape (n,)
        UTC in ns since the epoch; `NO_TIME_NS` where the time is unreadable (these stand last).
    file, line : ndarray of int16 and int32, shape (n,)
        Index into `files` and line in that file (1 = its first line).
    channels : dict of ndarray of float64, shape (n,)
        Value by column in SI (K, W m-2, 1, m s-1, Pa; red and near infrared in the unit of their
        calibration), NaN where missing or unreadable.
    unreadable : dict of ndarray of bool, shape (n,)
        By column: the cell holds something that is neither a number nor a missing code.
    marks : dict of ndarray of bool, shape (n,)
        By reason (`MARKS`): the record is not to be used, and why.
    files : tuple of FileFacts
        The raw files in the order of their paths.
    resolution : dict of float
        By column: the printed step in SI; NaN where no number was printed.
    interval_s : float
        Declared interval, else the median step; NaN where there is none.
    """

    logger: str
    time_ns: IntArray
    file: NDArray[np.int16]
    line: NDArray[np.int32]
    channels: dict[str, FloatArray]
    unreadable: dict[str, BoolArray]
    marks: dict[str, BoolArray]
    files: tuple[FileFacts, ...]
    resolution: dict[str, float]
    interval_s: float

    def __len__(self) -> int:
        return len(self.time_ns)

    @property
    def n_timed(self) -> int:
        """Number of records whose time is readable; they stand first."""
        return len(self) - int(np.count_nonzero(self.time_ns == NO_TIME_NS))


def in_order(records: Records, stretch: IntArray | None = None) -> Records:
    """Return records ordered by time, repeated and conflicting ones marked, interval filled in.

    Records at one time that agree in every channel are one record logged twice: the first stays,
    later ones are marked "repeated record". If any two differ, all of that time are marked
    "conflicting records"; but records out of order, and those of two stretches between which the
    clock was set back, may differ, for there one time is two moments.

    Parameters
    ----------
    records : Records
        In any order.
    stretch : ndarray of int, shape (n,), optional
        Number of the stretch of each record, -1 if it is out of order; absent: one stretch, in
        which those marked "time stepped back" are out of order.
    """
    time_ns = records.time_ns
    if (time_ns[1:] < time_ns[:-1]).any() or (time_ns[:1] == NO_TIME_NS).any():
        last = np.where(time_ns == NO_TIME_NS, np.iinfo(np.int64).max, time_ns)
        order = np.argsort(last, kind="stable")
        records, stretch = _taken(records, order), stretch if stretch is None else stretch[order]
    time_ns = records.time_ns[:records.n_timed]
    repeated, conflicting = _same_time(records, time_ns, stretch)
    marks = records.marks | {"repeated record": repeated, "conflicting records": conflicting}
    interval_s = records.interval_s
    if np.isnan(interval_s):
        interval_s = _median_step_s(time_ns)
    return replace(records, marks={mark: marks[mark] for mark in (*MARKS, *marks)},
                   interval_s=interval_s)


def out_of_order(time_ns: IntArray) -> BoolArray:
    """Mark single records out of place: earlier or later than both neighbours, which are in order.

    Parameters
    ----------
    time_ns : ndarray of int64, shape (n,)
        Times in the order of the lines, all of them readable.

    Examples
    --------
    >>> out_of_order(np.array([1, 2, 90, 3, 4, 0, 5])).tolist()
    [False, False, True, False, False, True, False]
    """
    if (time_ns[1:] >= time_ns[:-1]).all():
        return np.zeros(len(time_ns), dtype=np.bool_)
    ends = np.iinfo(np.int64)
    before = np.concatenate([[ends.min], time_ns[:-1]])
    after = np.concatenate([time_ns[1:], [ends.max]])
    odd = (before <= after) & ((time_ns < before) | (time_ns > after))
    odd[:-1] &= ~odd[1:]  # of two that changed places, the earlier time
    return odd


def _median_step_s(time_ns: IntArray) -> float:
    steps = np.diff(time_ns)
    steps = steps if (steps > 0).all() else steps[steps > 0]
    if not steps.size:
        return float("nan")
    middle = steps[steps.size // 2]
    if 2 * np.count_nonzero(steps == middle) > steps.size + 1:  # a majority holds the median
        return float(middle) / NS
    return float(np.median(steps)) / NS


def _taken(records: Records, order: IntArray) -> Records:
    def taken(columns: dict) -> dict:
        return {name: values[order] for name, values in columns.items()}

    return replace(
        records, time_ns=records.time_ns[order], file=records.file[order],
        line=records.line[order], channels=taken(records.channels),
        unreadable=taken(records.unreadable), marks=taken(records.marks))


def _same_time(records: Records, time_ns: IntArray,
               stretch: IntArray | None) -> tuple[BoolArray, BoolArray]:
    repeated = np.zeros(len(records), dtype=np.bool_)
    conflicting = np.zeros(len(records), dtype=np.bool_)
    shared = time_ns[1:] == time_ns[:-1]
    if shared.any():
        if stretch is None:
            stretch = -records.marks["time stepped back"].astype(np.int64)
        later = np.flatnonzero(shared) + 1
        equal = np.ones(len(later), dtype=np.bool_)
        for values in records.channels.values():
            here, before = values[later], values[later - 1]
            equal &= (here == before) | (np.isnan(here) & np.isnan(before))
        for marked in records.unreadable.values():
            equal &= marked[later] == marked[later - 1]
        alike = stretch[later] == stretch[later - 1]
        shared[later[~equal & ~alike] - 1] = False
        group = np.concatenate([[0], np.cumsum(~shared)])
        differ = np.zeros(group[-1] + 1, dtype=np.bool_)
        differ[group[later[~equal & alike & (stretch[later] >= 0)]]] = True
        conflicting[:len(time_ns)] = differ[group]
        repeated[later] = equal & ~differ[group[later]]
    return repeated, conflicting


def clock_text(time_ns: int) -> str:
    """Return a time [ns UTC] to the second, as messages write it.

    Examples
    --------
    >>> clock_text(1_753_365_930_500_000_000)
    '2025-07-24 14:05:30'
    """
    return str(np.datetime64(int(time_ns), "ns").astype("datetime64[s]")).replace("T", " ")
