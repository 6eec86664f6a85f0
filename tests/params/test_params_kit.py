"""One refusal a kind in the kit: the sentence in part, and its mended twin.

The rules are the project's own; the twin is what the sentence asks for.
"""

from __future__ import annotations

import pytest
from refusing import loads, refused, refused_once

KIT = "params/instruments.yml"

# id: (passage of the kit, refused, mended, pieces of the one sentence)
KIT_CASES = {
    "main channel without u": (
        ", u_offset: 0.2}", "}", ", u_offset: 0}",
        "line 6: thermal.columns.target: a column of brightness_temperature must state u_gain or "
        "u_offset (0 is allowed, silence is not)"),
    "u of a gain twice": (
        "gain: 10.4", "gain: {value: 10.4, u: 0.1}", "gain: 10.5",
        "line 18: shortwave.columns.sky_mV.u_gain: got 0.015, and gain gives u 0.1 as well"),
    "raw unit without gain": (
        "gain: 10.4, offset: 0.0, ", "offset: 0.0, ", "gain: 10, offset: 0.0, ",
        "shortwave.columns.sky_mV.gain: missing; a column in mV needs gain and offset",
        "in W m-2"),
    "unit of another quantity": (
        'unit: "%"', "unit: hPa", 'unit: "1"',
        "weather.columns.humidity.unit: got 'hPa' for relative_humidity; write one of %, 1"),
    "unknown unit": (
        "{quantity: housing_temperature, unit: degC}", "{quantity: housing_temperature, unit: C}",
        "{quantity: housing_temperature, unit: K}",
        "thermal.columns.body.unit: got 'C'; write one of degC, K, W m-2"),
    "unknown quantity": (
        "quantity: air_temperature", "quantity: temperature", "quantity: air_temperature",
        "weather.columns.air.quantity: got 'temperature'; write one of brightness_temperature"),
    "gain of zero": ("gain: 10.4", "gain: 0", "gain: -1",
                     "shortwave.columns.sky_mV.gain: got 0; write a gain other than 0"),
    "emissivity setting elsewhere": (
        "{quantity: housing_temperature, unit: degC}",
        "{quantity: housing_temperature, unit: degC, emissivity_setting: 1}",
        "{quantity: housing_temperature, unit: degC, u_offset: 1}",
        "thermal.columns.body.emissivity_setting: got 1 in a column of housing_temperature"),
    "two time constants": (
        "t95_s: 3.0", "t95_s: 3.0\n  time_constant_s: 1", "time_constant_s: 1",
        "shortwave.t95_s: got 3 beside time_constant_s; write one of the two"),
    "no time constant": (
        "  time_constant_s: 0.3\n", "", "  t95_s: 0.9\n",
        "line 6: thermal.columns.target: time_constant_s missing"),
    "band upside down": ("band_um: [8, 14]", "band_um: [14, 8]", "band_um: [8, 14]",
                         "thermal.band_um: got [14.0, 8.0]; write [low, high] in um"),
    "half angle range": ("half_angle_deg: 22", "half_angle_deg: 125", "half_angle_deg: 62.5",
                         "thermal.half_angle_deg: got 125; write a number above 0, at most 90"),
    "calibration after the campaign": (
        '"2025-02-10"', '"2025-08-01"', '"2025-07-24"',
        "line 8: thermal.calibration.date: got '2025-08-01', after the campaign of 2025-07-24"),
    "two columns of one quantity": (
        "body: {quantity: housing_temperature, unit: degC}",
        "body: {quantity: brightness_temperature, unit: degC, u_offset: 0}",
        "body: {quantity: air_temperature, unit: degC}",
        "thermal.columns.body: holds brightness_temperature as column 'target' does"),
    "time among the columns": (
        "    air: {", "    time: {", "    air: {",
        "weather.columns.time: is a column of times"),
    "one header for date and time": (
        "{column: time, zone: UTC}", "{column: [time, time], zone: UTC}",
        "{column: [date, time], zone: UTC}", "weather.time.column: names 'time' twice"),
    "five columns of time": (
        "{column: time, zone: UTC}", "{column: [a, b, c, d, e], zone: UTC}",
        "{column: [a, b, c, d], zone: UTC}",
        "weather.time.column: got a list; write the header of the column of times"),
    "epoch seconds in two columns": (
        "column: time, zone: UTC}", "column: [s, ms], format: epoch_s, zone: UTC}",
        "column: s, format: epoch_s, zone: UTC}",
        "weather.time.column: got 2 columns; epoch_s is one column"),
    "epoch seconds of a zone": (
        "column: time, zone: UTC}", "column: time, format: epoch_s, zone: Europe/Lisbon}",
        "column: time, format: epoch_s, zone: UTC}",
        "weather.time.zone: got 'Europe/Lisbon'; epoch_s counts in UTC"),
    "day of an unknown year": (
        "column: time, zone: UTC}", "column: [day, hhmm], format: day_of_year, zone: UTC}",
        "column: [day, hhmm], format: day_of_year, year: 2025, zone: UTC}",
        "weather.time.year: missing; no column holds the year"),
    "a year beside its column": (
        "column: time, zone: UTC}",
        "column: [year, day, hhmm], format: day_of_year, year: 2025, zone: UTC}",
        "column: [year, day, hhmm], format: day_of_year, zone: UTC}",
        "weather.time.year: got 2025 beside a column of years"),
    "a year of whole dates": (
        "column: time, zone: UTC}", "column: time, year: 2025, zone: UTC}",
        "column: time, zone: UTC}", "weather.time.year: got 2025; only format day_of_year"),
    "lines of units": ('decimal: "."', 'decimal: ".", unit_lines: -1',
                       'decimal: ".", unit_lines: 2',
                       "thermal.layout.unit_lines: got -1; write a whole number from 0 to 20"),
    "half a date": ('"%d/%m/%Y %H:%M:%S"', '"%d/%m %H:%M:%S"', '"%d/%m/%y %H:%M"',
                    "shortwave.time.format: got '%d/%m %H:%M:%S', which does not hold a whole"),
    "hours of twelve": ('"%d/%m/%Y %H:%M:%S"', '"%d/%m/%Y %I:%M:%S"', '"%d/%m/%Y %I:%M:%S %p"',
                        "shortwave.time.format: got '%d/%m/%Y %I:%M:%S', which does not hold"),
    "zone of a logger": ("zone: Europe/Lisbon", "zone: Lisbon", "zone: Etc/GMT-1",
                         "line 15: shortwave.time.zone: got 'Lisbon'; write UTC or an IANA name"),
    "delimiter is the decimal mark": (
        'decimal: "."', 'decimal: ","', 'decimal: "."',
        "thermal.layout.delimiter: got ',', which is the decimal mark as well"),
    "range that falls": (
        ", u_offset: 0.2}", ", u_offset: 0.2, range: [150, -40]}",
        ", u_offset: 0.2, range: [-40, 150]}",
        "thermal.columns.target.range: got [150.0, -40.0]; write [low, high] as logged"),
    "delimiter a letter": ('delimiter: ","', "delimiter: x", 'delimiter: "\\t"',
                           "thermal.layout.delimiter: got 'x'; write one character in quotes"),
    "missing code a number": (
        '["", "NAN", "-9999"]', '["", -9999]', '["", "-9999"]',
        "thermal.layout.missing[1]: got -9999; write a text, in quotes: \"-9999\""),
    "unknown encoding": ("skip_lines: 0", "encoding: utf8", "encoding: latin-1",
                         "thermal.layout.encoding: got 'utf8'; write utf-8, windows-1252"),
    "class that does not exist": (
        "head_radius_cm: 1.2", "class_terms: D", "class_terms: B",
        "shortwave.class_terms: got 'D'; write A, B or C"),
    "serial a number": ("serial: T-07", "serial: 1234", 'serial: "1234"',
                        'thermal.serial: got 1234; write plain text', '"1234"'),
    "unknown key in the kit": (
        "interval_s: 60", "intervall_s: 60", "interval_s: 60",
        "weather.intervall_s: unknown key; did you mean interval_s?"),
}


