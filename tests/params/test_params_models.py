"""What loading gives: channels in SI, uncertainties however they are written, settings, schema.

Unit conversions are the definitions of the SI brochure (0 degC = 273.15 K, 1 hPa = 100 Pa); the
rest is hand arithmetic, beside each check.
"""

from __future__ import annotations

import json
import math
from pathlib import Path

import jsonschema
import pytest
import yaml

from surveykit.core import InputError
from surveykit.intake.params import (
    Settings,
    campaign_schema,
    find_root,
    instruments_schema,
    load,
    load_kit,
    read_plain,
    refuse_other_sections,
    write_schemas,
)
from surveykit.intake.params.paths import path_fault

PARAMS = Path(__file__).parents[2] / "params"


def channel(project, logger, column):
    return next(c for c in load(project.path).channels(logger) if c.column == column)


def test_example_loads_with_its_kit(project):
    parameters = load(project.path)
    assert parameters.name == "mill-yard-2025-07-24"
    assert [parameters.relative(path) for path in parameters.files] == [
        "params/mill-yard-2025-07-24.yml", "params/instruments.yml"]
    assert set(parameters.kit) == {"thermal", "shortwave", "weather"}
    assert parameters.sheet_path == parameters.root / "demo_data/mill-yard-2025-07-24" / \
        "field_sheet.csv"
    assert [path.name for path in parameters.earlier] == ["mill-yard-2025-06-12.yml"]
    campaign = parameters.campaign
    assert campaign.loggers["thermal"].files == ("thermal*.csv",)
    assert campaign.loggers["shortwave"].files == ("shortwave.csv", "shortwave_2.csv")
    assert campaign.loggers["shortwave"].clock is None
    assert (campaign.site.sky_view.value, campaign.site.sky_view.u) == (0.85, 0.1)
    assert campaign.relevant_change.of("albedo") == 0.02
    assert parameters.notes == ()


def test_gain_and_offset_lead_to_si(project):
    target = channel(project, "thermal", "target")
    assert target.to_si(26.85) == pytest.approx(300.0)
    assert (target.u_gain, target.u_offset) == (0.0, 0.2)
    sky = channel(project, "shortwave", "sky_mV")
    assert sky.to_si([50.0, math.nan]) == pytest.approx([520.0, math.nan], nan_ok=True)  # 10.4 x 50
    assert sky.gain.u == pytest.approx(0.156)  # 0.015 x 10.4
    ground = channel(project, "shortwave", "ground_mV")
    assert ground.u_gain == pytest.approx(0.15 / 10.1)
    humidity = channel(project, "weather", "humidity")
    assert humidity.to_si(45.0) == pytest.approx(0.45)
    assert humidity.u_offset == pytest.approx(0.05)  # the setting, a fraction


def test_offset_in_per_cent_and_its_u_become_fractions(project):
    project.write(kit_old='unit: "%"', kit_new='unit: "%", gain: 1.02, offset: -2, u_offset: 3')
    humidity = channel(project, "weather", "humidity")
    assert humidity.to_si(50.0) == pytest.approx(0.49)  # (-2 + 1.02 x 50) / 100
    assert humidity.u_offset == pytest.approx(0.03)


def test_scopes_name_calibration_and_column_else_serial_else_logger(project):
    assert channel(project, "thermal", "target").gain_scope == "thermal-2025-02:target:gain"
    assert channel(project, "weather", "air").offset_scope == "weather:air:offset"
    project.write(kit_old="weather:\n", kit_new="weather:\n  serial: W-03\n")
    assert channel(project, "weather", "air").offset_scope == "W-03:air:offset"


def test_what_a_column_states_overrides_its_entry(project):
    project.write(kit_old="unit: mV, gain: 10.4", kit_new="unit: mV, half_angle_deg: 45, "
                  "time_constant_s: 4, calibration: {id: own, date: \"2025-01-01\"}, gain: 10.4")
    sky, ground = (channel(project, "shortwave", name) for name in ("sky_mV", "ground_mV"))
    assert (sky.half_angle_deg, ground.half_angle_deg) == (45, 90)
    assert sky.gain_scope == "own:sky_mV:gain"
    assert ground.head_radius_m == pytest.approx(0.012)
    assert sky.time_constant_s == 4
    # a first-order response reaches 95 % after tau ln 20
    assert ground.time_constant_s == pytest.approx(3.0 / math.log(20))


