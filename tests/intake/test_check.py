"""`surveykit check`: all faults of a campaign in one go, soon; what it understood otherwise."""

from __future__ import annotations

import csv
import os
import re
import statistics
import subprocess
import sys
from datetime import datetime, timedelta

import pytest

from surveykit.checking import check
from surveykit.core import InputError
from surveykit.intake.params.partly import load_partly

JUNE = "pellowick-yard-2025-06-11"
FILE, KIT, DATA = f"params/{JUNE}.yml", "params/instruments.yml", f"demo_data/{JUNE}"
SHEET = f"{DATA}/field_sheet.csv"

# file, what is there, what is planted, what the message must hold; kinds all different
PLANTED = [
    (FILE, "conditions: {", "weather_notes: none\nconditions: {", [FILE, "weather_notes"]),
    (FILE, 'date: "2025-06-11"', "date: 2025-06-11", [FILE, "date", "quotes"]),
    (FILE, "label: Brick path", "label: 12", [FILE, "surfaces.brick-path.label"]),
    (KIT, "unit: degC, emissivity_setting: 1.0", "unit: hPa, emissivity_setting: 1.0",
     [KIT, "thermal.columns.target.unit", "hPa"]),
    (KIT, "half_angle_deg: 30 ", "half_angle_deg: 300 ", [KIT, "rednir-ground.half_angle_deg"]),
    (SHEET, ",coated-court,", ",coatd-court,", [SHEET, "row", "coatd-court"]),
    (SHEET, ",12:36:04,", ",0.5250,", [SHEET, "row", "fraction of a day", "12:36:00"]),
    (f"{DATA}/shortwave.csv", "ground_mV", "gnd_mV", [f"{DATA}/shortwave.csv", "ground_mV"]),
    (f"{DATA}/rednir_sky.csv", None, "", [f"{DATA}/rednir_sky.csv", "the file is empty"]),
    (f"{DATA}/rednir_ground.csv", "+01:00\t1941", "+02:00\t1941",
     [f"{DATA}/rednir_ground.csv", "line 2", "+0200", "Europe/Lisbon"]),
]


def surveykit(project, *arguments):
    return subprocess.run([sys.executable, "-m", "surveykit.cli", *arguments], cwd=project,
                          capture_output=True, text=True, check=False)


def plant(project, fault):
    name, old, new, _ = fault
    path = project / name
    text = path.read_text(encoding="utf-8")
    if old is not None:
        assert old in text, old
        new = text.replace(old, new, 1)
    path.write_text(new, encoding="utf-8")


def test_ten_faults_are_told_in_one_go_and_soon(project):
    for fault in PLANTED:
        plant(project, fault)
    done = surveykit(project, "check", FILE)
    lines = done.stderr.splitlines()
    assert done.returncode == 2
    assert "Traceback" not in done.stderr
    missing = [words for *_, words in PLANTED
               if not any(all(word in line for word in words) for line in lines)]
    assert missing == [], done.stderr
    # one fault a line, and nothing that only follows from another fault
    known = [line for line in lines
             if any(all(word in line for word in words) for *_, words in PLANTED)]
    assert lines == known


BARE_S, ASKED_S = 0.45, 1.5  # the bare imports on the quiet machine on which 1.5 s are asked


@pytest.mark.skipif(sys.platform == "win32", reason="no processor time of children")
@pytest.mark.parametrize("faults", [PLANTED, []], ids=["ten faults", "clean"])
def test_what_is_found_is_told_soon(project, faults):
    """Processor time, which others on the machine do not lengthen, in turns with bare imports."""
    for fault in faults:
        plant(project, fault)
    took: dict[str, list[float]] = {"check": [], "bare": []}
    for _ in range(3):
        for name, arguments in (("check", ["-m", "surveykit.cli", "check", FILE]),
                                ("bare", ["-c", "import pandas, pydantic, yaml"])):
            before = os.times()
            subprocess.run([sys.executable, *arguments], cwd=project, capture_output=True,
                           check=False)
            after = os.times()
            took[name].append(after.children_user + after.children_system
                              - before.children_user - before.children_system)
    ratio = min(took["check"]) / min(took["bare"])
    print(f"check took {min(took['check']):.2f} s, {ratio:.2f} of the bare imports")  # noqa: T201
    assert ratio <= ASKED_S / BARE_S


@pytest.mark.parametrize("place", range(len(PLANTED)))
def test_each_planted_fault_is_told_alone(project, place):
    plant(project, PLANTED[place])
    with pytest.raises(InputError) as caught:
        check(project / FILE)
    words = PLANTED[place][3]
    found = [fault for fault in caught.value.faults if all(word in fault for word in words)]
    assert found
    assert list(caught.value.faults) == found