@pytest.mark.parametrize("case", KIT_CASES)
def test_kit_is_refused_with_one_sentence_and_its_mended_twin_loads(project, case):
    old, bad, good, *pieces = KIT_CASES[case]
    refused_once(project.write(kit_old=old, kit_new=bad), f"{KIT} line ", pieces)
    assert loads(project.write(kit_old=old, kit_new=good))


def test_two_loggers_under_one_calibration_id_share_no_header(project):
    same = 'calibration: {id: shared, date: "2025-02-10"}'
    project.write(kit_old="    body: {quantity: housing_temperature, unit: degC}\n",
                  kit_new="    body: {quantity: housing_temperature, unit: degC}\n"
                          f"  # one sheet for two\n  {same}\n")
    text = project.kit.read_text().replace(
        '  calibration: {id: thermal-2025-02, date: "2025-02-10", valid_days: 730}\n', "")
    text = text.replace('{id: shortwave-2025-01, date: "2025-01-20", valid_days: 730}',
                        '{id: shared, date: "2025-02-10"}')
    project.kit.write_text(text)
    assert loads(project.path)
    project.kit.write_text(text.replace("sky_mV:", "target:"))
    [sentence] = refused(project.path)
    assert "shortwave.columns.target: shares 'shared' and its header with a column of thermal" \
        in sentence
    assert "write another calibration id" in sentence
