"""`surveykit verify`: one changed byte anywhere is found, and a second computation agrees."""

from __future__ import annotations

import json
import shutil
import time
from concurrent.futures import ThreadPoolExecutor

import pytest
from projects import DEMO, surveykit

from surveykit import facts
from surveykit.core import PUBLISHED, InputError
from surveykit.locking import locked
from surveykit.verifying import moved_cells, verify

NAME = DEMO[0]


@pytest.fixture(scope="module")
def project(demo, tmp_path_factory):
    return shutil.copytree(demo[0], tmp_path_factory.mktemp("verify") / "project")


@pytest.fixture
def report(project):
    return project / "reports" / NAME


def faults(folder, **options):
    with pytest.raises(InputError) as caught:
        verify(folder, **options)
    return caught.value.faults


def test_a_fresh_report_belongs_to_its_inputs(project, report):
    (line,) = verify(report)
    assert line.endswith(f"{len(PUBLISHED)} tables and the page belong together")
    done = surveykit(project, "verify", f"reports/{NAME}")
    assert (done.returncode, done.stdout.strip()) == (0, line)


def test_one_changed_byte_in_any_input_or_table_or_the_page_is_found(project, report):
    kept = json.loads((report / "run.json").read_text(encoding="utf-8"))
    paths = {item["path"]: project / item["path"] for item in kept["inputs"]}
    paths |= {f"reports/{NAME}/{name}": report / name for name in kept["outputs"]}
    assert {f"reports/{NAME}/tables/{name}.csv" for name in PUBLISHED} <= {*paths}
    assert f"reports/{NAME}/report.html" in paths
    for shown, path in paths.items():
        before = path.read_bytes()
        changed = bytearray(before)
        changed[len(changed) // 2] ^= 1
        path.write_bytes(changed)
        found = faults(report)
        path.write_bytes(before)
        assert len(found) == 1, shown
        assert found[0].startswith(f"{shown}: was changed"), found
    verify(report)


def test_a_changed_input_of_an_earlier_campaign_is_found(project):
    sheet = project / "demo_data" / NAME / "field_sheet.csv"
    before = sheet.read_bytes()
    sheet.write_bytes(before + b"\n")
    found = faults(project / "reports" / DEMO[2])
    sheet.write_bytes(before)
    assert [f.partition(":")[0] for f in found] == [f"demo_data/{NAME}/field_sheet.csv"]


def test_what_is_missing_or_added_is_refused(project, report):
    aside = report / "tables" / "surfaces.csv"
    text = aside.read_bytes()
    aside.unlink()
    (report / "tables" / "surfaces_old.csv").write_bytes(text)
    found = faults(report)
    assert any("tables/surfaces.csv: is missing" in line for line in found)
    assert any("surfaces_old.csv: is not of this run" in line for line in found)
    aside.write_bytes(text)
    (report / "tables" / "surfaces_old.csv").unlink()
    log = project / "demo_data" / NAME / "thermal_3.csv"
    log.write_bytes((project / "demo_data" / NAME / "thermal_1.csv").read_bytes())
    (line,) = faults(report)
    log.unlink()
    assert line.startswith(f"demo_data/{NAME}/thermal_3.csv: belongs to the campaign now")


@pytest.mark.parametrize("spoil", [
    lambda kept: kept.pop("outputs"), lambda kept: kept["outputs"].pop("report.html"),
    lambda kept: kept.pop("inputs"), lambda kept: kept.update(outputs=[]),
    lambda kept: kept.update(inputs=[1]), lambda kept: kept.update(params_file=None),
    lambda kept: kept.update(versions="1.0"), lambda kept: kept["inputs"].append({"path": 3})])
def test_an_incomplete_run_json_is_refused(report, spoil):
    path = report / "run.json"
    before = path.read_text(encoding="utf-8")
    kept = json.loads(before)
    spoil(kept)
    path.write_text(json.dumps(kept), encoding="utf-8")
    assert any("run.json" in line for line in faults(report))
    path.unlink()
    assert "is missing or cannot be read" in faults(report)[0]
    path.write_text(before, encoding="utf-8")


def test_a_folder_that_is_no_report_is_refused_without_a_traceback(project):
    done = surveykit(project, "verify", "reports/nothing-here")
    assert done.returncode == 2
    assert "Traceback" not in done.stderr
    assert "run.json: is missing" in done.stderr


def test_rerun_computes_the_same_tables(project, report):
    marker = project / ".surveykit" / NAME / "surfaces" / "done.json"
    then = marker.stat().st_mtime_ns
    lines = verify(report, rerun=True)
    assert marker.stat().st_mtime_ns > then  # computed, not taken from the last run
    assert "no cell of the tables moved" in lines[1]
    assert "the same then and now" in lines[2]


def test_rerun_waits_for_a_run_under_way(project, report):
    said: list[str] = []
    with ThreadPoolExecutor(1) as pool:
        with locked(project, NAME):
            again = pool.submit(verify, report, rerun=True, say=said.append)
            limit = time.monotonic() + 30
            while not said and time.monotonic() < limit:
                time.sleep(0.02)
            assert said[0].startswith(f"{NAME}: waits for another run that uses it")
            assert not again.done()
        assert "no cell of the tables moved" in again.result(timeout=60)[1]


def test_rerun_lists_cells_that_moved_with_versions(report, monkeypatch):
    from surveykit import pipeline

    tables = pipeline.all_tables

    def shifted(survey):
        made = tables(survey)
        frame = made["surfaces"].copy()
        frame.loc[0, "value"] *= 1 + 3e-6
        frame.loc[1, "value"] *= 1 + 3e-7
        return made | {"surfaces": frame}

    monkeypatch.setattr(pipeline, "all_tables", shifted)
    monkeypatch.setattr(facts, "versions", lambda: {"numpy": "9.9.9"})
    found = faults(report, rerun=True)
    assert len(found) == 2
    assert "tables/surfaces.csv: row 2, value:" in found[0]
    assert "numpy 2." in found[1]
    assert "then, 9.9.9 now" in found[1]


def test_moved_cells_by_hand():
    head = "campaign,logger,method,offset_s,u_s,drift_ppm,status,note"
    old = f"{head}\nc,a,declared,1.0,0.5,,ok,\n"
    for row, moved in (("c,a,declared,1.0000009,0.5,,ok,", []),
                       ("c,a,declared,1.0000011,0.5,,ok,",
                        ["row 2, offset_s: 1.0 then, 1.0000011 now"]),
                       ("c,a,declared,1.0,0.5,0.0,ok,",
                        ["row 2, drift_ppm: empty then, 0.0 now"]),
                       ("c,a,declared,1.0,0.5,,qualified,",
                        ["row 2, status: ok then, qualified now"])):
        assert [*moved_cells(old, f"{head}\n{row}\n", "clocks")] == moved
    assert [*moved_cells(old, f"{head}\n", "clocks")] == ["1 row then, 0 rows now"]
    assert [*moved_cells(old, old.replace("drift_ppm", "drift"), "clocks")] == [
        "columns drift_ppm then, drift now"]
