"""The ledger: every record of every file used, excluded by one reason, or outside passes.

The waterfall says the same of every channel, file by file and pass by pass, in the order in which
reasons count, with what is left after each.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from surveykit.accounting import BIT, LAST_FAULT, NS, REASONS, Mask, PassRecords
from surveykit.core import BoolArray, IntArray, table
from surveykit.intake.loggers import Records
from surveykit.intake.passes import Pass
from surveykit.quality.series import primary, within
from surveykit.quality.study import Masks, Study

Chosen = dict[str, PassRecords]
WORDS = (*(r.name for r in REASONS), "pass not evaluated", "")
EXCLUDED, OUTSIDE, USED = range(3)
DISPOSITION = ("excluded", "outside passes", "used")


@dataclass(frozen=True)
class Account:
    """What became of each record: which passes hold it, its disposition, its primary reason.

    `label` points into `held`, names of passes; `reason` into `WORDS`.
    """

    held: list[tuple[str, ...]]
    label: IntArray
    state: IntArray
    reason: IntArray


def ledger(study: Study, masks: Masks, chosen: Chosen) -> pd.DataFrame:
    """Account for every record: used, excluded by one primary reason, or outside passes."""
    rows: list[dict[str, Any]] = []
    shown = (USED, EXCLUDED, OUTSIDE)
    for logger, log in study.records.items():
        found = _account(study, log, masks[logger], chosen)
        mine = [row for _, row in sorted(_rows(study, log, found, shown), key=lambda r: r[0])]
        _assert_complete(log, mine)
        rows += mine
    return table("ledger", rows)


def waterfall(study: Study, masks: Masks, chosen: Chosen) -> pd.DataFrame:
    """Account for every reading of every channel; `remaining` counts what each reason leaves."""
    rows: list[dict[str, Any]] = []
    for logger, log in study.records.items():
        for column in study.channels[logger]:
            found = _account(study, log, {column: masks[logger][column]}, chosen)
            mine = sorted(_rows(study, log, found, (EXCLUDED, OUTSIDE, USED)), key=lambda r: r[0])
            left: dict[tuple[int, ...], int] = {}
            for key, row in mine:
                left[key[:2]] = left.get(key[:2], 0) + row["records"]
            for key, row in mine:
                left[key[:2]] -= 0 if row["disposition"] == "used" else row["records"]
                rows.append({name: row[name] for name in ("campaign", "logger", "file")}
                            | {"column": column}
                            | {name: row[name] for name in (
                                "surface", "patch", "pass", "disposition", "reason", "records")}
                            | {"remaining": left[key[:2]]})
            _assert_complete(log, [row for _, row in mine])
    return table("waterfall", rows)


def _account(study: Study, log: Records, masks: dict[str, Mask], chosen: Chosen) -> Account:
    """Account for the records of a logger as far as the columns in `masks` are concerned."""
    n = log.time_ns.size
    label = np.zeros(n, dtype=np.int64)
    held: dict[tuple[str, ...], int] = {(): 0}
    used = np.zeros(n, dtype=bool)
    every = np.bitwise_and.reduce(list(masks.values())) if masks else np.zeros(n, dtype=np.uint32)
    reason = primary(every)
    served = [p for p in study.passes if _columns(p, log.logger, masks)]
    for this in served:
        window = slice(*within(log.time_ns, this.start_ns, this.stop_ns))
        known = list(held)
        for code in np.unique(label[window]):
            part = label[window] == code
            label[window][part] = held.setdefault((*known[code], this.name), len(held))
        records = chosen[this.name]
        used[records.index if records.logger == log.logger else records.partners[log.logger]] = True
    for this in served:
        window = slice(*within(log.time_ns, this.start_ns, this.stop_ns))
        mask = np.bitwise_or.reduce([masks[c][window] for c in _columns(this, log.logger, masks)])
        mask = mask | study.off_patch(this, log.time_ns[window])
        rest = BIT["between placements"] if this.kind == "contact" else BIT["no partner"]
        why = primary(np.where(mask == 0, rest, mask).astype(np.uint32))
        if chosen[this.name].refusal:
            why[mask == 0] = len(REASONS)
        reason[window] = np.where(used[window], reason[window], why)
    if not served:
        used = _weather_used(study, log, masks)
    reason[used] = -1
    faulty = (reason >= 0) & (reason <= LAST_FAULT)
    state = np.where(used, USED, np.where((label > 0) | faulty, EXCLUDED, OUTSIDE))
    return Account(list(held), label, state, np.where(state == EXCLUDED, reason, len(WORDS) - 1))


def _columns(this: Pass, logger: str, masks: dict[str, Mask]) -> list[str]:
    return [c.column for c in this.channels.values() if c.logger == logger and c.column in masks]


def _weather_used(study: Study, log: Records, masks: dict[str, Mask]) -> BoolArray:
    """Return good records about the passes, of columns that serve none of them by themselves."""
    good = np.zeros(log.time_ns.size, dtype=bool)
    for mask in masks.values():
        good |= mask == 0
    if not study.passes:
        return np.zeros_like(good)
    reach = int(study.parameters.campaign.settings.temperature.weather_reach_s * NS)
    first = min(p.start_ns for p in study.passes) - reach
    last = max(p.stop_ns for p in study.passes) + reach
    return good & (log.time_ns >= first) & (log.time_ns <= last)


def _rows(study: Study, log: Records, found: Account,
          order: tuple[int, ...]) -> Iterator[tuple[tuple[int, ...], dict[str, Any]]]:
    """Yield rows of the ledger, each with file, passes, place of its disposition, and reason."""
    by_name = {p.name: p for p in study.passes}
    place = np.array([order.index(state) for state in range(3)])
    sizes = (len(log.files), len(found.held), len(order), len(WORDS))
    keys = np.ravel_multi_index(
        (log.file.astype(np.int64), found.label, place[found.state], found.reason), sizes)
    kinds, counts = np.unique(keys, return_counts=True)
    for key, count in zip(kinds, counts, strict=True):
        file, label, state, why = (int(i) for i in np.unravel_index(key, sizes))
        named = found.held[label]
        one = by_name[named[0]] if named else None
        yield (file, label, state, why), {
            "campaign": study.parameters.campaign.campaign, "logger": log.logger,
            "file": log.files[file].path, "surface": one.surface if one else "",
            "patch": one.patch if one else "", "pass": " + ".join(named),
            "disposition": DISPOSITION[order[state]], "reason": WORDS[why],
            "records": int(count)}


def _assert_complete(log: Records, rows: list[dict[str, Any]]) -> None:
    for facts in log.files:
        counted = sum(r["records"] for r in rows if r["file"] == facts.path)
        assert counted == facts.records, (
            f"{facts.path}: {facts.records} records read, {counted} accounted for")
