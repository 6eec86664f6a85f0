"""`surveykit plan`: renders the planning notebook and writes the field sheet."""

from __future__ import annotations

import sys
from pathlib import Path

from surveykit import facts, planning
from surveykit.core import InputError
from surveykit.kernels import QuietKernelManager
from surveykit.opening import open_file
from surveykit.report.plan import plan_page, sheet_page

sys.modules.setdefault("rfc3987_syntax", None)  # type: ignore[arg-type]  # see runner

NOTEBOOK = "00_plan"


def plan(path: Path) -> list[Path]:
    """Render the planning notebook; return the page, the field sheet to print, and its CSV.

    They stand in reports/ID.plan/. Files of the planned day need not be there yet.

    Raises
    ------
    InputError
        If the parameter file or an earlier campaign is at fault.
    """
    import nbformat

    survey = open_file(path, planned=True)
    root = survey.parameters.root
    source = root / "notebooks" / f"{NOTEBOOK}.ipynb"
    if not source.is_file():
        raise InputError(f"notebooks/{NOTEBOOK}.ipynb is missing; restore it from the project")
    known, made = facts.collect(survey), planning.make(survey)
    visits = planning.order(survey, made, planning.rounds_needed(survey, made))
    sheet = planning.field_sheet(survey, made, visits)
    folder = root / "reports" / f"{survey.campaign.campaign}.plan"
    folder.mkdir(parents=True, exist_ok=True)
    executed = folder / f".{NOTEBOOK}.ipynb"
    _execute(source, executed, root, survey.inputs[0]["path"])
    notebook = nbformat.read(executed, as_version=4)
    executed.unlink()
    pages = {"plan.html": plan_page(notebook, known, planning.fits(survey, made, visits)),
             "field_sheet.html": sheet_page(sheet, planning.SAFETY, known),
             "field_sheet.csv": sheet.to_csv(index=False, lineterminator="\n")}
    for name, text in pages.items():
        (folder / name).write_text(text, encoding="utf-8", newline="\n")
    return [folder / name for name in pages]


def _execute(source: Path, target: Path, root: Path, params_file: str) -> None:
    """Run the notebook in a kernel of its own."""
    import papermill

    kernel = QuietKernelManager(kernel_name="python3")
    kernel.begin(root)
    try:
        papermill.execute_notebook(
            *(str(p).replace("{", "{{").replace("}", "}}") for p in (source, target)),
            parameters={"params_file": params_file}, kernel_name="python3", progress_bar=False,
            log_output=False, cwd=str(root), km=kernel)
    except papermill.PapermillExecutionError as error:
        if error.ename == InputError.__name__:
            raise InputError(*error.evalue.splitlines()) from None
        raise
    finally:
        kernel.end()
