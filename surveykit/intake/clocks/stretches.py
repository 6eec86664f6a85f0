"""Where a logger's clock was set anew: its time steps back, or leaps over a long gap."""

from __future__ import annotations

from dataclasses import replace
from typing import NamedTuple

import numpy as np

from surveykit.core import IntArray
from surveykit.intake.records import NS, Records, in_order, out_of_order


class Stretches(NamedTuple):
    """By record: number of its stretch; by stretch: whether a step back begins it.

    A single record out of place, or without a time, has the number -1.
    """

    number: IntArray
    back: tuple[bool, ...]


def stretches(log: Records, jump_s: float) -> Stretches:
    """Return the stretches between steps back, and between gaps longer than `jump_s`.

    Records are taken as they stand in the files, files in the order of their earliest times. A
    record logged twice does not count; nor does disorder within one logging interval.
    """
    n, time_ns = log.n_timed, log.time_ns
    number = np.full(len(log), -1, dtype=np.int64)
    again = np.flatnonzero(log.marks["repeated record"][:n])
    rows = np.flatnonzero(~log.marks["repeated record"][:n])
    rows = rows[np.lexsort((log.line[rows], log.file[rows]))]
    rows = rows[~out_of_order(time_ns[rows])]
    if not rows.size:
        return Stretches(number, (False,))
    earliest = np.full(len(log.files), np.iinfo(np.int64).max)
    np.minimum.at(earliest, log.file[rows], time_ns[rows])
    rows = rows[np.argsort(earliest[log.file[rows]], kind="stable")]
    step_s = np.diff(time_ns[rows]) / NS
    back = step_s < -(log.interval_s if log.interval_s > 0 else 0.0)
    breaks = back | (step_s > jump_s)
    number[rows] = np.concatenate([[0], np.cumsum(breaks)])
    number[again] = number[np.searchsorted(time_ns[:n], time_ns[again])]  # where the first stands
    return Stretches(number, (False, *back[breaks].tolist()))


def judged_apart(log: Records, parts: Stretches) -> Records:
    """Return the records with their order judged within each stretch alone."""
    if not any(parts.back):
        return log
    stepped = log.marks["time stepped back"] & (parts.number < 0)
    return in_order(replace(log, marks=log.marks | {"time stepped back": stepped}), parts.number)
