"""`surveykit check`: what was understood of parameters, field sheet and files; every fault."""

from __future__ import annotations

from collections import Counter
from pathlib import Path

import pandas as pd

from surveykit.intake.params import is_kit_file, load_kit
from surveykit.opening import open_file
from surveykit.pipeline import read_inputs


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
    survey = open_file(path)
    found = read_inputs(survey)
    zone = survey.campaign.site.time_zone
    lines = [f"{survey.campaign.campaign}: {survey.campaign.title}"]
    for name, log in found.records.items():
        time = pd.to_datetime(log.time_ns[[0, log.n_timed - 1]], utc=True)
        first, last = time.tz_convert(zone)
        lines.append(
            f"  {name}: {len(log)} records, every {log.interval_s:g} s, {time[0]:%H:%M:%S} to "
            f"{time[1]:%H:%M:%S} UTC ({first:%H:%M:%S} to {last:%H:%M:%S} {zone})")
    counts = Counter((p.quantity, p.kind) for p in found.passes)
    lines.append("  field sheet: " + ", ".join(
        f"{n} {' '.join(w for w in (kind, quantity) if w)} passes"
        for (quantity, kind), n in counts.items()))
    lines += [f"  {notice}" for notice in (*found.sheet.notices, *survey.parameters.notes)]
    return [*lines, "  no fault found"]
