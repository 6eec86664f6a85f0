"""What the first stages keep in the run folder: records and marks as plain arrays and facts."""

from __future__ import annotations

from dataclasses import asdict
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from surveykit.accounting import PassRecords, Quality
from surveykit.handover import (
    load_arrays,
    load_facts,
    load_table,
    save_arrays,
    save_facts,
    save_table,
)
from surveykit.intake.records import FileFacts, Records


def save_records(folder: Path, records: dict[str, Records]) -> None:
    """Write the records of every logger, one file of arrays a logger."""
    about: dict[str, Any] = {}
    for name, log in records.items():
        arrays: dict[str, NDArray[Any]] = {
            "time_ns": log.time_ns, "file": log.file, "line": log.line}
        for part in ("channels", "unreadable", "marks"):
            arrays |= {f"{part}:{key}": some for key, some in getattr(log, part).items()}
        save_arrays(folder / f"records-{name}.npz", arrays)
        about[name] = {"files": [asdict(f) for f in log.files],
                       "resolution": {k: _plain(v) for k, v in log.resolution.items()},
                       "interval_s": _plain(log.interval_s)}
    save_facts(folder / "records.json", about)


def load_records(folder: Path) -> dict[str, Records]:
    """Return what `save_records` wrote."""
    out = {}
    for name, about in load_facts(folder / "records.json").items():
        arrays = load_arrays(folder / f"records-{name}.npz")
        out[name] = Records(
            name, arrays["time_ns"], arrays["file"], arrays["line"], _part(arrays, "channels"),
            _part(arrays, "unreadable"), _part(arrays, "marks"),
            tuple(FileFacts(**f) for f in about["files"]),
            {k: _number(v) for k, v in about["resolution"].items()}, _number(about["interval_s"]))
    return out


def save_quality(folder: Path, quality: Quality) -> None:
    """Write marks, the passes' records and the tables checks and ledger."""
    arrays: dict[str, NDArray[Any]] = {}
    for logger, masks in quality.masks.items():
        arrays |= {f"mask:{logger}:{column}": mask for column, mask in masks.items()}
    about: dict[str, Any] = {}
    for name, chosen in quality.passes.items():
        arrays[f"index:{name}"] = chosen.index
        arrays |= {f"partner:{name}:{logger}": at for logger, at in chosen.partners.items()}
        about[name] = {"logger": chosen.logger, "n_window": chosen.n_window,
                       "reasons": chosen.reasons, "refusal": chosen.refusal,
                       "dwells": [list(d) for d in chosen.dwells],
                       "partners": list(chosen.partners),
                       "zenith_deg": _plain(chosen.zenith_deg), "flags": list(chosen.flags)}
    save_arrays(folder / "marks.npz", arrays)
    save_facts(folder / "passes.json", about)
    save_table(folder / "checks.npz", quality.checks)
    save_table(folder / "ledger.npz", quality.ledger)
    save_table(folder / "waterfall.npz", quality.waterfall)


def load_quality(folder: Path, columns: dict[str, tuple[str, ...]]) -> Quality:
    """Return what `save_quality` wrote; `columns` names the columns of each logger."""
    arrays = load_arrays(folder / "marks.npz")
    masks = {logger: {column: arrays[f"mask:{logger}:{column}"] for column in names}
             for logger, names in columns.items()}
    passes = {}
    for name, about in load_facts(folder / "passes.json").items():
        passes[name] = PassRecords(
            about["logger"], arrays[f"index:{name}"],
            {logger: arrays[f"partner:{name}:{logger}"] for logger in about["partners"]},
            about["n_window"], about["reasons"], about["refusal"],
            tuple((first, last) for first, last in about["dwells"]),
            _number(about["zenith_deg"]), tuple(about["flags"]))
    return Quality(masks, passes, *(load_table(folder / f"{name}.npz")
                                    for name in ("checks", "ledger", "waterfall")))


def _part(arrays: dict[str, NDArray[Any]], part: str) -> dict[str, NDArray[Any]]:
    return {key.removeprefix(f"{part}:"): some for key, some in arrays.items()
            if key.startswith(f"{part}:")}


def _plain(value: float) -> float | None:
    return None if np.isnan(value) else float(value)


def _number(value: float | None) -> float:
    return float("nan") if value is None else value
