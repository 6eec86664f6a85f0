"""`surveykit verify`: whether a report still belongs to its inputs, its tables and its page."""

from __future__ import annotations

import csv
import hashlib
import io
import json
import shutil
from collections.abc import Callable, Iterator
from contextlib import ExitStack
from pathlib import Path
from typing import Any

from surveykit import facts, pipeline
from surveykit.core import PUBLISHED, TABLES, InputError
from surveykit.intake.params import find_root
from surveykit.locking import locked
from surveykit.opening import Survey, open_file
from surveykit.report.datapackage import csv_text

TOLERANCE = 1e-6  # relative, above which a cell has moved
PAGE, PACKAGE = "report.html", "tables/datapackage.json"
NEEDED = ("key", "campaign", "inputs", "earlier_inputs", "outputs", "versions", "params_file")


def outputs(folder: Path) -> dict[str, str]:
    """Return the SHA-256 of the page and of every file of tables in a report folder."""
    files = [folder / PAGE, *sorted((folder / "tables").iterdir())]
    return {path.relative_to(folder).as_posix(): _sha256(path) for path in files}


def verify(folder: Path, *, rerun: bool = False,
           say: Callable[[str], None] | None = None) -> list[str]:
    """Return what was found in order, one line each.

    Parameters
    ----------
    folder : Path
        A report folder, reports/ID.
    rerun : bool
        Whether to compute the tables again and compare every cell; waits for a run under way.
    say : callable, optional
        Takes the line that tells which run is waited for.

    Raises
    ------
    InputError
        With everything that is missing, changed or incomplete; with `rerun`, with every cell that
        moved by more than 1e-6 relative, and the versions then and now.
    """
    shown = f"{folder.parent.name}/{folder.name}"
    kept = _read(folder, shown)
    root = find_root(folder.absolute())
    faults = [*_output_faults(folder, kept, shown), *_input_faults(root, kept)]
    survey = None
    if not faults:
        survey = open_file(root / kept["params_file"])
        if survey.key != kept["key"]:
            faults = [*_other_inputs(survey, kept, shown)] or [
                f"{shown}: was made by another version of surveykit; run it again: surveykit run "
                f"{kept['params_file']}"]
    if faults or survey is None:
        raise InputError(*faults)
    files = len(kept["inputs"]) + len(kept["earlier_inputs"])
    lines = [f"{shown}: {files} input files, {len(PUBLISHED)} tables and the page belong together"]
    return [*lines, *_again(survey, folder, kept, shown, say)] if rerun else lines


def params_file(folder: Path) -> str:
    """Return the parameter file that a report was made from, from the project folder."""
    return str(_read(folder, folder.name)["params_file"])


def _read(folder: Path, shown: str) -> dict[str, Any]:
    try:
        kept: dict[str, Any] = json.loads((folder / "run.json").read_text(encoding="utf-8"))
    except (OSError, ValueError):
        raise InputError(f"{shown}/run.json: is missing or cannot be read, so the report cannot be "
                         "verified; run the campaign again") from None
    lacking = [name for name in NEEDED if name not in kept] if isinstance(kept, dict) else NEEDED
    if lacking:
        raise InputError(f"{shown}/run.json: lacks {', '.join(lacking)}, so the report cannot be "
                         "verified; run the campaign again")
    return kept


def _output_faults(folder: Path, kept: dict[str, Any], shown: str) -> Iterator[str]:
    expected = {PAGE, PACKAGE, *(f"tables/{name}.csv" for name in PUBLISHED)}
    for name in sorted(expected - {*kept["outputs"]}):
        yield f"{shown}/run.json: holds no hash of {name}; run the campaign again"
    for name, digest in kept["outputs"].items():
        path = folder / name
        if not path.is_file():
            yield f"{shown}/{name}: is missing; run the campaign again"
        elif _sha256(path) != digest:
            yield f"{shown}/{name}: was changed after the run; run the campaign again"
    tables = folder / "tables"
    here = {f"tables/{p.name}" for p in tables.iterdir()} if tables.is_dir() else set()
    for name in sorted(here - {*kept["outputs"]}):
        yield f"{shown}/{name}: is not of this run; move it away"


