"""Lists and mappings at fault entry by entry; what is read of a file at fault nevertheless."""

from __future__ import annotations

import os

import pytest
from refusing import loads, refused, refused_once

from surveykit.core import InputError
from surveykit.intake.params import is_kit_file, load, load_kit
from surveykit.intake.params.base import Strict
from surveykit.intake.params.partly import load_partly

CONDITIONS, CONTROL, RESPONSE = "conditions: {", "  control:", "band_um: [8, 14]"
EMISSIVITY = "{value: 0.95, u: 0.01, source: handbook}"
DONE = 'interventions: [{date: "2025-07-01", surface: lawn, text: swept}]\nconditions: {'

# id: (passage of the campaign, refused, mended, pieces of the one sentence)
CASES = {
    "unknown key in a list": (
        CONDITIONS, DONE.replace("swept", "swept, txt: x"), DONE,
        "interventions[0].txt: unknown key; did you mean text? known here: date, surface, text"),
    "missing key in a list": (
        CONDITIONS, DONE.replace(", text: swept", ""), DONE,
        "interventions[0].text: missing; write plain text, up to 120 characters"),
    "long initials": (
        CONDITIONS, "crew: [AB, ABCDEFGHIJKLM]\n" + CONDITIONS, "crew: [AB]\n" + CONDITIONS,
        "crew[1]: got 'ABCDEFGHIJKLM'; write a text of at most 12 characters"),
    "unknown product": (
        CONDITIONS, "derived: [sri, snow]\n" + CONDITIONS, "derived: [sri]\n" + CONDITIONS,
        "derived[1]: got 'snow'; write 'sri', 'net_radiation', "),
    "family of one": (
        CONTROL, "  families: {dry: [lawn]}\n" + CONTROL,
        "  families: {dry: [lawn, worn-asphalt]}\n" + CONTROL,
        "comparison.families.dry: got a list; write {name: [surface, surface, ...]}"),
    "surface twice in a family": (
        CONTROL, "  families: {dry: [lawn, worn-asphalt, lawn]}\n" + CONTROL,
        "  families: {dry: [lawn, worn-asphalt]}\n" + CONTROL,
        "comparison.families.dry: names 'lawn' twice; write each surface once"),
    "second control alone": (
        "  control: worn-asphalt", "  second_control: lawn",
        "  control: worn-asphalt\n  second_control: lawn",
        "comparison.second_control: got 'lawn' without a first to hold it against; write control"),
    "product twice": (
        CONDITIONS, "derived: [sri, savi, sri]\n" + CONDITIONS, "derived: [sri]\n" + CONDITIONS,
        "derived: names 'sri' twice; write each product once"),
    "blank file": (
        "files: weather.csv", 'files: " "', "files: weather.csv",
        "loggers.weather.files: got ' '; write some text"),
    "horizon above the zenith": (
        "  sky_view: 0.85", "  horizon_deg: [1, 2, 3, 100]", "  horizon_deg: [1, 2, 3, 10]",
        "line 11: site.horizon_deg[3]: got 100; write a number, at most 90"),
    "horizon of three": (
        "  sky_view: 0.85", "  horizon_deg: [1, 2, 3]", "  horizon_deg: [1, 2, 3, 4]",
        "site.horizon_deg: got a list; write a list of four or more elevations from 0 to 90"),
    "horizon and sky view": (
        "  sky_view: 0.85", "  sky_view: 0.85\n  horizon_deg: [1, 2, 3, 4]", "  sky_view: 0.85",
        "line 12: site.horizon_deg: got it beside sky_view; write one of the two"),
    "unknown reflection": (
        "label: Lawn", "label: Lawn, reflection: mirror", "label: Lawn, reflection: specular",
        "surfaces.lawn.reflection: got 'mirror'; write diffuse or specular"),
    "vegetation beside a logarithm": (
        EMISSIVITY, "{from: ndvi, form: logarithmic, vegetation: 0.98, u: 0.01}",
        "{from: ndvi, form: logarithmic, u: 0.01}",
        "emissivity.vegetation: does not go with from: ndvi, form: logarithmic;"),
    "form of a stated emissivity": (
        EMISSIVITY, EMISSIVITY.replace("}", ", form: linear}"), EMISSIVITY,
        "emissivity.form: goes with from: ndvi only; leave it out"),
}
CONVERSION = ("band_conversion: {slope: 1.1, intercept: 0.02, u: 0.01, source: leaflet, "
              "centres_nm: {red: 650, nir: 850}, widths_nm: {red: 30, nir: 120}}")
