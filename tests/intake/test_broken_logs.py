"""Each fault of reading has a file that shows it alone, and a clean twin that does not."""

from __future__ import annotations

import pytest
import yaml
from checks import DATA
from invented import THERMAL, instrument, parameters

from surveykit.core import InputError
from surveykit.intake.fieldsheet import read_sheet
from surveykit.intake.loggers import read_logger

FOLDER = DATA / "broken/reading"
CASES = yaml.safe_load((FOLDER / "cases.yml").read_text(encoding="utf-8"))
LOGS = [name for name in CASES if not name.startswith("sheet-")]


def read(case: dict, file: str):
    changed = case.get("entry", {})
    entry = {**THERMAL, **changed, "time": {**THERMAL["time"], **changed.get("time", {})}}
    return read_logger("thermal", instrument(entry), [FOLDER / file], FOLDER)


def faults(call, *arguments) -> tuple[str, ...]:
    with pytest.raises(InputError) as caught:
        call(*arguments)
    return caught.value.faults


def marks(records) -> dict[str, list[int]]:
    found = {reason: sorted(records.line[rows].tolist())
             for reason, rows in records.marks.items() if rows.any()}
    return found | {f"unreadable {column}": sorted(records.line[rows].tolist())
                    for column, rows in records.unreadable.items() if rows.any()}


@pytest.mark.parametrize("name", LOGS)
def test_a_log_shows_its_fault_alone_and_its_twin_none(name):
    case = CASES[name]
    if isinstance(case["said"], str):
        told = faults(read, case, case["file"])
        assert all(fault.startswith(case["file"]) for fault in told), told
        assert case["said"] in told[0]
    else:
        assert marks(read(case, case["file"])) == case["said"]
    assert marks(read(case, case["clean"])) == {}


@pytest.mark.parametrize("name", [name for name in CASES if name not in LOGS])
def test_a_sheet_shows_its_fault_alone_and_its_twin_none(name):
    case, known = CASES[name], parameters(FOLDER)
    told = faults(read_sheet, FOLDER / case["file"], known)
    assert len(told) == 1, told
    assert told[0].startswith(f"{case['file']} {case['said']}")
    assert read_sheet(FOLDER / case["clean"], known).notices == ()


def test_every_broken_file_is_used():
    used = {case[key] for case in CASES.values() for key in ("file", "clean")} | {"cases.yml"}
    assert used == {path.name for path in FOLDER.iterdir()}