def test_default_u_follows_the_settings_of_the_campaign(project):
    project.write("settings: {}", "settings: {temperature: {sky_view_u: 0.03, "
                  "bore_emissivity_u: 0.02, air_temperature_u_k: 1.5, walls_emissivity: 0.9}}")
    parameters = load(project.path)
    assert parameters.campaign.site.sky_view.u == 0.03
    assert parameters.campaign.site.walls.emissivity == 0.9
    assert channel(project, "thermal", "target").bore_emissivity.u == 0.02
    assert channel(project, "weather", "air").u_offset == 1.5


@pytest.mark.parametrize("clock", ["{offset_s: 12, u_s: 0.5}", "{offset_s: {value: 12, u: 0.5}}"])
def test_both_spellings_of_an_offset_are_one(project, clock):
    project.write("{offset_s: 12.0, u_s: 0.5}", clock)
    offset = load(project.path).campaign.loggers["thermal"].clock.offset
    assert (offset.value, offset.u) == (12.0, 0.5)


def test_start_of_a_drift_is_utc_nanoseconds(project):
    project.write("u_s: 0.5", 'u_s: 0.5, drift_ppm: 20, drift_from: "2025-07-24T09:00:00.5+01:00"')
    clock = load(project.path).campaign.loggers["thermal"].clock
    assert clock.drift_from_ns == 1753344000500000000  # 2025-07-24T08:00:00.5Z, from `date -u`


def test_watch_says_whether_it_was_checked(project):
    assert load(project.path).campaign.watch.checked
    project.write("watch: {offset_s: 0, u_s: 1}\n", "")
    watch = load(project.path).campaign.watch
    assert not watch.checked
    assert (watch.offset.value, watch.offset.u) == (0.0, 2.0)
    project.write("watch: {offset_s: 0, u_s: 1}\n", "watch: {offset_s: 0}\n")
    assert not load(project.path).campaign.watch.checked


def test_calibration_that_has_run_out_is_noted(project):
    # 2025-02-10 + 164 days = 2025-07-24: valid on its last day
    project.write(kit_old="valid_days: 730}\n  band_um", kit_new="valid_days: 164}\n  band_um")
    assert load(project.path).notes == ()
    project.write(kit_old="valid_days: 730}\n  band_um", kit_new="valid_days: 163}\n  band_um")
    assert load(project.path).notes == (
        "thermal: calibration thermal-2025-02 of 2025-02-10 was valid for 163 days and had run "
        "out on 2025-07-24",)


def test_kit_may_stand_in_the_campaign_file(project):
    inline = "instruments:\n" + "".join(
        f"  {line}\n" for line in project.kit.read_text().splitlines())
    path = project.write("instruments: params/instruments.yml\n", inline)
    parameters = load(path)
    assert parameters.kit_path is None
    assert parameters.files == (path,)
    assert set(parameters.kit) == {"thermal", "shortwave", "weather"}
    path.write_text(path.read_text().replace("half_angle_deg: 22", "half_angle_deg: 220"))
    with pytest.raises(InputError, match=r"line 23: instruments\.thermal\.half_angle_deg: got 220"):
        load(path)


def test_zone_utc_is_exempt_from_the_longitude_check_and_the_date_line_is_no_trap(project):
    project.write("time_zone: Europe/Lisbon", "time_zone: UTC")
    path = project.path
    path.write_text(path.read_text().replace("longitude: -7.75", "longitude: 170"))
    assert load(path).campaign.site.longitude == 170
    # Samoa keeps UTC+13 at 172 W, 11.5 h of sun behind Greenwich: half an hour apart, not 24.5
    path.write_text(path.read_text().replace("longitude: 170", "longitude: -172").replace(
        "time_zone: UTC", "time_zone: Pacific/Apia"))
    assert load(path).campaign.site.longitude == -172


def test_the_range_of_a_column_is_its_readings_in_si(project):
    """-40 and 150 degC; 0 and 120 mV at 10.4 W m-2 a mV and at a head wired the other way."""
    assert channel(project, "thermal", "target").range is None
    project.write(kit_old=", u_offset: 0.2}", kit_new=", u_offset: 0.2, range: [-40, 150]}")
    assert channel(project, "thermal", "target").range == pytest.approx((233.15, 423.15))
    for gain, ends in ((10.4, (0.0, 1248.0)), (-10.4, (-1248.0, 0.0))):
        project.write(kit_old="gain: 10.4", kit_new=f"range: [0, 120], gain: {gain}")
        assert channel(project, "shortwave", "sky_mV").range == pytest.approx(ends)


def test_models_cannot_be_changed(project):
    parameters = load(project.path)
    with pytest.raises(ValueError, match="frozen"):
        parameters.campaign.site.latitude = 0.0