RED = ('  columns:\n    red: {quantity: red_up, unit: count, gain: 1, offset: 0, u_gain: 0}\n'
       '  interval_s: 60\n  time_constant_s: 1\n')
WEATHER = """\
  interval_s: 60
  columns:
    air: {quantity: air_temperature, unit: degC}
    humidity: {quantity: relative_humidity, unit: "%"}
"""
KIT_CASES = {
    "a later header twice": (
        "{column: time, zone: UTC}", "{column: [date, time, time], zone: UTC}",
        "{column: [date, time], zone: UTC}", "weather.time.column: names 'time' twice; write each"),
    "half a band": (RESPONSE, "band_um: [x]", RESPONSE,
                    "thermal.band_um[0]: got 'x'; write a number"),
    "view angle of a housing": (
        "housing_temperature, unit: degC", "housing_temperature, unit: degC, view_angle_deg: 20",
        "housing_temperature, unit: degC", "thermal.columns.body.view_angle_deg: got 20 in a "
        "column of housing_temperature; only a column of brightness_temperature has one"),
    "view angle of shortwave": (
        "t95_s: 3.0", "t95_s: 3.0\n  view_angle_deg: 20", "t95_s: 3.0",
        "shortwave.view_angle_deg: got 20 in an entry of shortwave_down, shortwave_up; only"),
    "view angle at the horizon": (
        "half_angle_deg: 22", "half_angle_deg: 22\n  view_angle_deg: 70",
        "half_angle_deg: 22\n  view_angle_deg: 20",
        "thermal.view_angle_deg: got 70; write a number from 0 to 60, in deg"),
    "reflected temperature of a housing": (
        "housing_temperature, unit: degC", "housing_temperature, unit: degC, "
        "reflected_setting_degC: 20", "housing_temperature, unit: degC",
        "thermal.columns.body.reflected_setting_degC: got 20 in a column of housing_temperature"),
    "class of an infrared head": (
        "half_angle_deg: 22", "half_angle_deg: 22\n  class_terms: A", "half_angle_deg: 22",
        "thermal.class_terms: got it in an entry of brightness_temperature, housing_temperature;"),
    "conversion at a weather logger": (
        WEATHER, WEATHER + f"  {CONVERSION}\n", RED + f"  {CONVERSION}\n",
        "weather.band_conversion: got it in an entry of air_temperature, relative_humidity;"),
    "conversion that falls": (
        WEATHER, RED + "  " + CONVERSION.replace("slope: 1.1", "slope: -1") + "\n",
        RED + f"  {CONVERSION}\n",
        "weather.band_conversion.slope: got -1; write a number above 0"),
    "conversion to no bands": (
        WEATHER, RED + "  " + CONVERSION.replace("nir: 850", "nir: x") + "\n",
        RED + f"  {CONVERSION}\n",
        "weather.band_conversion.centres_nm.nir: got 'x'; write a number above 0, at most 5000"),
    "conversion without source": (
        WEATHER, RED + "  " + CONVERSION.replace("source: leaflet, ", "") + "\n",
        RED + f"  {CONVERSION}\n",
        "weather.band_conversion.source: missing; write where the values come from"),
    "half a point of a response": (
        RESPONSE, "band_response: [[7, 0], [8], [9, 0]]", "band_response: [[7, 0], [8, 1], [9, 0]]",
        "thermal.band_response[1]: got a list; write a list of [um, response] such as"),
    "a directive twice": (
        '"%d/%m/%Y %H:%M:%S"', '"%Y-%Y-%m-%d %H:%M:%S"', '"%Y-%m-%d %H:%M:%S"',
        "shortwave.time.format: got '%Y-%Y-%m-%d %H:%M:%S', which does not hold a whole date"),
    "delimiter of no character": (
        'delimiter: ","', 'delimiter: "\\0"', 'delimiter: " "',
        "thermal.layout.delimiter: got '\\x00'; write one character in quotes"),
    "delimiter of two bytes": (
        'delimiter: ","', 'delimiter: "§"', 'delimiter: "|"',
        "thermal.layout.delimiter: got '§'; write one character in quotes"),
}


@pytest.mark.parametrize("case", CASES)
def test_entry_at_fault_is_refused_with_one_sentence_and_its_mended_twin_loads(project, case):
    old, bad, good, *pieces = CASES[case]
    refused_once(project.write(old, bad), "params/", pieces)
    assert loads(project.write(old, good))


