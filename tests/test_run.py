"""The way through: one command, the report it writes, the same numbers by every route."""

import hashlib
import json
import shutil
import subprocess
import sys

import html5lib
import numpy as np
import pandas as pd
import pytest
from bs4 import BeautifulSoup
from projects import DEMO, ROOT, copy_project, surveykit

from surveykit.core import PUBLISHED
from surveykit.handover import load_table

LATEST = DEMO[2]


@pytest.fixture(scope="module")
def page(demo):
    text = (demo[0] / "reports" / LATEST / "report.html").read_text(encoding="utf-8")
    return text, BeautifulSoup(text, "html5lib")


def test_one_command_writes_the_report_and_says_where(demo):
    folder, done = demo
    assert done.stdout.rstrip().endswith(f"report: reports/{LATEST}/report.html")
    for name in DEMO:  # the earlier campaigns were run with it
        assert {p.name for p in (folder / "reports" / name).iterdir()} == {
            "report.html", "notebooks", "tables", "run.json"}
    tables = {p.stem for p in (folder / "reports" / LATEST / "tables").glob("*.csv")}
    assert tables == set(PUBLISHED)


def test_run_json_holds_the_hash_of_every_input(demo):
    folder, _ = demo
    kept = json.loads((folder / "reports" / LATEST / "run.json").read_text(encoding="utf-8"))
    assert f"params/{LATEST}.yml" in {i["path"] for i in kept["inputs"]}
    for item in kept["inputs"]:
        assert hashlib.sha256((folder / item["path"]).read_bytes()).hexdigest() == item["sha256"]
    assert kept["seed"] == 20251


def test_plain_papermill_gives_the_same_numbers(demo, tmp_path):
    folder, _ = demo
    other = copy_project(tmp_path / "plain")
    done = subprocess.run(
        [sys.executable, "-m", "papermill", "notebooks/04_comparison.ipynb", "out.ipynb",
         "-f", f"params/{LATEST}.yml", "-k", "python3", "--no-progress-bar"],
        cwd=other, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    for stage, name in (("surfaces", "surfaces"), ("surfaces", "passes"), ("surfaces", "budget"),
                        ("comparison", "differences"), ("comparison", "changes")):
        mine = load_table(other / ".surveykit" / LATEST / stage / f"{name}.npz")
        theirs = load_table(folder / ".surveykit" / LATEST / stage / f"{name}.npz")
        pd.testing.assert_frame_equal(mine, theirs, rtol=1e-12)
    assert not (other / "reports").exists()


def test_papermill_refuses_sections_that_differ_from_the_file(project):
    changed = project / "edited.yml"
    text = (project / "params" / f"{DEMO[0]}.yml").read_text(encoding="utf-8")
    assert "latitude: 41.3" in text
    changed.write_text(text.replace("latitude: 41.3", "latitude: 42.3"), encoding="utf-8")
    done = subprocess.run(
        [sys.executable, "-m", "papermill", "notebooks/01_ingest.ipynb", "out.ipynb",
         "-f", "edited.yml", "-k", "python3", "--no-progress-bar"],
        cwd=project, capture_output=True, text=True, check=False)
    assert done.returncode != 0
    assert "site: the notebook was handed another value than the file holds" in done.stderr


def test_committed_notebooks_show_the_numbers_of_the_run(demo):
    """nbval compares these outputs with a run in place; here they are held against the report."""
    folder, _ = demo
    table = pd.read_csv(folder / "reports" / LATEST / "tables" / "surfaces.csv")
    kept = (ROOT / "notebooks" / "03_surfaces.ipynb").read_text(encoding="utf-8")
    for value in table["value"].dropna()[table["quantity"] == "albedo"]:
        assert f"{value:.3f}" in kept


def test_the_page_stands_alone(page):
    text, soup = page
    html5lib.HTMLParser(strict=True).parse(text)
    assert soup.find("script") is None
    assert len(soup.find_all("h1")) == 1
    ids = [tag["id"] for tag in soup.find_all(id=True)]
    assert len(ids) == len(set(ids))
    for tag in soup.find_all(True):
        for name in ("src", "href"):
            target = tag.get(name)
            assert target is None or target.startswith(("#", "data:")), tag
            if target and target.startswith("#"):
                assert target[1:] in ids, target
    assert "url(" not in text.replace("url(data:", "").replace("url(#", "")
    assert str(ROOT) not in text
    assert len(text) < 3_000_000


def test_every_figure_has_an_alt_text_that_states_a_finding(page):
    _, soup = page
    images = soup.find_all("img")
    assert len(images) >= 8
    alts = [image["alt"] for image in images]
    assert len(set(alts)) == len(alts)
    for alt in alts:
        assert len(alt) > 60
        assert any(character.isdigit() for character in alt), alt
        assert "No description" not in alt


def test_the_summary_comes_first_and_names_what_changed(page):
    _, soup = page
    headings = [h.get_text(strip=True) for h in soup.find_all(["h1", "h2", "h3"])]
    summary = headings.index("Summary")
    for word in ("What differs", "What changed", "What could not be evaluated, and why",
                 "Cautions"):
        assert headings.index(word) > summary
        assert headings.index(word) < headings.index("What was read")
    text = soup.get_text(" ", strip=True)
    assert "NaN" not in text
    assert "nan" not in text.split()


def test_the_ledger_accounts_for_every_record(demo):
    folder, _ = demo
    ledger = pd.read_csv(folder / "reports" / LATEST / "tables" / "ledger.csv")
    counted = ledger.groupby("file")["records"].sum()
    for name, records in counted.items():
        raw = (folder / name).read_bytes().splitlines()
        lines = sum(1 for line in raw if line.strip())
        preamble = 3 if "weather" in str(name) else 0  # two lines above the header, one of units
        assert records == lines - 1 - preamble, name
    assert set(ledger["disposition"]) == {"used", "excluded", "outside passes"}
    assert np.isclose(ledger.loc[ledger["disposition"] == "excluded", "reason"].eq("").sum(), 0)


def test_a_failed_notebook_keeps_the_old_report(demo, tmp_path):
    project = shutil.copytree(demo[0], tmp_path / "project")
    report = project / "reports" / DEMO[0] / "report.html"
    before, stood = report.read_bytes(), sorted(p.name for p in (project / "reports").iterdir())
    broken = project / "notebooks" / "03_surfaces.ipynb"
    broken.write_text(broken.read_text(encoding="utf-8").replace(
        "evidence = pipeline.surfaces(survey)", "evidence = pipeline.surfaces(1 / 0)"),
        encoding="utf-8")
    done = surveykit(project, "run", f"params/{DEMO[0]}.yml")
    assert done.returncode == 1
    assert "ZeroDivisionError" in done.stderr
    assert report.read_bytes() == before
    assert sorted(p.name for p in (project / "reports").iterdir()) == stood


def test_a_campaign_that_compares_with_itself_through_another_is_refused(project):
    june = project / "params" / f"{DEMO[0]}.yml"
    text = june.read_text(encoding="utf-8")
    assert "earlier: []" in text
    june.write_text(text.replace("earlier: []", f"earlier: [params/{DEMO[1]}.yml]"),
                    encoding="utf-8")
    done = surveykit(project, "run", f"params/{DEMO[0]}.yml")
    assert done.returncode == 2
    assert "comparison.earlier" in done.stderr
    assert "Traceback" not in done.stderr
