"""What a run makes of a campaign: the stages computed anew, then tables, page and run.json."""

from __future__ import annotations

import shutil
import time
from pathlib import Path

import nbformat
from nbformat import NotebookNode

from surveykit import facts, overview, pipeline
from surveykit.core import InputError
from surveykit.handover import save_facts
from surveykit.opening import Survey, open_file
from surveykit.report import datapackage, page
from surveykit.verifying import outputs


def compute(survey: Survey) -> None:
    """Compute every stage from the raw files; the notebooks read what this leaves.

    Raises
    ------
    InputError
        With every fault of the field sheet and of the loggers' files.
    """
    for stage in pipeline.STAGES:
        if (survey.run_folder / stage).exists():
            shutil.rmtree(survey.run_folder / stage)
    pipeline.all_tables(survey)


def write(survey: Survey, new: Path, notebooks: tuple[str, ...], durations: dict[str, float],
          started: float) -> None:
    """Write tables, page and, last, run.json.

    Raises
    ------
    InputError
        If an input changed while the campaign was run.
    """
    tables = pipeline.all_tables(survey)
    known = facts.collect(survey)
    known["conditions"] += overview.conditions(pipeline.day_course(survey))
    datapackage.write_tables(tables, new / "tables", known)
    shown = [_kept(new / "notebooks" / f"{name}.ipynb") for name in notebooks]
    (new / "report.html").write_text(page.build_page(shown, tables, known), encoding="utf-8",
                                     newline="\n")
    earlier = [open_file(path) for path in survey.parameters.earlier]
    if open_file(survey.parameters.path).key != survey.key:
        raise InputError(f"{survey.inputs[0]['path']}: an input changed while the campaign was "
                         "run; run it again")
    kept = {name: known[name] for name in (
        "campaign", "title", "date", "surfaces", "inputs", "params_file", "versions", "seed",
        "draws")}
    kept |= {
        "key": survey.key, "command": known["rerun"], "site": known["site"]["name"],
        "earlier_inputs": [item for one in earlier for item in one.inputs],
        "outputs": outputs(new),
        "finished_utc": time.strftime("%Y-%m-%dT%H:%M:%SZ", time.gmtime()),
        "durations_s": {k: round(v, 3) for k, v in durations.items()},
        "total_s": round(time.perf_counter() - started, 3)}
    save_facts(new / "run.json", kept)


def _kept(path: Path) -> NotebookNode:
    notebook = nbformat.read(path, as_version=4)
    notebook.metadata.pop("papermill", None)  # it holds this machine's folders
    nbformat.write(notebook, path)
    return notebook
