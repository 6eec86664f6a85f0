"""Where a logger's clock was set anew: its time steps back, or leaps over a long gap."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from surveykit.core import IntArray
from surveykit.intake.records import Records

NS = 1_000_000_000


class Stretches(NamedTuple):
    """By record with a time: number of its stretch; by stretch: whether a step back begins it."""

    number: IntArray
    back: tuple[bool, ...]


def stretches(log: Records, jump_s: float) -> Stretches:
    """Return the stretches between steps back, and between gaps longer than `jump_s`.

    Records are taken as they stand in the files, files in the order of their first times. A
    record logged twice does not count; nor does disorder within one logging interval.
    """
    n = log.n_timed
    number = np.zeros(n, dtype=np.int64)
    once = np.flatnonzero(~log.marks["repeated record"][:n])
    if once.size < 2:
        return Stretches(number, (False,))
    rank = {int(f): int(log.time_ns[:n][log.file[:n] == f].min()) for f in np.unique(log.file[:n])}
    begin = np.array([rank[int(f)] for f in log.file[once]])
    order = once[np.lexsort((log.line[once], log.file[once], begin))]
    step_s = np.diff(log.time_ns[order]) / NS
    interval_s = log.interval_s if log.interval_s > 0 else 0.0
    back = step_s < -interval_s
    breaks = back | (step_s > jump_s)
    number[order[1:]] = np.cumsum(breaks)
    again = np.flatnonzero(log.marks["repeated record"][:n])
    if again.size:  # a copy belongs where its first one stands
        first = np.searchsorted(log.time_ns[:n], log.time_ns[again])
        number[again] = number[first]
    return Stretches(number, (False, *back[breaks].tolist()))
