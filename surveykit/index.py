"""Writes reports/index.html from the reports that stand there."""

from __future__ import annotations

from pathlib import Path

import pandas as pd

from surveykit.handover import load_facts, save_text
from surveykit.locking import locked
from surveykit.report.contents import Entry, contents_page

NEEDED = {"campaign", "title", "date", "site", "surfaces"}


def write_index(root: Path) -> Path:
    """Write the page that lists every report of a project, and return its path."""
    reports = root / "reports"
    page = reports / "index.html"
    with locked(root, "_index"):
        entries = [entry for path in sorted(reports.glob("*/run.json"))
                   if (entry := _entry(path)) is not None]
        save_text(page, contents_page(entries))
    return page


def _entry(run_json: Path) -> Entry | None:
    """Return one report's entry; None where it is incomplete or not of this version."""
    try:
        facts = load_facts(run_json)
        if not isinstance(facts, dict) or not facts.keys() >= NEEDED:
            return None
        surfaces, changes = (pd.read_csv(
            run_json.parent / "tables" / f"{name}.csv", keep_default_na=False,
            na_values={column: [""] for column in ("value", "lower", "upper", "n_passes")})
            for name in ("surfaces", "changes"))
    except (OSError, ValueError):
        return None
    return Entry(f"{run_json.parent.name}/report.html", facts, surfaces, changes)
