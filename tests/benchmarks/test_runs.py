"""Speed of whole runs, each held against the plain way in one run, outputs compared too.

`pytest tests/benchmarks -s` prints the table. Not part of the plain command: ratios want a quiet
machine. SURVEYKIT_FULL=all takes five pairs, and eight campaigns.
"""

from __future__ import annotations

import json
import os
import shutil
import statistics
import subprocess
import sys
import time

import pandas as pd
import pytest
import small_survey
from projects import DEMO, copy_project
from small_campaigns import project, write

from surveykit import producing, season
from surveykit.handover import load_table
from surveykit.opening import open_file

FULL = os.environ.get("SURVEYKIT_FULL") == "all"
PAIRS = 5 if FULL else 2
NOTEBOOKS = ("01_ingest", "02_quality", "03_surfaces", "04_comparison")
PLAIN = """\
import sys
import nbformat, papermill
from nbconvert import HTMLExporter
for name in {notebooks}:
    papermill.execute_notebook("notebooks/" + name + ".ipynb", "plain/" + name + ".ipynb",
                               parameters={{"params_file": "params/{campaign}.yml"}},
                               kernel_name="python3", progress_bar=False)
for name in {notebooks}:
    page, _ = HTMLExporter().from_notebook_node(
        nbformat.read("plain/" + name + ".ipynb", as_version=4))
    open("plain/" + name + ".html", "w", encoding="utf-8").write(page)
"""


@pytest.fixture(autouse=True)
def _asked_for(request):
    if not FULL and not any("benchmarks" in str(one) for one in request.config.args):
        pytest.skip("asked for by name: pytest tests/benchmarks")


def told(row: str, value: str) -> None:
    print(f"\n| {row} | {value} |")  # noqa: T201


def timed(folder, *command: str) -> float:
    begun = time.perf_counter()
    done = subprocess.run([sys.executable, *command], cwd=folder, capture_output=True, text=True,
                          check=False)
    assert done.returncode == 0, done.stdout + done.stderr
    return time.perf_counter() - begun


def images(folder) -> int:
    return sum(output.get("data", {}).get("image/png") is not None
               for name in NOTEBOOKS
               for cell in json.loads((folder / f"{name}.ipynb").read_text("utf-8"))["cells"]
               for output in cell.get("outputs", []))


def tables(folder) -> dict[str, pd.DataFrame]:
    return {f"{path.parent.name}/{path.stem}": load_table(path)
            for stage in ("surfaces", "comparison")
            for path in sorted((folder / ".surveykit" / DEMO[2] / stage).glob("*.npz"))}


def test_a_run_against_plain_papermill_and_nbconvert(tmp_path):
    folder = copy_project(tmp_path / "project")
    (folder / "plain").mkdir()
    for name in DEMO[:2]:  # the earlier dates stand, for both ways alike
        assert season.work(folder / "params" / f"{name}.yml", False, notebooks=()).code == 0
    mine, plain = [], []
    script = PLAIN.format(notebooks=NOTEBOOKS, campaign=DEMO[2])
    for _ in range(PAIRS):
        shutil.rmtree(folder / ".surveykit" / DEMO[2], ignore_errors=True)
        plain.append(timed(folder, "-c", script))
        theirs = tables(folder)
        mine.append(timed(folder, "-m", "surveykit.cli", "run", f"params/{DEMO[2]}.yml"))
        ours = tables(folder)
        assert ours.keys() == theirs.keys()
        for name, frame in ours.items():
            pd.testing.assert_frame_equal(frame, theirs[name], check_exact=True)
        assert images(folder / "reports" / DEMO[2] / "notebooks") == images(folder / "plain") >= 8
    ratio = statistics.median(m / p for m, p in zip(mine, plain, strict=True))
    told("one campaign, four notebooks and the report, against plain papermill and nbconvert",
         f"{statistics.median(mine):.1f} s, {ratio:.2f}")
    assert ratio <= 0.75


def test_help_and_check_answer_at_once(tmp_path):
    folder = copy_project(tmp_path / "project")
    helped = min(timed(folder, "-m", "surveykit.cli", "--help") for _ in range(5))
    checked = min(timed(folder, "-m", "surveykit.cli", "check", f"params/{DEMO[2]}.yml")
                  for _ in range(5))
    told("surveykit --help", f"{helped:.2f} s")
    told("surveykit check of the demo", f"{checked:.2f} s")
    assert helped <= 0.5
    assert checked <= 1.5


def test_stages_of_a_whole_day(tmp_path):
    """1 Hz, 8 h, 6 loggers: about 175,000 records."""
    folder = tmp_path / "project"
    n = 8 * 3600
    logs = {name: small_survey.lines(name, start="08:00:00", n=n) for name in small_survey.KIT}
    sheet = [small_survey.row(patch=f"C{number}", start=f"{8 + number}:10:00",
                              stop=f"{8 + number}:14:00", **what)
             for number in range(7)
             for what in (small_survey.ALBEDO, small_survey.NDVI, small_survey.STAND_OFF)]
    small_survey.small(folder, sheet, logs)
    path = folder / "params" / f"yard-{small_survey.DAY}.yml"
    took = []
    for _ in range(3):
        begun = time.perf_counter()
        producing.compute(open_file(path))
        took.append(time.perf_counter() - begun)
    told("stages without notebooks, 175,000 records", f"{min(took):.2f} s")
    assert min(took) <= 3.0


@pytest.mark.skipif(not FULL, reason="the longer share")
def test_eight_campaigns_on_two_workers(tmp_path):
    """One worker on one core against two workers on two: a lone run uses every core it may."""
    folder = project(tmp_path / "project", [])
    names = [f"yard-{number}" for number in range(8)]
    for number, name in enumerate(names):
        write(folder, name, date=f"2025-06-{11 + number}")
    files = [f"params/{name}.yml" for name in names]
    one = timed(folder, "-c", "import os, sys; os.sched_setaffinity(0, {min("
                "os.sched_getaffinity(0))}); from surveykit.cli import main; "
                "sys.exit(main(sys.argv[1:]))", "run", *files)
    two = timed(folder, "-m", "surveykit.cli", "run", "--jobs", "2", *files)
    told("eight campaigns on two workers against one", f"{two:.0f} s, {two / one:.2f}")
    assert two <= 0.65 * one
