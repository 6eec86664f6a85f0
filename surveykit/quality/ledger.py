"""The ledger: every record of every file used, excluded by one reason, or outside passes.

The waterfall says the same of every channel, file by file and pass by pass, in the order in which
reasons count, with what is left after each.
"""

from __future__ import annotations

from collections import Counter
from typing import Any

import numpy as np
import pandas as pd

from surveykit.accounting import BIT, LAST_FAULT, NS, REASONS, Mask, PassRecords, primary
from surveykit.core import BoolArray, table
from surveykit.intake.loggers import Records
from surveykit.intake.passes import Pass
from surveykit.quality.series import within
from surveykit.quality.study import GROUND, Masks, Study

Chosen = dict[str, PassRecords]
WORDS = (*(r.name for r in REASONS), "pass not evaluated", "")
EXCLUDED, OUTSIDE, USED = range(3)
DISPOSITION = ("excluded", "outside passes", "used")


def ledger(study: Study, masks: Masks, chosen: Chosen) -> pd.DataFrame:
    """Account for every record: used, excluded by one primary reason, or outside passes."""
    return table("ledger", [
        row for logger, log in study.records.items()
        for _, row in _rows(study, log, masks[logger], chosen, (USED, EXCLUDED, OUTSIDE))])


def waterfall(study: Study, masks: Masks, chosen: Chosen) -> pd.DataFrame:
    """Account for every reading of every channel; `remaining` counts what each reason leaves."""
    rows: list[dict[str, Any]] = []
    for logger, log in study.records.items():
        for column in study.channels[logger]:
            mine = _rows(study, log, {column: masks[logger][column]}, chosen,
                         (EXCLUDED, OUTSIDE, USED))
            left: Counter[tuple[int, ...]] = Counter()
            for key, row in mine:
                left[key[:2]] += row["records"]
            for key, row in mine:
                left[key[:2]] -= 0 if row["disposition"] == "used" else row["records"]
                rows.append(row | {"column": column, "remaining": left[key[:2]]})
    return table("waterfall", rows)


def _rows(study: Study, log: Records, masks: dict[str, Mask], chosen: Chosen,
          order: tuple[int, ...]) -> list[tuple[tuple[int, ...], dict[str, Any]]]:
    """Account for the records of a logger as far as the columns in `masks` are concerned.

    Returns rows of the ledger in order of their keys: file, passes, place of the disposition in
    `order`, reason.
    """
    n = log.time_ns.size
    label = np.zeros(n, dtype=np.int64)  # of what holds the record
    held: dict[tuple[str, ...], int] = {(): 0}
    used = np.zeros(n, dtype=bool)
    inside = np.full(n, len(WORDS))
    served = [p for p in study.passes if _columns(p, log.logger, masks)]
    for this in served:
        window = slice(*within(log.time_ns, this.start_ns, this.stop_ns))
        known = list(held)
        for code in np.unique(label[window]):
            part = label[window] == code
            label[window][part] = held.setdefault((*known[code], this.name), len(held))
        records = chosen[this.name]
        used[records.index if records.logger == log.logger else records.partners[log.logger]] = True
        mask = np.bitwise_or.reduce([masks[c][window] for c in _columns(this, log.logger, masks)])
        mask = mask | study.off_patch(this, log.time_ns[window])
        rest = BIT["between placements"] if this.kind == "contact" else BIT["no partner"]
        why = primary(np.where(mask == 0, rest, mask).astype(np.uint32))
        if records.refusal:
            why[mask == 0] = len(REASONS)
        inside[window] = np.minimum(inside[window], why)
    if not served:
        used = _weather_used(study, log, masks)
    every = primary(np.bitwise_and.reduce(list(masks.values())))
    reason = np.where(label > 0, inside, every)
    state = np.where(used, USED, np.where(
        (label > 0) | ((reason >= 0) & (reason <= LAST_FAULT)), EXCLUDED, OUTSIDE))
    reason = np.where(state == EXCLUDED, reason, len(WORDS) - 1)
    place = np.array([order.index(state) for state in range(3)])
    sizes = (len(log.files), len(held), len(order), len(WORDS))
    kinds, counts = np.unique(np.ravel_multi_index(
        (log.file.astype(np.int64), label, place[state], reason), sizes), return_counts=True)
    by_name, names = {p.name: p for p in study.passes}, list(held)
    rows: list[tuple[tuple[int, ...], dict[str, Any]]] = []
    for key, count in zip(kinds, counts, strict=True):
        key_of = tuple(int(i) for i in np.unravel_index(key, sizes))
        named = names[key_of[1]]
        one = by_name[named[0]] if named else None
        rows.append((key_of, {
            "campaign": study.parameters.campaign.campaign, "logger": log.logger,
            "file": log.files[key_of[0]].path, "surface": one.surface if one else "",
            "patch": one.patch if one else "", "pass": " + ".join(named),
            "disposition": DISPOSITION[order[key_of[2]]], "reason": WORDS[key_of[3]],
            "records": int(count)}))
    for facts in log.files:
        counted = sum(row["records"] for _, row in rows if row["file"] == facts.path)
        assert counted == facts.records, (
            f"{facts.path}: {facts.records} records read, {counted} accounted for")
    return rows


def _columns(this: Pass, logger: str, masks: dict[str, Mask]) -> list[str]:
    return [c.column for c in this.channels.values() if c.logger == logger and c.column in masks]


def _weather_used(study: Study, log: Records, masks: dict[str, Mask]) -> BoolArray:
    """Return good records about the passes, of columns that serve none of them by themselves.

    What looks at the ground is of use in its passes alone, the housing beside such a head.
    """
    idle = not any(log.logger in this.loggers for this in study.passes)
    good = np.zeros(log.time_ns.size, dtype=bool)
    for column, mask in masks.items():
        quantity = study.channels[log.logger][column].quantity
        if quantity not in GROUND and not (idle and quantity == "housing_temperature"):
            good |= mask == 0
    if not study.passes:
        return np.zeros_like(good)
    reach = int(study.parameters.campaign.settings.temperature.weather_reach_s * NS)
    first = min(p.start_ns for p in study.passes) - reach
    last = max(p.stop_ns for p in study.passes) + reach
    return good & (log.time_ns >= first) & (log.time_ns <= last)
