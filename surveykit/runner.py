"""Runs the notebooks of one campaign and swaps the finished report folder in whole."""

from __future__ import annotations

import json
import os
import shutil
import sys
import time
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

from surveykit import facts, overview, pipeline
from surveykit.core import InputError
from surveykit.kernels import QuietKernelManager, kernels_ahead
from surveykit.opening import Survey, open_file
from surveykit.report import datapackage, page
from surveykit.swap import heal, swap_in
from surveykit.verifying import outputs

# jupyterlab brings rfc3987_syntax, which compiles a grammar for 1.2 s at import, reached through
# jsonschema's optional format checkers; without it jsonschema skips that one optional format.
sys.modules.setdefault("rfc3987_syntax", None)  # type: ignore[arg-type]

NOTEBOOKS = ("01_ingest", "02_quality", "03_surfaces", "04_comparison")
Say = Callable[[str], None]


def run(path: Path, say: Say, *, done: tuple[Path, ...] = ()) -> Path:
    """Run a campaign from its raw files and return the path of its report.

    Earlier campaigns named by it are run first where their report is missing or their inputs
    changed.

    Parameters
    ----------
    path : Path
        The parameter file.
    say : callable
        Takes one line of progress.
    done : tuple of Path
        Parameter files that are being run above this one, to find circles.

    Raises
    ------
    InputError
        If an input is at fault; nothing of an earlier report is touched.
    """
    survey = open_file(path)
    here = survey.parameters.path.resolve()
    if here in done:
        raise InputError(f"{survey.inputs[0]['path']}: comparison.earlier leads back to this "
                         "campaign; name earlier campaigns only")
    for earlier in survey.parameters.earlier:
        one = open_file(earlier)
        if not up_to_date(one):
            run(earlier, say, done=(*done, here))
    return _run_one(survey, say)


def up_to_date(survey: Survey) -> bool:
    """Return whether a campaign's report stands and belongs to its present inputs."""
    folder = _reports(survey) / survey.campaign.campaign
    try:
        kept = json.loads((folder / "run.json").read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return False
    return bool(kept.get("key") == survey.key and (folder / "report.html").is_file())


def _run_one(survey: Survey, say: Say) -> Path:
    started = time.perf_counter()
    name = survey.campaign.campaign
    root = survey.parameters.root
    with kernels_ahead(root, len(NOTEBOOKS)) as kernels:
        for stage in pipeline.STAGES:
            shutil.rmtree(survey.run_folder / stage, ignore_errors=True)
        pipeline.ingest(survey)
        reports = _reports(survey)
        heal(reports, name)
        new = reports / f".{name}.new"
        shutil.rmtree(new, ignore_errors=True)
        (new / "notebooks").mkdir(parents=True)
        try:
            say(f"{name}: {survey.campaign.title}")
            durations = _execute(survey, new / "notebooks", kernels, say)
            _write(survey, new, durations, started)
        except BaseException:
            shutil.rmtree(new, ignore_errors=True)
            raise
    swap_in(reports, name)
    say(f"  report in {time.perf_counter() - started:.1f} s")
    return reports / name / "report.html"


def _execute(survey: Survey, folder: Path, kernels: Iterator[QuietKernelManager],
             say: Say) -> dict[str, float]:
    """Run the notebooks in order, each in a kernel of its own; one line of progress each."""
    import papermill

    root = survey.parameters.root
    _check_parameters(root)
    durations = {}
    handed = {"params_file": survey.inputs[0]["path"], "run_folder": _from_root(survey)}
    begun = time.perf_counter()
    for name, kernel in zip(NOTEBOOKS, kernels, strict=True):
        try:
            papermill.execute_notebook(
                _literal(root / "notebooks" / f"{name}.ipynb"), _literal(folder / f"{name}.ipynb"),
                parameters=handed, kernel_name="python3", progress_bar=False, log_output=False,
                cwd=str(root), km=kernel)
        except papermill.PapermillExecutionError as error:
            if error.ename == InputError.__name__:
                raise InputError(*error.evalue.splitlines()) from None
            raise
        durations[name] = time.perf_counter() - begun
        begun += durations[name]
        say(f"  {name:<14} {durations[name]:5.1f} s")
    return durations


def _from_root(survey: Survey) -> str:
    """Return the run folder as the notebooks, which run in the project folder, reach it."""
    return survey.run_folder.relative_to(survey.parameters.root).as_posix()


def _literal(path: Path) -> str:
    """Return a path for papermill, which reads braces in paths as names of parameters."""
    return str(path).replace("{", "{{").replace("}", "}}")


def _check_parameters(root: Path) -> None:
    """Refuse notebooks whose parameters cell would not take what is handed over."""
    import papermill

    for name in NOTEBOOKS:
        path = root / "notebooks" / f"{name}.ipynb"
        if not path.is_file():
            raise InputError(f"notebooks/{name}.ipynb is missing; restore it from the project")
        known = papermill.inspect_notebook(str(path))
        for key in ("params_file", "run_folder"):
            if key not in known:
                raise InputError(f"notebooks/{name}.ipynb: its parameters cell lacks {key}; "
                                 "restore the cell and its tag 'parameters'")


def _write(survey: Survey, new: Path, durations: dict[str, float], started: float) -> None:
    """Write tables, page and, last, run.json."""
    import nbformat

    tables = pipeline.all_tables(survey)
    known = facts.collect(survey)
    passes = pipeline.ingest(survey).passes
    known["conditions"] += overview.conditions(pipeline.day_course(survey))
    known["albedo_geometry"] = overview.geometry(passes)
    datapackage.write_tables(tables, new / "tables", known)
    notebooks = []
    for name in NOTEBOOKS:
        notebook = nbformat.read(new / "notebooks" / f"{name}.ipynb", as_version=4)
        notebook.metadata.pop("papermill", None)  # it holds this machine's folders
        nbformat.write(notebook, new / "notebooks" / f"{name}.ipynb")
        notebooks.append(notebook)
    (new / "report.html").write_text(page.build_page(notebooks, tables, known), encoding="utf-8",
                                     newline="\n")
    kept: dict[str, Any] = {
        "key": survey.key, "command": known["rerun"], "campaign": known["campaign"],
        "inputs": known["inputs"], "params_file": known["params_file"],
        "earlier_inputs": [item for path in survey.parameters.earlier
                           for item in open_file(path).inputs],
        "outputs": outputs(new), "versions": known["versions"], "seed": known["seed"],
        "draws": known["draws"],
        "finished_utc": time.strftime("%Y-%m-%dT%H:%M:%SZ", time.gmtime()),
        "durations_s": {k: round(v, 3) for k, v in durations.items()},
        "total_s": round(time.perf_counter() - started, 3)}
    with open(new / "run.json", "w", encoding="utf-8", newline="\n") as file:
        json.dump(kept, file, indent=1, sort_keys=True)
        file.write("\n")
        file.flush()
        os.fsync(file.fileno())


def _reports(survey: Survey) -> Path:
    folder = survey.parameters.root / "reports"
    folder.mkdir(exist_ok=True)
    return folder