def test_a_mapping_handed_over_is_held_against_the_file(project):
    plain = read_plain(project.path, project.root)
    handed = {**plain, "format": None} | {"conditions": plain["conditions"]}
    refuse_other_sections(plain, plain, project.path)
    refuse_other_sections(plain | {"params_x": None}, plain, project.path)
    with pytest.raises(InputError) as caught:
        refuse_other_sections(handed | {"date": "2025-07-25"}, plain, project.path)
    assert [fault.split(": ")[1] for fault in caught.value.faults] == ["date", "format"]


def test_kit_alone(project):
    assert load_kit(project.kit)["thermal"].half_angle_deg == 22
    project.write(kit_old="half_angle_deg: 22", kit_new="half_angle_deg: x")
    with pytest.raises(InputError, match=r"params/instruments\.yml line 10: thermal\.half"):
        load_kit(project.kit)


def test_root_is_found_upwards_from_the_file_else_from_here(project, tmp_path, monkeypatch):
    assert find_root(project.path) == project.root.resolve()
    lone = tmp_path / "lone.yml"
    lone.write_text("a: 1\n")
    monkeypatch.chdir(project.root / "demo_data")
    assert find_root(lone) == project.root.resolve()


def test_a_path_stays_inside_the_project_or_is_named(project):
    assert path_fault(project.root, "demo_data/x.csv") is None
    for text in ("/etc", "../x", "a/../../x", "C:/x", "~/x", "", " ", "a\nb"):
        assert path_fault(project.root, text).startswith("got ")


def test_every_setting_is_listed_with_its_unit_origin_and_source():
    rows = Settings().listing()
    assert len(rows) > 80
    assert {row["section"] for row in rows} == set(Settings.model_fields)
    assert all(row["unit"] and row["source"] for row in rows)
    assert {row["origin"] for row in rows} == {"standard", "engineering default", "from memory"}
    # what is called a standard or remembered names the publication
    assert all(row["source"] != "engineering default" for row in rows
               if row["origin"] != "engineering default")
    changed = Settings.model_validate({"albedo": {"zenith_max_deg": 65}}).listing()
    differing = [after for before, after in zip(rows, changed, strict=True) if before != after]
    assert differing == [{
        "section": "albedo", "name": "zenith_max_deg", "value": 65.0, "unit": "deg",
        "origin": "yours", "source": "parameter file"}]
    json.dumps(rows, allow_nan=False)


# --- the published schema ------------------------------------------------------------------------

SCHEMAS = {"campaign": campaign_schema, "instruments": instruments_schema}


@pytest.mark.parametrize("name", SCHEMAS)
def test_published_schema_is_up_to_date_and_valid(name, tmp_path):
    published = PARAMS / f"{name}.schema.json"
    write_schemas(tmp_path)
    assert published.read_bytes() == (tmp_path / published.name).read_bytes(), (
        "run: python -c \"from pathlib import Path; from surveykit.intake.params import "
        "write_schemas; write_schemas(Path('params'))\"")
    jsonschema.Draft202012Validator.check_schema(SCHEMAS[name]())


@pytest.mark.parametrize("name", SCHEMAS)
def test_every_key_of_the_schema_is_described(name):
    schema = SCHEMAS[name]()
    models = [schema, *schema["$defs"].values()]
    keys = [(model.get("title"), key) for model in models
            for key, item in model.get("properties", {}).items() if not item.get("description")]
    assert keys == []
    assert sum(len(model.get("properties", {})) for model in models) > 40


def test_schema_accepts_what_loads_and_refuses_what_editors_should_mark(project):
    campaign, kit = (jsonschema.Draft202012Validator(SCHEMAS[name]()) for name in SCHEMAS)
    data = yaml.safe_load(project.path.read_text())
    campaign.validate(data)
    kit.validate(yaml.safe_load(project.kit.read_text()))
    campaign.validate(data | {"instruments": yaml.safe_load(project.kit.read_text())})
    for bad in ({"titel": "x"}, {"format": 2}, {"campaign": "Mill"}, {"date": 20250724},
                {"site": data["site"] | {"latitude": "41"}}, {"surfaces": {"a b": {"label": "x"}}},
                {"site": data["site"] | {"sky_view": 1.2}}, {"loggers": {}}, {"crew": "ab"},
                {"conditions": {"sky": "hazy"}}, {"settings": {"albedo": {"zenit": 3}}}):
        assert list(campaign.iter_errors(data | bad)), bad
    thermal = yaml.safe_load(project.kit.read_text())["thermal"]
    for bad in ({"band": [8, 14]}, {"half_angle_deg": 125}, {"columns": {}}, {"band_um": [8]}):
        assert list(kit.iter_errors({"thermal": thermal | bad})), bad
