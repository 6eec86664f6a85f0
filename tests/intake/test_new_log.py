"""`surveykit new ID --log`: a first instruments file from sample logs, to be confirmed."""

from __future__ import annotations

import re
import shutil
from pathlib import Path

import pytest
import yaml
from invented import CLEAN, write

from surveykit.core import InputError
from surveykit.intake.loggers import read_logger
from surveykit.intake.params import load, load_kit
from surveykit.intake.sniffing import look_at
from surveykit.starting import start

ROOT = Path(__file__).parents[2]
JUNE = ROOT / "demo_data/pellowick-yard-2025-06-11"
DEMO = [JUNE / name for name in ("thermal_1.csv", "thermal_2.csv", "shortwave.csv",
                                 "rednir_sky.csv", "rednir_ground.csv", "weather.csv")]


@pytest.fixture
def folder(tmp_path):
    (tmp_path / "params").mkdir()
    (tmp_path / "notebooks").mkdir()
    return tmp_path


def filled(text: str) -> str:
    """Fill in what only the certificate and the data sheet tell."""
    text = text.replace('"..."', '"A-1"')
    for key, value in (("u_gain", 0.015), ("u_offset", 1.0), ("gain", 10.0),
                       ("time_constant_s", 0.5), ("half_angle_deg", 90), ("year", 2025)):
        text = re.sub(rf"^( +{key}:)  # FILL IN", rf"\1 {value}  #", text, flags=re.MULTILINE)
    return text


def test_every_guess_is_marked_and_the_filled_file_reads_the_logs_as_the_kit_does(folder):
    start("mill-yard", folder, DEMO)
    path = folder / "params/mill-yard-instruments.yml"
    text = path.read_text(encoding="utf-8")
    for line in text.splitlines():
        keyed = re.match(r" +[\w\"]+: *\S", line) and not re.match(r" +\"?\w+\"?: +# from", line)
        assert not keyed or "# CONFIRM" in line or "# FILL IN" in line, line
    with pytest.raises(InputError, match="must state u_gain or u_offset"):
        load_kit(path)  # nothing that only a certificate tells is guessed
    path.write_text(filled(text).replace("%m/%d", "%d/%m"), encoding="utf-8")
    kit, known = load_kit(path), load_kit(ROOT / "params/instruments.yml")
    assert list(kit) == ["thermal", "shortwave", "rednir-sky", "rednir-ground", "weather"]
    for name, entry in kit.items():
        assert {h: c.quantity for h, c in entry.columns.items()} == {
            h: c.quantity for h, c in known[name].columns.items()}, name
        assert {h: c.unit for h, c in entry.columns.items()} == {
            h: c.unit for h, c in known[name].columns.items()}, name
        assert entry.time.column == known[name].time.column
        assert entry.time.format == known[name].time.format
        for key in ("delimiter", "decimal", "skip_lines", "encoding"):
            assert getattr(entry.layout, key) == getattr(known[name].layout, key), (name, key)
    campaign = yaml.safe_load((folder / "params/mill-yard.yml").read_text(encoding="utf-8"))
    assert campaign["instruments"] == "params/mill-yard-instruments.yml"
    assert campaign["loggers"]["thermal"] == {"files": ["thermal_1.csv", "thermal_2.csv"]}


ROWS = "".join(f"2025-07-{d};09:{m:02d}:30;{d + m / 10:.1f}\n".replace(".", ",")
               for d in (13, 24) for m in range(6))
FORMS = {
    "restart": (CLEAN.split("\n")[0] + "\ns,degC,degC\n" + CLEAN.split("\n", 1)[1] * 3
                + "time,target,body\n" + CLEAN.split("\n", 1)[1],
                {"unit_lines": 1}, ("time",), "iso8601"),
    "date and time": ("Station 4\n\nday;hour;air [°C]\n" + ROWS,
                      {"delimiter": ";", "decimal": ",", "skip_lines": 2}, ("day", "hour"),
                      "iso8601"),
    "day first": ("t;a\n" + "".join(f"{d}.07.2025 09:00;1\n" for d in range(13, 20)),
                  {"delimiter": ";"}, ("t",), "%d.%m.%Y %H:%M"),
    "month first": ("t;a\n" + "".join(f"07/{d}/2025 09:00:00;1\n" for d in range(13, 20)),
                    {"delimiter": ";"}, ("t",), "%m/%d/%Y %H:%M:%S"),
    "comma fraction": ("t;a\n" + "".join(f"24.07.2025 09:00:0{s},5;1\n" for s in range(5)),
                       {"delimiter": ";"}, ("t",), "%d.%m.%Y %H:%M:%S,%f"),
    "epoch": ("s,a\n" + "".join(f"{1753354800 + s}.5,1\n" for s in range(5)), {}, ("s",),
              "epoch_s"),
    "day of year": ("year,doy,hhmm,a\n" + "".join(f"2025,205,{930 + m},1\n" for m in range(5)),
                    {}, ("year", "doy", "hhmm"), "day_of_year"),
    "day alone": ("doy,hhmm,a\n" + "".join(f"205,{930 + m},1\n" for m in range(5)),
                  {}, ("doy", "hhmm"), "day_of_year"),
    "codes": ("t,a\n2025-07-24 09:00:00,-6999\n2025-07-24 09:00:01,n/a\n"
              + "".join(f"2025-07-24 09:00:0{s},1{s}\n" for s in range(2, 6)),
              {"missing": ("", "-6999", "-9999", "NAN", "n/a")}, ("t",), "iso8601"),
    "windows": ("t,a [°C]\n" + "".join(f"2025-07-24 09:00:0{s},1\n" for s in range(5)),
                {"encoding": "windows-1252"}, ("t",), "iso8601"),
}


