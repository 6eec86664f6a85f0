"""Records of one logger: what every reader hands over and every later floor takes."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from surveykit.core import BoolArray, FloatArray, IntArray

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


def in_order(records: Records) -> Records:
    """Return records ordered by time, repeated and conflicting ones marked, interval filled in.

    Records at one time that agree in every channel are one record logged twice: the first stays,
    later ones are marked "repeated record". If any two differ, all of that time are marked
    "conflicting records".
    """
    time_ns = records.time_ns
    if (time_ns[1:] < time_ns[:-1]).any() or (time_ns[:1] == NO_TIME_NS).any():
        last = np.where(time_ns == NO_TIME_NS, np.iinfo(np.int64).max, time_ns)
        records = _taken(records, np.argsort(last, kind="stable"))
    time_ns = records.time_ns[:records.n_timed]
    repeated, conflicting = _same_time(records, time_ns)
    marks = records.marks | {"repeated record": repeated, "conflicting records": conflicting}
    interval_s = records.interval_s
    if np.isnan(interval_s):
        interval_s = _median_step_s(time_ns)
    return replace(records, marks={mark: marks[mark] for mark in MARKS}, interval_s=interval_s)


def _median_step_s(time_ns: IntArray) -> float:
    steps = np.diff(time_ns)
    steps = steps if (steps > 0).all() else steps[steps > 0]
    if not steps.size:
        return float("nan")
    middle = steps[steps.size // 2]
    if 2 * np.count_nonzero(steps == middle) > steps.size + 1:  # a majority holds the median
        return float(middle) / 1e9
    return float(np.median(steps)) / 1e9


def _taken(records: Records, order: IntArray) -> Records:
    def taken(columns: dict) -> dict:
        return {name: values[order] for name, values in columns.items()}

    return replace(
        records, time_ns=records.time_ns[order], file=records.file[order],
        line=records.line[order], channels=taken(records.channels),
        unreadable=taken(records.unreadable), marks=taken(records.marks))


def _same_time(records: Records, time_ns: IntArray) -> tuple[BoolArray, BoolArray]:
    repeated = np.zeros(len(records), dtype=np.bool_)
    conflicting = np.zeros(len(records), dtype=np.bool_)
    shared = time_ns[1:] == time_ns[:-1]
    if shared.any():
        later = np.flatnonzero(shared) + 1
        equal = np.ones(len(later), dtype=np.bool_)
        for values in records.channels.values():
            here, before = values[later], values[later - 1]
            equal &= (here == before) | (np.isnan(here) & np.isnan(before))
        for marked in records.unreadable.values():
            equal &= marked[later] == marked[later - 1]
        group = np.concatenate([[0], np.cumsum(~shared)])
        differ = np.zeros(group[-1] + 1, dtype=np.bool_)
        differ[group[later[~equal]]] = True
        conflicting[:len(time_ns)] = differ[group]
        repeated[later] = equal & ~differ[group[later]]
    return repeated, conflicting
