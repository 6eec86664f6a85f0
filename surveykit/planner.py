"""`surveykit plan`: renders the planning notebook and writes the field sheet."""

from __future__ import annotations

from pathlib import Path
from tempfile import TemporaryDirectory

from surveykit import facts, planning
from surveykit.handover import save_text
from surveykit.kernels import QuietKernelManager, execute
from surveykit.opening import open_file
from surveykit.report.plan import plan_page, sheet_page

NOTEBOOK = "00_plan.ipynb"


def plan(path: Path) -> list[Path]:
    """Render the planning notebook; return the page, the field sheet to print, and its CSV.

    They stand in reports/ID.plan/. Files of the planned day need not be there yet.

    Raises
    ------
    InputError
        If the parameter file or an earlier campaign is at fault.
    OSError
        If something cannot be written; an earlier plan stays.
    """
    import nbformat

    survey = open_file(path, planned=True)
    root = survey.parameters.root
    known, made = facts.collect(survey), planning.make(survey)
    visits = planning.order(survey, made, planning.rounds_needed(survey, made))
    sheet = planning.field_sheet(survey, made, visits)
    kernel = QuietKernelManager(kernel_name="python3")
    kernel.begin(root)
    with TemporaryDirectory() as aside:
        executed = Path(aside) / NOTEBOOK
        execute(root / "notebooks" / NOTEBOOK, executed, root,
                {"params_file": survey.inputs[0]["path"]}, kernel)
        notebook = nbformat.read(executed, as_version=4)
    folder = root / "reports" / f"{survey.campaign.campaign}.plan"
    pages = {"plan.html": plan_page(notebook, known, planning.fits(survey, made, visits)),
             "field_sheet.html": sheet_page(sheet, planning.SAFETY, known),
             "field_sheet.csv": sheet.to_csv(index=False, lineterminator="\n")}
    for name, text in pages.items():
        save_text(folder / name, text)
    return [folder / name for name in pages]
