"""One refusal a kind: the sentence in part (file, line, key, value, repair), and a clean twin.

The rules are the project's own (its design of the parameter file); no outside source decides them.
The twin is what the sentence asks for, so that following the sentence mends the file.
"""

from __future__ import annotations

import pytest
from refusing import loads, refused, refused_once

YML = "params/mill-yard-2025-07-24.yml"
SITE_ZONE = "  longitude: -7.75\n  elevation_m: 120\n  time_zone: Europe/Lisbon"

# id: (passage of the campaign, refused, mended, pieces of the one sentence)
CAMPAIGN_CASES = {
    "not a number": (
        "offset_s: 12.0", "offset_s: abc", "offset_s: 12",
        "line 18: loggers.thermal.clock.offset_s: got 'abc'; write a number of seconds"),
    "number in quotes": (
        "latitude: 41.30", 'latitude: "41.30"', "latitude: 41.30",
        "line 7: site.latitude: got '41.30'; write degrees north, a number from -90 to 90",
        "without quotes"),
    "true for a number": (
        "elevation_m: 120", "elevation_m: true", "elevation_m: 1",
        "line 9: site.elevation_m: got true; write a number from -450 to 9000"),
    "number for a text": (
        "label: Lawn", "label: 12", 'label: "12"',
        "surfaces.lawn.label: got 12; write plain text", 'in quotes: "12"'),
    "latitude range": (
        "latitude: 41.30", "latitude: 91", "latitude: 90", "site.latitude: got 91; write degrees"),
    "longitude range": (
        "longitude: -7.75", "longitude: 352.25", "longitude: -7.75",
        "site.longitude: got 352.25; write degrees east, a number from -180 to 180"),
    "longitude's sign": (
        SITE_ZONE, SITE_ZONE.replace("-7.75\n", "75.7\n"), SITE_ZONE.replace("-7.75\n", "7.75\n"),
        "line 8: site.longitude: got 75.7, 5.0 h of sun away from time_zone Europe/Lisbon (+0 h)",
        "west negative"),
    "zone unknown": (
        "Europe/Lisbon", "Europe/Lisbonne", "Europe/Lisbon",
        "line 10: site.time_zone: got 'Europe/Lisbonne'; write UTC or an IANA name"),
    "zone as a path": (
        "Europe/Lisbon", "../Lisbon", "UTC", "site.time_zone: got '../Lisbon'; write UTC"),
    "sky view range": (
        "sky_view: 0.85", "sky_view: 85", "sky_view: 0.85",
        "line 11: site.sky_view: got 85; write a number from 0 to 1"),
    "half an amount": (
        "sky_view: 0.85", "sky_view: {value: 0.85}", "sky_view: {value: 0.85, u: 0.1}",
        "line 11: site.sky_view.u: missing; write the standard uncertainty"),
    "negative u": (
        "sky_view: 0.85", "sky_view: {value: 0.85, u: -0.1}", "sky_view: {value: 0.85, u: 0}",
        "site.sky_view.u: got -0.1; write the standard uncertainty, a number, 0 or more"),
    "not a number at all": (
        "sky_view: 0.85", "sky_view: .nan", "sky_view: 0", "site.sky_view: got nan; write"),
    "date in another order": (
        '"2025-07-24"', '"24/07/2025"', '"2025-07-24"',
        "line 4: date: got '24/07/2025'; write a date as \"YYYY-MM-DD\", in quotes"),
    "no such day": (
        '"2025-07-24"', '"2025-02-30"', '"2025-07-24"', "date: got '2025-02-30'; write a date"),
    "unknown key": (
        "data_folder:", "data_foldr:", "data_folder:",
        "line 14: data_foldr: unknown key; did you mean data_folder? known here: format, campaign"),
    "unknown key below": (
        "u_s: 0.5", "u_sec: 0.5", "u_s: 0.5",
        "line 18: loggers.thermal.clock.u_sec: unknown key; did you mean u_s?"),
    "unknown setting": (
        "settings: {}", "settings: {albedo: {zenith_max: 60}}",
        "settings: {albedo: {zenith_max_deg: 60}}",
        "settings.albedo.zenith_max: unknown key; did you mean zenith_max_deg?"),
    "setting out of limits": (
        "settings: {}", "settings: {statistics: {coverage: 95}}",
        "settings: {statistics: {coverage: 0.95}}",
        "settings.statistics.coverage: got 95; write a number above 0.5, below 1"),
    "limits that do not rise": (
        "settings: {}", "settings: {albedo: {zenith_max_deg: 50}}",
        "settings: {albedo: {zenith_max_deg: 75}}",
        "settings.albedo.zenith_max_deg: got 50, below zenith_qualified_deg (60)"),
    "range upside down": (
        "settings: {}", "settings: {quality: {ranges: {wind_speed: [60, 0]}}}",
        "settings: {quality: {ranges: {wind_speed: [0, 60]}}}",
        "settings.quality.ranges.wind_speed: got [60.0, 0.0]; write [low, high]"),
    "half a range": (
        "settings: {}", "settings: {quality: {ranges: {wind_speed: [60]}}}",
        "settings: {quality: {ranges: {wind_speed: [0, 60]}}}",
        "settings.quality.ranges.wind_speed: got a list; write [low, high]"),
    "section not a mapping": (
        "settings: {}", "settings: {albedo: 3}", "settings: {albedo: {}}",
        "settings.albedo: got 3; write keys of this section"),
    "reserved in comparison": (
        "  control:", "  second_control: lawm\n  control:", "  control:",
        "comparison.second_control: got 'lawm', no surface of this file; did you mean lawn?"),
    "reserved setting": (
        "settings: {}", "settings: {statistics: {between_passes: mine}}", "settings: {}",
        "settings.statistics.between_passes: got 'mine'; write own or common"),
    "clock by a logger that is not there": (
        "clock: {offset_s: 12.0, u_s: 0.5}", "clock: {align_with: shortwaves}",
        "clock: {offset_s: 12.0, u_s: 0.5}",
        "loggers.thermal.clock.align_with: got 'shortwaves', no logger of this file"),
    "clock by itself": (
        "clock: {offset_s: 12.0, u_s: 0.5}", "clock: {align_with: thermal}",
        "clock: {cover_events: true}",
        "loggers.thermal.clock.align_with: got 'thermal', whose clock hangs on this one"),
    "clock in two ways": (
        "clock: {offset_s: 12.0, u_s: 0.5}", "clock: {align_with: shortwave, cover_events: true}",
        "clock: {align_with: shortwave}",
        "loggers.thermal.clock.align_with: got it beside cover_events"),
    "drift of a clock to be found": (
        "clock: {offset_s: 12.0, u_s: 0.5}", "clock: {cover_events: true, drift_ppm: 20}",
        "clock: {cover_events: true, offset_s: 12}",
        "loggers.thermal.clock.drift_ppm: the clock is found from the records"),
    "search of a stated clock": (
        "clock: {offset_s: 12.0, u_s: 0.5}", "clock: {offset_s: 12.0, u_s: 0.5, search_s: 60}",
        "clock: {align_with: shortwave, search_s: 60}",
        "loggers.thermal.clock.search_s: belongs to align_with or cover_events"),
    "emissivity from elsewhere": (
        "{value: 0.95, u: 0.01, source: handbook}", "{from: reference_pairs, u: 0.01}",
        "{from: reference_pairs}",
        "surfaces.worn-asphalt.emissivity.u: does not go with from: reference_pairs; leave it"),
    "emissivity from ndvi": (
        "{value: 0.95, u: 0.01, source: handbook}",
        "{from: ndvi, vegetation: 0.985, u: 0.01}",
        "{from: ndvi, vegetation: 0.985, soil: 0.96, u: 0.01}",
        "surfaces.worn-asphalt.emissivity.soil: missing; write a number above 0, at most 1"),
    "emissivity without source": (
        ", source: handbook", "", ", source: handbook",
        "surfaces.worn-asphalt.emissivity.source: missing; write where the value comes from"),
    "emissivity of bare metal": (
        "value: 0.95", "value: 0.3", "value: 0.6",
        "surfaces.worn-asphalt.emissivity.value: got 0.3; below 0.6",
        "settings.temperature.min_emissivity"),
    "around without u": (
        "{albedo: 0.20, u: 0.05}", "{albedo: 0.20}", "{albedo: {value: 0.20, u: 0.05}}",
        "surfaces.worn-asphalt.around.u: missing; write the standard uncertainty of albedo"),
    "u given twice": (
        "offset_s: 12.0, u_s: 0.5", "offset_s: {value: 12, u: 0.5}, u_s: 0.5",
        "offset_s: {value: 12, u: 0.5}",
        "loggers.thermal.clock.u_s: got 0.5, and offset_s gives u 0.5 as well; write the "
        "uncertainty once"),
    "u of the watch twice": (
        "{offset_s: 0, u_s: 1}", "{offset_s: {value: 0, u: 1}, u_s: 1}",
        "{offset_s: {value: 0, u: 1}}", "line 16: watch.u_s: got 1, and offset_s gives u 1"),
    "clock without u": (
        ", u_s: 0.5", "", ", u_s: 0.5",
        "loggers.thermal.clock.u_s: missing; write the standard uncertainty of offset_s"),
    "drift without beginning": (
        "u_s: 0.5", "u_s: 0.5, drift_ppm: 20",
        'u_s: 0.5, drift_ppm: 20, drift_from: "2025-07-24T08:00:00Z"',
        "loggers.thermal.clock.drift_from: missing; drift_ppm needs the time"),
    "drift from a bare time": (
        "u_s: 0.5", 'u_s: 0.5, drift_from: "2025-07-24T08:00:00"',
        'u_s: 0.5, drift_from: "2025-07-24T08:00:00+01:00"',
        "loggers.thermal.clock.drift_from: got '2025-07-24T08:00:00'; write a time with its"),
    "name with a blank": (
        "  lawn: {", "  front lawn: {", "  front-lawn: {",
        "surfaces.'front lawn': got the name 'front lawn'; write letters, digits, - and _"),
    "control characters": (
        "label: Lawn", 'label: "La\\u0007wn"', "label: Lawn",
        "surfaces.lawn.label: got 'La\\x07wn'; write plain text on one line"),
    "direction-changing characters": (
        "label: Lawn", 'label: "La\\u202ewn"', "label: Lawn",
        "surfaces.lawn.label: got 'La\\u202ewn'; write plain text without direction"),
    "blank label": ("label: Lawn", 'label: " "', "label: Lawn",
                    "surfaces.lawn.label: got ' '; write some text"),
    "long label": ("label: Lawn", f"label: {'x' * 121}", f"label: {'x' * 120}",
                   "surfaces.lawn.label: got 'xxx", "write plain text, up to 120 characters"),
    "unknown sky": ("sky: clear", "sky: hazy", "sky: broken",
                    "conditions.sky: got 'hazy'; write clear, broken or overcast"),
    "campaign of another name": (
        "campaign: mill-yard-2025-07-24", "campaign: mill-yard", "campaign: mill-yard-2025-07-24",
        "line 2: campaign: got 'mill-yard' in the file mill-yard-2025-07-24.yml; write mill-yard-"),
    "campaign in capitals": (
        "campaign: mill-yard-2025-07-24", "campaign: Mill", "campaign: mill-yard-2025-07-24",
        "line 2: campaign: got 'Mill'; write lower-case letters, digits and -"),
    "later format": ("format: 1", "format: 2", "format: 1", "line 1: format: got 2; write 1"),
    "control no surface": (
        "control: worn-asphalt", "control: worn-asfalt", "control: lawn",
        "comparison.control: got 'worn-asfalt', no surface of this file; did you mean "
        "worn-asphalt? write one of worn-asphalt, lawn"),
    "logger not in the kit": (
        "  weather: {", "  wether: {", "  weather: {",
        "line 20: loggers.wether: no such entry in the kit; did you mean weather? write one of "
        "thermal, shortwave, weather"),
    "no logger": (
        """loggers:
  thermal: {files: "thermal*.csv", clock: {offset_s: 12.0, u_s: 0.5}}
  shortwave: {files: [shortwave.csv, shortwave_2.csv]}
  weather: {files: weather.csv}
""", "loggers: {}\n", "loggers: {weather: {files: weather.csv}}\n",
        "line 17: loggers: got a mapping; write at least one logger"),
    "absolute path": (
        "data_folder: demo_data/mill-yard-2025-07-24", "data_folder: /tmp/survey",
        "data_folder: demo_data",
        "line 14: data_folder: got '/tmp/survey'; write a path relative to the project folder"),
    "path upwards": (
        "field_sheet: field_sheet.csv", "field_sheet: ../../../sheet.csv",
        "field_sheet: sheet.csv", "field_sheet: got '../../../sheet.csv'; write a path inside"),
    "files upwards": (
        "[shortwave.csv, shortwave_2.csv]", "[shortwave.csv, ../x.csv]",
        "[shortwave.csv, x.csv]",
        "line 19: loggers.shortwave.files[1]: got '../x.csv'; write a path inside the project"),
    "backslashes": (
        "field_sheet: field_sheet.csv", "field_sheet: a\\sheet.csv", "field_sheet: a/sheet.csv",
        "field_sheet: got 'a\\\\sheet.csv'; write the path with forward slashes"),
    "kit not there": (
        "params/instruments.yml", "params/instrument.yml", "params/instruments.yml",
        "line 13: instruments: got 'params/instrument.yml', but there is no such file"),
    "campaign as its kit": (
        "params/instruments.yml", "params/mill-yard-2025-06-12.yml", "params/instruments.yml",
        "params/mill-yard-2025-06-12.yml: is a campaign's parameter file, not a kit"),
    "earlier is itself": (
        "[params/mill-yard-2025-06-12.yml]", f"[{YML}]", "[params/mill-yard-2025-06-12.yml]",
        f"comparison.earlier[0]: got '{YML}', this file itself"),
    "earlier twice": (
        "[params/mill-yard-2025-06-12.yml]",
        "[params/mill-yard-2025-06-12.yml, params/mill-yard-2025-06-12.yml]", "[]",
        "comparison.earlier[1]: got 'params/mill-yard-2025-06-12.yml' a second time"),
    "earlier not there": (
        "[params/mill-yard-2025-06-12.yml]", "[params/no.yml]", "[]",
        "comparison.earlier[0]: got 'params/no.yml', but there is no such file"),
    "section missing": (
        "field_sheet: field_sheet.csv\n", "", "field_sheet: sheet.csv\n",
        "field_sheet: missing; write a file name such as field_sheet.csv"),
    "section left empty": (
        "field_sheet: field_sheet.csv", "field_sheet:", "field_sheet: sheet.csv",
        "field_sheet: missing; write a file name"),
}