def _input_faults(root: Path, kept: dict[str, Any]) -> Iterator[str]:
    for item in (*kept["inputs"], *kept["earlier_inputs"]):
        path = root / item["path"]
        if not path.is_file():
            yield f"{item['path']}: went into the report and is missing now; put it back"
        elif _sha256(path) != item["sha256"]:
            yield (f"{item['path']}: was changed after the report was made; put the old file back, "
                   f"or run again: surveykit run {kept['params_file']}")


def _other_inputs(survey: Survey, kept: dict[str, Any], shown: str) -> Iterator[str]:
    now, then = ({item["path"] for item in items} for items in (survey.inputs, kept["inputs"]))
    for path in sorted(now - then):
        yield (f"{path}: belongs to the campaign now and did not go into {shown}; move it away, or "
               f"run again: surveykit run {kept['params_file']}")


def _again(survey: Survey, folder: Path, kept: dict[str, Any], shown: str,
           say: Callable[[str], None] | None) -> list[str]:
    """Compute every stage again from the raw files and compare each cell of the tables."""
    with ExitStack() as locks:
        for one in (survey, *(open_file(path) for path in survey.parameters.earlier)):
            locks.enter_context(locked(one.parameters.root, one.campaign.campaign, say=say))
            for stage in pipeline.STAGES:
                shutil.rmtree(one.run_folder / stage, ignore_errors=True)
        tables = pipeline.all_tables(survey)
    moved = [f"{shown}/tables/{name}.csv: {line}" for name, frame in tables.items()
             for line in moved_cells((folder / "tables" / f"{name}.csv").read_text("utf-8"),
                                     csv_text(frame, name), name)]
    now = facts.versions()
    versions = [f"{name} {kept['versions'].get(name, 'absent')} then, {now.get(name, 'absent')} now"
                for name in sorted({*now, *kept["versions"]})
                if now.get(name) != kept["versions"].get(name)] or ["the same then and now"]
    line = f"versions: {'; '.join(versions)}"
    if moved:
        raise InputError(*moved, line)
    return [f"  computed again: no cell of the tables moved by more than {TOLERANCE:g} relative",
            f"  {line}"]


def moved_cells(then: str, now: str, table: str) -> Iterator[str]:
    r"""Yield a line for each cell of two CSV texts of one table that moved.

    Numbers may move by 1e-6 relative; everything else must be equal. Rows are numbered as a
    spreadsheet does (header = 1).

    Examples
    --------
    >>> head = ",".join(TABLES["dwells"])
    >>> row = "c,lawn,L1,p,1,2025-06-11T12:00:00Z,2025-06-11T12:00:03Z,{},0.1,7"
    >>> old, new = (f"{head}\n{row.format(v)}\n" for v in (30.0, 30.1))
    >>> list(moved_cells(old, new, "dwells"))
    ['row 2, value: 30.0 then, 30.1 now']
    """
    old, new = ([*csv.reader(io.StringIO(text))] for text in (then, now))
    if len(old) != len(new) or old[:1] != new[:1]:
        yield f"{len(old) - 1} rows then, {len(new) - 1} rows now"
        return
    kinds = [TABLES[table].get(name, "text") for name in old[0]]
    for number, (before, after) in enumerate(zip(old[1:], new[1:], strict=True), start=2):
        for name, kind, a, b in zip(old[0], kinds, before, after, strict=True):
            if a != b and not (kind == "number" and _near(a, b)):
                yield f"row {number}, {name}: {a or 'empty'} then, {b or 'empty'} now"


def _near(one: str, other: str) -> bool:
    if not (one and other):
        return False
    a, b = float(one), float(other)
    return abs(a - b) <= TOLERANCE * max(abs(a), abs(b))


def _sha256(path: Path) -> str:
    return hashlib.sha256(path.read_bytes()).hexdigest()
