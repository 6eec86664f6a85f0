"""The user's mistakes: exit 2, one located sentence each, nothing written."""

import pytest
from projects import DEMO, surveykit

JUNE = DEMO[0]
FILE = f"params/{JUNE}.yml"
DATA = f"demo_data/{JUNE}"


def change(path, old, new, encoding="utf-8"):
    text = path.read_text(encoding=encoding)
    assert old in text, old
    path.write_text(text.replace(old, new, 1), encoding=encoding)


def listing(project):
    return {p.relative_to(project): p.stat().st_mtime_ns for p in project.rglob("*")
            if p.is_file()}


FAULTS = {
    "unknown key": (lambda p: change(p / FILE, "site:", "sight: 1\nsite:"),
                    [FILE, "sight", "unknown key"]),
    "unquoted date": (lambda p: change(p / FILE, 'date: "2025-06-11"', "date: 2025-06-11"),
                      [FILE, "date", "2025-06-11", "quote"]),
    "missing data file": (lambda p: (p / DATA / "shortwave.csv").unlink(),
                          [FILE, "loggers.shortwave.files", "shortwave.csv"]),
    "missing field sheet": (lambda p: (p / DATA / "field_sheet.csv").unlink(),
                            [FILE, "field_sheet", "field_sheet.csv"]),
    "missing column": (lambda p: change(p / DATA / "shortwave.csv", "ground_mV", "gnd"),
                       [f"{DATA}/shortwave.csv", "ground_mV"]),
    "missing column of the sheet": (
        lambda p: change(p / DATA / "field_sheet.csv", "patch", "plot"),
        ["field_sheet.csv", "patch"]),
    "stop before start": (
        lambda p: swap_times(p / DATA / "field_sheet.csv"), ["field_sheet.csv", "row"]),
    "unknown surface": (lambda p: change(p / DATA / "field_sheet.csv", "brick-path", "brik-path"),
                        ["field_sheet.csv", "row", "brik-path", "brick-path"]),
    "missing parameter file": (lambda p: (p / FILE).unlink(), [FILE]),
    "missing kit": (lambda p: (p / "params/instruments.yml").unlink(),
                    [FILE, "params/instruments.yml"]),
    "another day's data": (
        lambda p: change(p / FILE, 'date: "2025-06-11"', 'date: "2025-06-12"'), ["2025-06-11"]),
}


def swap_times(path):
    lines = path.read_text(encoding="utf-8").splitlines()
    header = lines[0].split(",")
    start, stop = header.index("start"), header.index("stop")
    entry = header.index("entry")
    row = next(i for i, line in enumerate(lines) if line.split(",")[entry] == "pass")
    cells = lines[row].split(",")
    cells[start], cells[stop] = cells[stop], cells[start]
    lines[row] = ",".join(cells)
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")


@pytest.mark.parametrize("name", FAULTS)
@pytest.mark.parametrize("command", ["run", "check"])
def test_a_fault_is_located_and_nothing_is_written(project, command, name):
    spoil, words = FAULTS[name]
    spoil(project)
    before = listing(project)
    done = surveykit(project, command, FILE)
    assert done.returncode == 2, done.stdout + done.stderr
    assert "Traceback" not in done.stderr
    lines = done.stderr.strip().splitlines()
    assert any(all(word in line for word in words) for line in lines), done.stderr
    assert listing(project) == before


def test_the_clean_twin_passes_check(project):
    done = surveykit(project, "check", FILE, "params/instruments.yml")
    assert done.returncode == 0, done.stderr
    assert "no fault found" in done.stdout


def test_check_lists_faults_of_several_files_at_once(project):
    change(project / DATA / "shortwave.csv", "ground_mV", "gnd")
    change(project / DATA / "field_sheet.csv", "brick-path", "brik-path")
    done = surveykit(project, "check", FILE)
    assert done.returncode == 2
    assert "ground_mV" in done.stderr
    assert "brik-path" in done.stderr


def test_new_writes_what_check_can_read(project):
    done = surveykit(project, "new", "mill-yard-2025-07-24")
    assert done.returncode == 0, done.stderr
    again = surveykit(project, "new", "mill-yard-2025-07-24")
    assert again.returncode == 2
    assert "is there already" in again.stderr
    unfilled = surveykit(project, "check", "params/mill-yard-2025-07-24.yml")
    assert unfilled.returncode == 2
    assert "Traceback" not in unfilled.stderr
    assert "date" in unfilled.stderr


def test_run_passes_over_a_kit(project):
    done = surveykit(project, "run", "params/instruments.yml")
    assert done.returncode == 0
    assert "nothing to run" in done.stdout
