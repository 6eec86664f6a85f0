"""Each refusal of a clock or of a pass has a committed file that triggers it alone, and a twin.

The limits are engineering defaults of `settings.clocks` and `settings.passes`.
"""

from __future__ import annotations

import csv

import pytest
import yaml
from make_broken_time import FOLDER, GOOD, files
from small_survey import small

from surveykit.core import InputError
from surveykit.intake.aligning import align, read_logs
from surveykit.quality import examine

CASES = yaml.safe_load((FOLDER / "cases.yml").read_text(encoding="utf-8"))


def told(root, logs, clocks, sheet, sheet_u_s=0.0):
    """Return what is said against clocks and passes, and which loggers and passes it concerns."""
    texts = {name: (FOLDER / f"{file}.csv").read_text(encoding="utf-8").splitlines()
             for name, file in logs.items()}
    with (FOLDER / f"sheet.{sheet}.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    uses = {name: {"files": f"{name}_*.csv", "clock": clocks.get(name, GOOD)} for name in logs}
    parameters = small(root, rows, texts, loggers=uses,
                       settings={"passes": {"sheet_u_s": sheet_u_s}}).parameters
    try:
        found = align(parameters, *read_logs(parameters))
    except InputError as error:
        return list(error.faults), None
    quality = examine(parameters, found.records, found.sheet, found.passes)
    said = [clock.refusal or clock.note for clock in found.clocks if clock.status != "ok"]
    said += [note for this in found.passes for note in this.notes]
    said += [one.refusal for one in quality.passes.values() if one.refusal]
    return said, quality


@pytest.mark.parametrize("name", CASES)
def test_a_fault_in_time_is_told_alone_and_its_twin_is_not(tmp_path, name):
    case = CASES[name]
    more = {"sheet_u_s": case.get("sheet_u_s", 0.0)}
    said, quality = told(tmp_path / "faulty", case["logs"], case["clocks"], case["sheet"], **more)
    assert said
    assert [text for text in said if case["said"] not in text] == []
    if quality is not None:
        assert quality.ledger.records.sum() > 0
    clean, quality = told(tmp_path / "clean", case["clean"],
                          case.get("clean_clocks", case["clocks"]),
                          case.get("clean_sheet", case["sheet"]), **more)
    assert clean == []
    assert (quality.ledger.disposition == "used").any()


def test_the_files_are_as_make_broken_time_writes_them():
    assert {path.name: path.read_text(encoding="utf-8") for path in FOLDER.iterdir()} == files()
