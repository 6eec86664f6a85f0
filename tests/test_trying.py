"""The cells that try other settings: run once, as in JupyterLab; nothing on disk changes."""

from __future__ import annotations

import shutil
from pathlib import Path

import nbformat
import numpy as np
import pytest
from nbclient import NotebookClient
from projects import DEMO

from surveykit import trying
from surveykit.core import InputError
from surveykit.opening import open_file

NAME = DEMO[0]


@pytest.fixture(scope="module")
def project(demo, tmp_path_factory):
    return shutil.copytree(demo[0], tmp_path_factory.mktemp("trying") / "project")


def state(folder: Path) -> dict[str, bytes]:
    return {p.as_posix(): p.read_bytes() for p in sorted(folder.rglob("*")) if p.is_file()}


@pytest.mark.parametrize("name", ["03_surfaces", "04_comparison"])
def test_the_cell_runs_once_and_changes_nothing(project, name):
    notebook = nbformat.read(project / "notebooks" / f"{name}.ipynb", as_version=4)
    skipped = [c for c in notebook.cells if "page-skip" in c.metadata.get("tags", [])]
    assert [c.cell_type for c in skipped] == ["markdown", "code"]
    assert "nbval-skip" in skipped[1].metadata.tags
    assert notebook.cells[-1] is skipped[1]
    opening = [c for c in notebook.cells if c.cell_type == "code"][:3]
    notebook.cells = [*opening, skipped[1]]
    before = state(project)
    NotebookClient(notebook, kernel_name="python3", timeout=120,
                   resources={"metadata": {"path": str(project)}}).execute()
    assert state(project) == before
    (output,) = notebook.cells[-1].outputs
    assert "as run" in output.data["text/html"]
    assert "tried" in output.data["text/html"]


def test_the_report_leaves_the_cells_out(demo):
    page = (demo[0] / "reports" / NAME / "report.html").read_text(encoding="utf-8")
    assert "Try other settings" not in page
    kept = nbformat.read(demo[0] / "reports" / NAME / "notebooks" / "03_surfaces.ipynb", 4)
    assert kept.cells[-1].outputs == []  # a run does not do the work either


def test_the_same_settings_give_the_same_numbers_and_others_move_them(project):
    survey = open_file(project / "params" / f"{NAME}.yml")
    same = trying.surface(survey, "lawn", {})
    run, tried = (same[same["settings"] == word].reset_index(drop=True)
                  for word in ("as run", "tried"))
    np.testing.assert_allclose(run["value"], tried["value"], rtol=1e-12)
    np.testing.assert_allclose(run["u"], tried["u"], rtol=1e-12)
    other = trying.surface(survey, "lawn", {"albedo": {"directional_limit_w_m2": 80.0}})
    u = other[other["quantity"] == "albedo"].set_index("settings")["u"]
    assert u["tried"] > 1.05 * u["as run"]
    pair = trying.difference(survey, "lawn", "coated-court", {})
    for _, block in pair.groupby(["quantity", "kind"]):
        assert set(block["settings"]) == {"as run", "tried"}
        assert block["difference"].nunique() == 1 or np.ptp(block["difference"].abs()) < 1e-9


def test_what_a_setting_of_the_statistics_does_is_seen(project):
    """Scatter between passes taken in common for a quantity widens what one pass leaves open."""
    survey = open_file(project / "params" / f"{NAME}.yml")
    common = trying.surface(survey, "lawn", {"statistics": {"between_passes": "common"}})
    u = common.pivot_table(index=["quantity", "kind"], columns="settings", values="u")
    assert (abs(u["tried"] / u["as run"] - 1) > 1e-3).any()
    fewer = trying.surface(survey, "lawn", {"statistics": {"seed": 7}})
    u = fewer.pivot_table(index=["quantity", "kind"], columns="settings", values="u")
    assert (u["tried"] != u["as run"]).any()


def test_unknown_names_are_refused(project):
    survey = open_file(project / "params" / f"{NAME}.yml")
    with pytest.raises(InputError, match="surface 'pond' is not one of"):
        trying.surface(survey, "pond", {})
    with pytest.raises(InputError, match="settings.albedo.levelling_u"):
        trying.surface(survey, "lawn", {"albedo": {"levelling_u": 4.0}})
