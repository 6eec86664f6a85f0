"""`surveykit pack`: one zip, the same bytes each time, from which the same page is made."""

from __future__ import annotations

import shutil
import zipfile

from projects import DEMO, ROOT, copy_project, surveykit

from surveykit.core import PUBLISHED

NAME = DEMO[1]


def test_the_zip_gives_the_same_report_elsewhere(demo, tmp_path):
    """Run again from its raw files in another folder, page and tables come out byte for byte."""
    here = shutil.copytree(demo[0], tmp_path / "here")
    shutil.copy(ROOT / "constraints.txt", here)
    done = surveykit(here, "pack", f"params/{NAME}.yml")
    assert done.returncode == 0, done.stderr
    assert done.stdout.strip() == f"packed: reports/{NAME}.zip"
    packed = here / "reports" / f"{NAME}.zip"
    first = packed.read_bytes()
    assert surveykit(here, "pack", f"params/{NAME}.yml").returncode == 0
    assert packed.read_bytes() == first

    elsewhere = tmp_path / "somewhere else"
    with zipfile.ZipFile(packed) as content:
        names = {*content.namelist()}
        content.extractall(elsewhere)
    assert {f"params/{NAME}.yml", f"params/{DEMO[0]}.yml", "params/instruments.yml",
            f"demo_data/{DEMO[0]}/thermal_1.csv", "constraints.txt", "README.txt",
            f"reports/{NAME}/report.html", f"reports/{NAME}/run.json"} <= names
    assert not any(DEMO[2] in name or name.startswith((".", "/")) for name in names)
    for name in names:  # nothing of this machine's folders travels
        assert str(tmp_path).encode() not in (elsewhere / name).read_bytes(), name
    assert surveykit(elsewhere, "verify", f"reports/{NAME}").returncode == 0

    shutil.rmtree(elsewhere / "reports")
    done = surveykit(elsewhere, "run", f"params/{NAME}.yml")
    assert done.returncode == 0, done.stderr
    compared = 0
    for path in (p for name in DEMO[:2] for p in sorted((here / "reports" / name).rglob("*"))):
        if path.suffix in (".html", ".csv") or path.name == "datapackage.json":
            assert path.read_bytes() == (elsewhere / path.relative_to(here)).read_bytes(), path
            compared += 1
    assert compared == 2 * (2 + len(PUBLISHED))


def test_a_report_that_is_missing_or_stale_is_not_packed(tmp_path, demo):
    project = copy_project(tmp_path / "project")
    done = surveykit(project, "pack", f"params/{NAME}.yml")
    assert done.returncode == 2
    assert "there is no report to pack; first: surveykit run" in done.stderr
    stale = shutil.copytree(demo[0], tmp_path / "stale")
    page = stale / "reports" / NAME / "report.html"
    page.write_bytes(page.read_bytes() + b" ")
    done = surveykit(stale, "pack", f"params/{NAME}.yml")
    assert done.returncode == 2
    assert "report.html: was changed after the run" in done.stderr
    assert not (stale / "reports" / f"{NAME}.zip").exists()
