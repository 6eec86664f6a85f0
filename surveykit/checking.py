"""`surveykit check`: what was understood of parameters, field sheet and files; every fault."""

from __future__ import annotations

from collections import Counter
from pathlib import Path

import pandas as pd

from surveykit import overview
from surveykit.accounting import counted
from surveykit.core import InputError
from surveykit.intake.aligning import Ingested, align, read_logs
from surveykit.intake.params import Parameters, is_kit_file, load_kit
from surveykit.intake.params.partly import load_partly


def check(path: Path) -> list[str]:
    """Return lines that say what was understood of a campaign or of a kit.

    Raises
    ------
    InputError
        With every fault found.
    """
    if is_kit_file(path):
        kit = load_kit(path)
        return [f"{path}: a kit of {len(kit)} loggers: {', '.join(kit)}; no fault found"]
    known = load_partly(path)
    faults = list(known.faults)
    if known.parameters is None:
        raise InputError(*faults)
    parameters = known.parameters
    logs, found = read_logs(parameters)
    ingested = align(parameters, logs, [*faults, *found], known.doubtful)
    return [f"{parameters.name}: {parameters.campaign.title}",
            *_loggers(parameters, ingested), *_clocks(ingested), *_sheet(ingested),
            *(f"  {notice}" for notice in (*ingested.sheet.notices, *parameters.notes)),
            "  no fault found"]


def _loggers(parameters: Parameters, ingested: Ingested) -> list[str]:
    """Return for each logger a line on its records, and one for each of its channels."""
    zone = parameters.campaign.site.time_zone
    lines = []
    channels = overview.channels(parameters, ingested.records)
    for row in overview.loggers(ingested.records, zone).to_dict("records"):
        log = ingested.records[row["Logger"]]
        ends = pd.to_datetime(log.time_ns[[0, log.n_timed - 1]], utc=True).tz_convert(zone)
        days = " to ".join(dict.fromkeys(ends.strftime("%Y-%m-%d")))
        lines.append(
            f"  {log.logger}: {counted(len(log), 'record')} in {counted(len(log.files), 'file')}, "
            + (f"every {log.interval_s:g} s, " if log.interval_s > 0 else "") + f"{days} "
            f"{row['First (UTC)']} to {row['Last (UTC)']} UTC "
            f"({row['First (site)']} to {row['Last (site)']} {zone})")
        mine = channels[channels["Logger"] == row["Logger"]]
        width = max(len(column) for column in mine["Column"])
        lines += [f"    {column:<{width}}  {quantity}, logged in {unit}, typically "
                  + (f"{median:.4g} {shown}" if median == median else shown)
                  for column, quantity, unit, median, shown in zip(
                      mine["Column"], mine["Quantity"], mine["Logged in"], mine["Median"],
                      mine["Unit"], strict=True)]
        counts = {reason: int(marked.sum()) for reason, marked in log.marks.items()}
        counts |= {f"unreadable {column}": int(cells.sum())
                   for column, cells in log.unreadable.items()}
        counts["repeated head, no record"] = sum(file.head_lines for file in log.files)
        told = ", ".join(f"{n} {reason}" for reason, n in counts.items() if n)
        lines += [f"    lines not as declared: {told}"] if told else []
    return lines


def _clocks(ingested: Ingested) -> list[str]:
    """Return for each clock how it was set and how well, or why it was refused."""
    lines = []
    for clock in ingested.clocks:
        if clock.status == "refused":
            told = f"refused: {clock.refusal}"
        else:
            drift = f", {clock.drift_ppm:+.0f} ppm" if clock.drift_ppm else ""
            told = f"{clock.method}: {clock.offset_s:+.2f} s{drift}, u {clock.u_s:.2g} s"
            if clock.status != "ok" and clock.pieces:  # part of it refused, or leaning on another
                told += f"; {clock.note}"
        lines.append(f"  clock of {clock.logger}: {told}")
    return lines


def _sheet(ingested: Ingested) -> list[str]:
    counts = Counter((p.quantity, p.kind) for p in ingested.passes)
    return ["  field sheet: " + ", ".join(
        f"{n} {' '.join(w for w in (kind, quantity) if w)} passes"
        for (quantity, kind), n in counts.items())]