@pytest.mark.parametrize("form", FORMS)
def test_how_a_file_is_written_is_found_and_the_reader_agrees(tmp_path, form):
    text, layout, columns, time_format = FORMS[form]
    path = write(tmp_path, "log.csv", text.encode(layout.get("encoding", "utf-8")))
    guess = look_at(path)
    plain = {"delimiter": ",", "decimal": ".", "skip_lines": 0, "unit_lines": 0,
             "encoding": "utf-8", "missing": ("", "-9999", "NAN")}
    assert {key: getattr(guess.layout, key) for key in plain} == plain | layout
    assert (guess.time.columns, guess.time.format) == (columns, time_format)
    assert guess.columns[0].low > 0  # codes are no readings
    # reading the file by the guess loses no record
    from surveykit.intake.params import Instrument

    year = {"year": 2025} if form == "day alone" else {}
    entry = Instrument.model_validate({
        "layout": guess.layout.model_dump(),
        "time": {"column": list(columns), "format": time_format, "zone": "UTC", **year},
        "columns": {guess.columns[0].header: {"quantity": "air_temperature", "unit": "degC"}}})
    records = read_logger("log", entry, [path], tmp_path)
    assert not any(marked.any() for reason, marked in records.marks.items()
                   if reason.startswith("unreadable"))


@pytest.mark.parametrize(("text", "sentence"), [
    ("", "is empty"), ("\0\1\2" * 50, "is no text"),
    ("a story\nof two lines\n", "no regular number"),
    ("1,2\n3,4\n5,6\n", "no header stands above the records"),
    ("a,b\nx,y\nz,w\n", "no line looks like a record"),
    ("a,b\n1,2\n2,3\n3,4\n", "no column looks like times")])
def test_what_is_no_log_is_refused_and_nothing_is_written(folder, text, sentence):
    path = write(folder, "log.csv", text)
    with pytest.raises(InputError, match=sentence):
        start("mill-yard", folder, [path])
    assert list((folder / "params").iterdir()) == []
    with pytest.raises(InputError, match="cannot be read"):
        start("mill-yard", folder, [folder / "none.csv"])


def test_a_field_sheet_among_the_logs_is_passed_over(folder):
    sheet = JUNE / "field_sheet.csv"
    said = start("mill-yard", folder, sorted([*DEMO, sheet]))
    assert said[0] == "field_sheet.csv: a field sheet, no log; passed over"
    kit = yaml.safe_load((folder / "params/mill-yard-instruments.yml").read_text("utf-8"))
    assert set(kit) == {"thermal", "shortwave", "rednir-sky", "rednir-ground", "weather"}
    assert "field_sheet" not in (folder / "params/mill-yard-instruments.yml").read_text("utf-8")
    with pytest.raises(InputError, match=r"none of the files is a log"):
        start("other-yard", folder, [sheet])


def test_nothing_is_overwritten(folder):
    start("mill-yard", folder)
    before = (folder / "params/mill-yard.yml").read_bytes()
    start("mill-yard", folder, DEMO[:1])  # the campaign is there already and stays
    assert (folder / "params/mill-yard.yml").read_bytes() == before
    kit = (folder / "params/mill-yard-instruments.yml").read_bytes()
    with pytest.raises(InputError, match="mill-yard-instruments.yml: is there already"):
        start("mill-yard", folder, DEMO[2:3])
    assert (folder / "params/mill-yard-instruments.yml").read_bytes() == kit


def test_odd_names_of_columns_and_files_stay_readable_yaml(folder):
    odd = folder / "No 1 (#a).csv"
    shutil.copy(write(folder, "log.csv", 'time,"no: [°C]","12:30",{x}\n'
                      + "2025-07-24T11:00:00,1,2,3\n" * 4), odd)
    start("mill-yard", folder, [odd])
    plain = yaml.safe_load((folder / "params/mill-yard-instruments.yml").read_text("utf-8"))
    assert list(plain) == ["no-1-a"]


@pytest.mark.parametrize("names", [("a/log.csv", "b/log.csv"), ("l-1.csv", "l_1.csv"),
                                   ("x" * 45 + "1.csv", "x" * 45 + "2.csv")])
def test_loggers_whose_files_are_named_alike_are_two_entries(folder, names):
    paths = []
    for name, text in zip(names, (CLEAN, CLEAN.replace("target", "air")), strict=True):
        (folder / name).parent.mkdir(exist_ok=True)
        paths.append(write(folder, name, text))
    start("mill-yard", folder, paths)
    kit = yaml.safe_load((folder / "params/mill-yard-instruments.yml").read_text("utf-8"))
    assert len(kit) == 2


@pytest.mark.parametrize("name", ["2025-06-11", "no", "0120", "y", "1e3", "null"])
def test_an_entry_is_named_so_that_every_yaml_reader_takes_it_for_text(folder, name):
    start("mill-yard", folder, [write(folder, f"{name}.csv", CLEAN.replace("target", "air")
                                      .replace("body", "hum"))])
    assert list(load_kit(folder / "params/mill-yard-instruments.yml")) == [f"logger-{name}"]
    with pytest.raises(InputError) as caught:
        load(folder / "params/mill-yard.yml")
    assert not any("loggers" in fault for fault in caught.value.faults)


def test_headers_that_say_nothing_are_left_to_be_filled_in(folder):
    start("mill-yard", folder, [write(folder, "log.csv", CLEAN.replace("target,body", "a,b"))])
    text = (folder / "params/mill-yard-instruments.yml").read_text("utf-8")
    assert "  columns:  # FILL IN: no header says what its column holds\n" in text
    assert '    # "a": left out, no guess of its quantity; from 40.25 to 40.75' in text