@pytest.mark.parametrize("case", KIT_CASES)
def test_head_at_fault_is_refused_with_one_sentence_and_its_mended_twin_loads(project, case):
    old, bad, good, *pieces = KIT_CASES[case]
    refused_once(project.write(kit_old=old, kit_new=bad), "params/instruments.yml line", pieces)
    assert loads(project.write(kit_old=old, kit_new=good))


def models(base=Strict):
    for model in base.__subclasses__():
        yield model
        yield from models(model)


def test_every_key_says_what_to_write():
    """A key without it would be answered with what is to be written one level up."""
    silent = [(model.__name__, name) for model in models() for name, info
              in model.model_fields.items() if not info.json_schema_extra["write"]]
    assert silent == []
    assert len(list(models())) > 30


def test_kit_with_an_empty_entry_is_told_as_a_kit(project):
    project.kit.write_text(project.kit.read_text() + "spare:\n")
    assert is_kit_file(project.kit)
    with pytest.raises(InputError) as caught:
        load_kit(project.kit)
    assert caught.value.faults == (
        "params/instruments.yml line 30: spare: got nothing; write keys and their values",)
    project.kit.write_text("{}\n")
    with pytest.raises(InputError, match=r"got a mapping; write at least one entry$"):
        load_kit(project.kit)


def test_empty_kit_in_the_file_is_told_once(project):
    [sentence] = refused(project.write("instruments: params/instruments.yml", "instruments: {}"))
    assert "instruments: got a mapping; write the path of the kit" in sentence


def test_earlier_campaign_that_is_a_link_to_itself_is_refused_inside_and_outside(
        project, monkeypatch):
    loop = project.root / "params" / "loop.yml"
    loop.symlink_to(loop)
    for allowed in ("0", "1"):
        monkeypatch.setenv("SURVEYKIT_ALLOW_OUTSIDE", allowed)
        path = project.write("[params/mill-yard-2025-06-12.yml]", "[params/loop.yml]")
        [sentence] = refused(path)
        assert "comparison.earlier[0]: got 'params/loop.yml'" in sentence


@pytest.mark.skipif(os.name == "nt" or os.geteuid() == 0, reason="root reads every folder")
def test_kit_in_a_closed_folder_is_no_traceback(project):
    closed = project.root / "closed"
    closed.mkdir(mode=0)
    [sentence] = refused(project.write("params/instruments.yml", "closed/kit.yml"))
    assert "there is no such file" in sentence


def test_a_list_of_files_at_fault_is_not_read_in_part(project):
    known = load_partly(project.write("[shortwave.csv, shortwave_2.csv]", "[shortwave.csv, 3]"))
    assert len(known.faults) == 1
    assert list(known.parameters.campaign.loggers) == ["thermal", "weather"]
    assert known.doubtful == {"loggers"}


@pytest.mark.parametrize("constant", ["time_constant_s: fast", "time_constant_s:"])
def test_records_are_read_where_a_time_constant_is_at_fault(project, constant):
    known = load_partly(project.write(kit_old="time_constant_s: 0.3", kit_new=constant))
    assert len(known.faults) == 1
    assert set(known.parameters.kit["thermal"].columns) == {"target", "body"}
    assert known.doubtful == set()


def test_a_misspelt_kit_is_told_once_and_its_loggers_are_not(project):
    [sentence] = refused(project.write("instruments:", "instrument:"))
    assert "instrument: unknown key; did you mean instruments?" in sentence


def test_what_is_at_fault_in_one_file_hides_no_fault_of_the_other(project):
    project.write("watch: {offset_s: 0, u_s: 1}", "watch: {offset_s: 0, u_s: x}",
                  kit_old='date: "2025-02-10"', kit_new='date: "2026-02-10"')
    campaign, kit = refused(project.path)
    assert "watch.u_s: got 'x'" in campaign
    assert "thermal.calibration.date: got '2026-02-10', after the campaign" in kit
    assert load(project.write()).notes == ()


def test_a_file_name_that_no_campaign_can_have_is_not_proposed(project):
    path = project.path.rename(project.path.with_name("Mill Yard.yml"))
    [sentence] = refused(path)
    assert sentence.endswith("got 'mill-yard-2025-07-24' in the file Mill Yard.yml; "
                             "name the file mill-yard-2025-07-24.yml")
