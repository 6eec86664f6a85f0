"""The ledger: every record of every file used, excluded by one reason, or outside passes."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd

from surveykit.accounting import BIT, LAST_FAULT, NS, REASONS, Mask, PassRecords
from surveykit.core import BoolArray, IntArray, table
from surveykit.intake.loggers import Records
from surveykit.quality.checks import primary
from surveykit.quality.marks import Study


def ledger(study: Study, masks: dict[str, dict[str, Mask]],
            chosen: dict[str, PassRecords]) -> pd.DataFrame:
    """Account for every record: used, excluded by one primary reason, or outside passes."""
    rows: list[dict[str, Any]] = []
    for logger, log in study.records.items():
        n = log.time_ns.size
        label = np.zeros(n, dtype=np.int64)
        labels: dict[tuple[str, ...], int] = {(): 0}
        used = np.zeros(n, dtype=bool)
        for this in study.passes:
            mine = [c for c in this.channels.values() if c.logger == logger]
            if not mine:
                continue
            inside = (log.time_ns >= this.start_ns) & (log.time_ns < this.stop_ns)
            known = list(labels)
            for code in np.unique(label[inside]):
                key = (*known[code], this.name)
                label[inside & (label == code)] = labels.setdefault(key, len(labels))
            records = chosen[this.name]
            index = records.index if records.logger == logger else records.partners[logger]
            used[index] = True
        reason = _ledger_reasons(study, logger, masks[logger], chosen, used)
        if not any(c.logger == logger for p in study.passes for c in p.channels.values()):
            used = _weather_used(study, logger, masks[logger])
            reason[used] = -1
            label[:] = 0
        rows += _ledger_rows(study, log, list(labels), label, used, reason)
        _assert_complete(log, rows)
    return table("ledger", rows)


def _ledger_reasons(study: Study, logger: str, masks: dict[str, Mask],
                    chosen: dict[str, PassRecords], used: BoolArray) -> IntArray:
    log = study.records[logger]
    reason = np.full(log.time_ns.size, -1, dtype=np.int64)
    every = np.bitwise_and.reduce(list(masks.values())) if masks else np.zeros(0, dtype=np.uint32)
    reason[:] = primary(every)
    for this in study.passes:
        mine = [c for c in this.channels.values() if c.logger == logger]
        if not mine:
            continue
        inside = (log.time_ns >= this.start_ns) & (log.time_ns < this.stop_ns) & ~used
        mask = np.bitwise_or.reduce([masks[c.column] for c in mine])
        edge = (log.time_ns < this.from_ns) | (log.time_ns >= this.to_ns)
        mask = mask | np.where(edge, BIT["pass edge"], np.uint32(0))
        rest = BIT["between placements"] if this.kind == "contact" else BIT["no partner"]
        mask = np.where(mask == 0, rest, mask).astype(np.uint32)
        reason[inside] = primary(mask)[inside]
        if chosen[this.name].refusal:
            reason[inside & (mask == rest)] = len(REASONS)
    return reason


def _weather_used(study: Study, logger: str, masks: dict[str, Mask]) -> BoolArray:
    log = study.records[logger]
    good = np.zeros(log.time_ns.size, dtype=bool)
    for mask in masks.values():
        good |= mask == 0
    if not study.passes:
        return np.zeros_like(good)
    reach = int(study.parameters.campaign.settings.temperature.weather_reach_s * NS)
    first = min(p.start_ns for p in study.passes) - reach
    last = max(p.stop_ns for p in study.passes) + reach
    return good & (log.time_ns >= first) & (log.time_ns <= last)


def _ledger_rows(study: Study, log: Records, labels: list[tuple[str, ...]], label: IntArray,
                 used: BoolArray, reason: IntArray) -> list[dict[str, Any]]:
    by_name = {p.name: p for p in study.passes}
    words = [r.name for r in REASONS] + ["pass not evaluated", ""]
    faulty = (reason >= 0) & (reason <= LAST_FAULT)
    state = np.where(used, 0, np.where((label > 0) | faulty, 1, 2))
    code = np.where(state == 1, reason, len(words) - 1)
    keys = np.stack([log.file.astype(np.int64), label, state, code], axis=1)
    rows = []
    for (file, lab, st, why), count in zip(*np.unique(keys, axis=0, return_counts=True),
                                           strict=True):
        named = labels[lab]
        one = by_name[named[0]] if named else None
        rows.append({
            "campaign": study.parameters.campaign.campaign, "logger": log.logger,
            "file": log.files[file].path, "surface": one.surface if one else "",
            "patch": one.patch if one else "", "pass": " + ".join(named),
            "disposition": ("used", "excluded", "outside passes")[st], "reason": words[why],
            "records": int(count)})
    return rows


def _assert_complete(log: Records, rows: list[dict[str, Any]]) -> None:
    for facts in log.files:
        counted = sum(r["records"] for r in rows
                      if r["logger"] == log.logger and r["file"] == facts.path)
        assert counted == facts.records, (
            f"{facts.path}: {facts.records} records read, {counted} accounted for")