@pytest.mark.parametrize("case", CAMPAIGN_CASES)
def test_campaign_is_refused_with_one_sentence_and_its_mended_twin_loads(project, case):
    old, bad, good, *pieces = CAMPAIGN_CASES[case]
    refused_once(project.write(old, bad), "params/", pieces)
    assert loads(project.write(old, good))


def test_misspelt_and_missing_is_told_once_and_a_missing_one_alone_too(project):
    assert len(refused(project.write("data_folder:", "data_foldr:"))) == 1
    assert len(refused(project.write("data_folder:", "somewhere:"))) == 2


def test_link_that_leads_out_is_refused_and_one_that_stays_loads(project, tmp_path):
    (tmp_path / "outside").mkdir()
    (project.root / "demo_data" / "elsewhere").mkdir()
    link = project.root / "demo_data" / "mill-yard-2025-07-24"
    link.symlink_to(tmp_path / "outside")
    [sentence] = (fault for fault in refused(project.path) if "data_folder" in fault)
    assert "got 'demo_data/mill-yard-2025-07-24', a link that leads out of the project" in sentence
    link.unlink()
    link.symlink_to(project.root / "demo_data" / "elsewhere")
    assert loads(project.path)


def test_all_faults_of_both_files_are_told_at_once_in_the_order_of_lines(project):
    path = project.write(kit_old="half_angle_deg: 22", kit_new="half_angle_deg: 220")
    text = path.read_text()
    for old, new in (("latitude: 41.30", "latitude: abc"),
                     ("sky: clear", "sky: hazy"), ("value: 0.95", "value: 0.4"),
                     ('date: "2025-07-24"', "date: 2025-07-24"),
                     ("control: worn-asphalt", "control: grass"),
                     ("label: Lawn", "lable: Lawn"), ("  weather:", "  wether:")):
        text = text.replace(old, new)
    path.write_text(text)
    faults = refused(path)
    keys = ["date:", "site.latitude:", "loggers.wether:", "surfaces.worn-asphalt.emissivity.value:",
            "surfaces.lawn.lable:", "conditions.sky:", "comparison.control:",
            "thermal.half_angle_deg:"]
    assert [next(key for key in keys if f": {key}" in fault) for fault in faults] == keys


def test_braces_in_a_value_are_no_template(project):
    [sentence] = refused(project.write("control: worn-asphalt", 'control: "{value}"'))
    assert "comparison.control: got '{value}'; write" in sentence
