"""`surveykit verify`: whether a report still belongs to its inputs, its tables and its page."""

from __future__ import annotations

import io
import shutil
from collections.abc import Callable, Iterator
from contextlib import ExitStack
from pathlib import Path

import numpy as np
import pandas as pd
from pydantic import BaseModel, ValidationError

from surveykit import facts, pipeline
from surveykit.accounting import counted
from surveykit.core import PUBLISHED, TABLES, InputError
from surveykit.handover import sha256
from surveykit.intake.params import find_root
from surveykit.locking import locked
from surveykit.opening import Survey, open_file
from surveykit.report.datapackage import csv_text

TOLERANCE = 1e-6  # relative, above which a cell has moved
PAGE, PACKAGE = "report.html", "tables/datapackage.json"


class _Input(BaseModel):
    path: str
    sha256: str


class _Kept(BaseModel):
    """What a report's run.json must hold."""

    key: str
    inputs: list[_Input]
    earlier_inputs: list[_Input]
    outputs: dict[str, str]
    versions: dict[str, str]
    params_file: str


def outputs(folder: Path) -> dict[str, str]:
    """Return the SHA-256 of the page and of every file of tables in a report folder."""
    files = [folder / PAGE, *sorted((folder / "tables").iterdir())]
    return {path.relative_to(folder).as_posix(): sha256(path) for path in files}


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
        survey = open_file(root / kept.params_file)
        if survey.key != kept.key:
            faults = [*_other_inputs(survey, kept, shown)] or [
                f"{shown}: was made by another version of surveykit; run it again: surveykit run "
                f"{kept.params_file}"]
    if faults or survey is None:
        raise InputError(*faults)
    files = len(kept.inputs) + len(kept.earlier_inputs)
    lines = [f"{shown}: {files} input files, {len(PUBLISHED)} tables and the page belong together"]
    return [*lines, *_again(survey, folder, kept, shown, say)] if rerun else lines


def params_file(folder: Path) -> str:
    """Return the parameter file that a report was made from, from the project folder."""
    return _read(folder, folder.name).params_file


def _read(folder: Path, shown: str) -> _Kept:
    try:
        return _Kept.model_validate_json((folder / "run.json").read_bytes())
    except OSError:
        lacking: set[str] = set()
    except ValidationError as error:
        lacking = {str(one["loc"][0]) for one in error.errors() if one["loc"]}
    why = f"lacks {', '.join(sorted(lacking))}" if lacking else "is missing or cannot be read"
    raise InputError(f"{shown}/run.json: {why}, so the report cannot be verified; run the campaign "
                     "again")


def _output_faults(folder: Path, kept: _Kept, shown: str) -> Iterator[str]:
    expected = {PAGE, PACKAGE, *(f"tables/{name}.csv" for name in PUBLISHED)}
    for name in sorted(expected - {*kept.outputs}):
        yield f"{shown}/run.json: holds no hash of {name}; run the campaign again"
    for name, digest in kept.outputs.items():
        path = folder / name
        if not path.is_file():
            yield f"{shown}/{name}: is missing; run the campaign again"
        elif sha256(path) != digest:
            yield f"{shown}/{name}: was changed after the run; run the campaign again"
    tables = folder / "tables"
    here = {f"tables/{p.name}" for p in tables.iterdir()} if tables.is_dir() else set()
    for name in sorted(here - {*kept.outputs}):
        yield f"{shown}/{name}: is not of this run; move it away"


def _input_faults(root: Path, kept: _Kept) -> Iterator[str]:
    for item in (*kept.inputs, *kept.earlier_inputs):
        path = root / item.path
        if not path.is_file():
            yield f"{item.path}: went into the report and is missing now; put it back"
        elif sha256(path) != item.sha256:
            yield (f"{item.path}: was changed after the report was made; put the old file back, "
                   f"or run again: surveykit run {kept.params_file}")


def _other_inputs(survey: Survey, kept: _Kept, shown: str) -> Iterator[str]:
    for path in sorted({item["path"] for item in survey.inputs}
                       - {item.path for item in kept.inputs}):
        yield (f"{path}: belongs to the campaign now and did not go into {shown}; move it away, or "
               f"run again: surveykit run {kept.params_file}")


def _again(survey: Survey, folder: Path, kept: _Kept, shown: str,
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
    versions = [f"{name} {kept.versions.get(name, 'absent')} then, {now.get(name, 'absent')} now"
                for name in sorted({*now, *kept.versions})
                if now.get(name) != kept.versions.get(name)] or ["the same then and now"]
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
    old, new = (pd.read_csv(io.StringIO(text), dtype=str, keep_default_na=False)
                for text in (then, now))
    if [*old] != [*new]:
        gone, come = (", ".join(a.columns.difference(b.columns)) for a, b in (
            (old, new), (new, old)))
        yield f"columns {gone or 'as now'} then, {come or 'as then'} now"
        return
    if len(old) != len(new):
        yield f"{counted(len(old), 'row')} then, {counted(len(new), 'row')} now"
        return
    moved = old != new
    for name, kind in TABLES[table].items():
        if kind == "number":
            before, after = (pd.to_numeric(one[name]).to_numpy() for one in (old, new))
            moved[name] &= ~np.isclose(before, after, rtol=TOLERANCE, atol=0)
    for row, column in np.argwhere(moved.to_numpy()):
        a, b = old.iloc[row, column], new.iloc[row, column]
        yield f"row {row + 2}, {old.columns[column]}: {a or 'empty'} then, {b or 'empty'} now"