@pytest.mark.parametrize(("old", "new", "doubtful"), [
    ('time_zone: Europe/Lisbon', "time_zone: Lisbon", {"site"}),
    ('date: "2025-06-11"', 'date: "11 June"', {"date"}),
    ("surfaces:   ", "surface_list:   ", {"surfaces"}),
    ("shortwave: {files: shortwave.csv,", "shortwave: {file: shortwave.csv,", {"loggers"}),
    ("rain_48h_mm: 0", "rain_48h_mm: dry", set()),
    ("elevation_m: 120", "elevation_m: high", set()),
    ("field_sheet: field_sheet.csv", "field_sheet: ../field_sheet.csv", {"field_sheet"}),
])
def test_the_rest_of_a_campaign_at_fault_is_still_read(project, old, new, doubtful):
    plant(project, (FILE, old, new, []))
    known = load_partly(project / FILE)
    assert known.parameters is not None
    assert known.doubtful == doubtful
    assert len(known.faults) >= 1
    plant(project, PLANTED[8])  # an empty log
    done = surveykit(project, "check", FILE)
    assert "the file is empty" in done.stderr
    assert "Traceback" not in done.stderr
    assert not any("reserved" in line or "is not known; write one of" in line
                   for line in done.stderr.splitlines())


@pytest.mark.parametrize("text", ["", "- a\n", "campaign: [\n", "campaign: x\n",
                                  "loggers: {a: 1}\n", "data_folder: /etc\nloggers: {}\n"])
def test_nothing_can_be_read_where_the_files_are_not_known(project, text):
    (project / FILE).write_text(text)
    assert load_partly(project / FILE).parameters is None
    assert load_partly(project / FILE).faults


def test_what_was_understood_is_shown_for_each_logger(project):
    done = surveykit(project, "check", FILE)
    assert done.returncode == 0, done.stderr
    text = done.stdout
    # the same from the file by Python's csv: rows, ends, the median of the readings
    with (project / DATA / "weather.csv").open(encoding="windows-1252", newline="") as file:
        rows = list(csv.reader(file, delimiter=";"))[4:]  # two lines above the header, one below
    good = [row for row in rows if len(row) == 5]
    ends = [datetime.strptime(" ".join(row[:2]), "%d.%m.%Y %H:%M")  # noqa: DTZ007
            for row in (good[0], good[-1])]
    local = [moment + timedelta(hours=1) for moment in ends]
    assert (f"weather: {len(rows)} records in 1 file, every 60 s, 2025-06-11 {ends[0]:%H:%M:%S} to "
            f"{ends[1]:%H:%M:%S} UTC ({local[0]:%H:%M:%S} to {local[1]:%H:%M:%S} Europe/Lisbon)"
            ) in text
    median = statistics.median(float(row[3].replace(",", ".")) for row in good)
    assert f"humidity  relative humidity, logged in %, typically {median:.4g} %" in text
    assert " records in 2 files, every 0.5 s" in text
    assert "unreadable line" in text


def test_check_brings_no_drawing_no_notebooks_and_no_scipy(project):
    code = (f"import sys; from surveykit.cli import main; main(['check', {FILE!r}]); "
            "print([m for m in ('matplotlib', 'seaborn', 'papermill', 'nbconvert', 'scipy', "
            "'pvlib') if m in sys.modules])")
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True,
                          cwd=project)
    assert done.stdout.splitlines()[-2:] == ["  no fault found", "[]"]


def test_what_became_of_each_clock_is_shown(project):
    lines = surveykit(project, "check", FILE).stdout.splitlines()
    told = {line.split()[2].rstrip(":"): line for line in lines if line.startswith("  clock of ")}
    assert list(told) == ["thermal", "shortwave", "rednir-sky", "rednir-ground", "weather"]
    # true by demo_data/truth.json: 12.4 and -6.1 s at the day's beginning, 38 and -24 ppm
    assert re.fullmatch(r"  clock of thermal: cover events: \+12\.\d\d s, \+\d+ ppm, u 1\.\d s",
                        told["thermal"])
    assert told["shortwave"] == "  clock of shortwave: declared: -4.00 s, u 0.5 s"
    assert "aligned with rednir-sky, by covers: -6." in told["rednir-ground"]
    assert told["weather"] == "  clock of weather: not checked: +0.00 s, u 2 s"


def test_clocks_that_hang_on_each_other_are_one_fault(project):
    plant(project, (FILE, "clock: {cover_events: true}", "clock: {align_with: rednir-ground}", []))
    plant(project, (FILE, "clock: {align_with: rednir-sky}", "clock: {align_with: thermal}", []))
    done = surveykit(project, "check", FILE)
    assert done.returncode == 2
    assert "Traceback" not in done.stderr
    assert all("align_with" in line and "hangs on this one" in line
               for line in done.stderr.splitlines())


def test_a_refused_clock_is_shown_with_its_reason(project):
    plant(project, (FILE, "clock: {cover_events: true}", "clock: {align_with: shortwave}", []))
    sheet = project / SHEET
    rows = sheet.read_text(encoding="utf-8").splitlines(keepends=True)
    sheet.write_text("".join(row for row in rows if not row.startswith("cover,")),
                     encoding="utf-8")
    done = surveykit(project, "check", FILE)
    assert done.returncode == 0
    refused = [line for line in done.stdout.splitlines() if "refused: " in line]
    assert [line.split()[2] for line in refused] == ["thermal:", "rednir-ground:"]
    assert all("the field sheet has no cover row" in line for line in refused)
