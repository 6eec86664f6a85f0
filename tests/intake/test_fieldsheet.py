"""The field sheet: every rule, each refusal with its sentence and a clean twin."""

from __future__ import annotations

import tempfile
from datetime import UTC, datetime
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from invented import ALBEDO, COLUMNS, PASS, WEATHER, parameters, text_of, write
from numpy.testing import assert_allclose

from surveykit.core import InputError
from surveykit.intake.fieldsheet import Sheet, read_sheet
from surveykit.intake.sheet_times import read_time


def read(tmp_path, *rows: dict[str, str], **options) -> Sheet:
    changed = options.pop("study", {})
    study = parameters(tmp_path, **changed)
    return read_sheet(write(tmp_path, "sheet.csv", text_of(*rows, **options)), study)


def faults(tmp_path, *rows: dict[str, str], **options) -> str:
    with pytest.raises(InputError) as caught:
        read(tmp_path, *rows, **options)
    return "\n".join(caught.value.faults)


def utc(hour: int, minute: int = 0, second: int = 0, day: int = 24) -> int:
    return int(datetime(2025, 7, day, hour, minute, second, tzinfo=UTC).timestamp()) * 10**9


# ---- what is read

def test_a_row_is_read_to_utc_and_si(tmp_path):
    sheet = read(tmp_path, ALBEDO)
    (entry,) = sheet.entries
    assert (entry.row, entry.entry, entry.surface, entry.patch) == (2, "pass", "asphalt", "A1")
    assert (entry.start_ns, entry.stop_ns) == (utc(11), utc(11, 5))  # Lisbon is UTC+1 in July
    assert (entry.height_m, entry.width_m, entry.length_m, entry.lanes) == (0.12, 4, 5, 4)
    assert entry.edge_u_s == 5
    assert sheet.path == "sheet.csv"
    assert sheet.notices == ("sheet.csv: the sheet does not say its date",)


def test_the_watchs_offset_is_added(tmp_path):
    # at 12:00:30 a watch that is 30 s slow shows 12:00:00
    sheet = read(tmp_path, PASS, study={"watch": {"offset_s": 30, "u_s": 1}})
    assert sheet.entries[0].start_ns == utc(11, 0, 30)


@pytest.mark.parametrize(("written", "edge_u_s"), [
    ("12:00:00", 5), ("12:00", 60), ("12:00:00 PM", 5), ("12:00 pm", 60),
    ("12:00:00\u00a0PM", 5), ("12:00:00\u202fPM", 5),  # as spreadsheets space them
    ("2025-07-24T12:00:00", 5), ("2025-07-24 12:00", 60), ("2025-07-24T11:00:00Z", 5),
    ("2025-07-24T13:00:00+02:00", 5), ("12:00:00.0", 5)])
def test_ways_to_write_noon(tmp_path, written, edge_u_s):
    (entry,) = read(tmp_path, {**PASS, "start": written}).entries
    assert (entry.start_ns, entry.edge_u_s) == (utc(11), edge_u_s)


@given(st.integers(0, 23), st.integers(0, 59), st.integers(0, 59))
def test_twelve_hour_times_agree_with_strptime(hour, minute, second):
    moment = datetime(2025, 7, 24, hour, minute, second, tzinfo=UTC)
    text = moment.strftime("%I:%M:%S %p")
    reference = datetime.strptime(f"2025-07-24 {text} +0000", "%Y-%m-%d %I:%M:%S %p %z")
    assert read_time(text, moment.date(), "UTC").wall.replace(tzinfo=UTC) == reference


def test_over_midnight_with_full_times(tmp_path):
    row = {**PASS, "start": "2025-07-24T23:58:00", "stop": "2025-07-25T00:03:00"}
    (entry,) = read(tmp_path, row).entries
    assert (entry.start_ns, entry.stop_ns) == (utc(22, 58), utc(23, 3))
    assert "stop 00:03:00 is not after start 23:58:00; a pass over midnight needs full times" in \
        faults(tmp_path, {**PASS, "start": "23:58:00", "stop": "00:03:00"})


def test_spreadsheet_dialects_change_nothing(tmp_path):
    study = parameters(tmp_path)
    row = {**ALBEDO, "height_cm": "12.5", "note": "Gr\u00fcn"}
    comma = {**row, "height_cm": "12,5"}
    entries = [read_sheet(write(tmp_path, "sheet.csv", data), study).entries for data in (
        text_of(row), text_of(comma, delimiter=";"), text_of(comma, delimiter="\t"),
        text_of(row).replace("\n", "\r\n"), b"\xef\xbb\xbf" + text_of(row).encode(),
        text_of(row).encode("windows-1252"), text_of(row).replace("entry", "Entry ", 1),
        text_of({}, row).replace("\n,", "\n ,"))]
    assert entries[0][0].height_m == 0.125
    for other in entries[1:-1]:
        assert repr(other) == repr(entries[0])
    assert entries[-1][0].row == 3  # blank rows count


def test_entries_stand_in_order_of_time_with_their_rows(tmp_path):
    later = {**PASS, "start": "13:00:00", "stop": "13:05:00"}
    assert [entry.row for entry in read(tmp_path, later, PASS).entries] == [3, 2]


def test_dark_and_cover_rows(tmp_path):
    dark = {"entry": "dark", "start": "11:00:00", "stop": "11:01:00"}
    sheet = read(tmp_path, PASS, dark, {**dark, "instrument": "shortwave"},
                 {**dark, "quantity": "ndvi"}, {**dark, "entry": "cover"})
    assert [entry.entry for entry in sheet.entries] == ["dark", "dark", "dark", "cover", "pass"]


@pytest.mark.parametrize(("quantity", "written", "written_u", "value", "u"), [
    ("air_temperature", "31.5", "0.3", 304.65, 0.3), ("air_temperature", "31,5", "", 304.65, 0.5),
    ("relative_humidity", "35", "4", 0.35, 0.04), ("relative_humidity", "35", "", 0.35, 0.05),
    ("wind_speed", "1.2", "", 1.2, 0.5), ("cloud_fraction", "0.25", "0.1", 0.25, 0.1)])
def test_hand_read_weather_in_si(tmp_path, quantity, written, written_u, value, u):
    row = {**WEATHER, "quantity": quantity, "reading": written, "reading_u": written_u}
    sheet = read(tmp_path, PASS, row, delimiter=";")
    entry = next(entry for entry in sheet.entries if entry.entry == "weather")
    assert_allclose([entry.reading, entry.reading_u], [value, u], rtol=1e-12)
    assert entry.start_ns == entry.stop_ns == utc(11)


@pytest.mark.parametrize(("changed", "sentence"), [
    ({"quantity": "relative_humidity", "reading": "0.35"}, "no relative_humidity in %"),
    ({"quantity": "cloud_fraction", "reading": "4"}, "no cloud_fraction in a fraction of the sky"),
    ({"quantity": "cloud_fraction", "reading": "0.5"}, "a cloud_fraction needs reading_u"),
    ({"reading": "304.6"}, "no air_temperature in degC; write a number from -60 to 60"),
    ({"quantity": "rain"}, "quantity 'rain' is no hand-read weather; write one of air_temper"),
    ({"reading": ""}, "a weather row needs reading")])
def test_weather_that_cannot_be_meant(tmp_path, changed, sentence):
    assert sentence in faults(tmp_path, PASS, {**WEATHER, **changed})


# ---- refusals of a row; the clean twins are PASS and ALBEDO, read above

@pytest.mark.parametrize(("changed", "sentence"), [
    ({"entry": "walk"}, "entry 'walk' is not known; write one of pass, cover, dark, weather"),
    ({"entry": "swap", "instrument": "pair", "reading": "up"},
     "reading 'up' of a swap; write normal or inverted"),
    ({"surface": "Asphalt"}, "surface 'Asphalt' is not known; write one of asphalt, lawn"),
    ({"surface": ""}, "a pass row needs surface; the cell is empty"),
    ({"patch": ""}, "a pass row needs patch"),
    ({"stop": ""}, "a pass row needs stop"),
    ({"quantity": "heat"}, "quantity 'heat' is not known; write one of temperature, albedo, ndvi"),
    ({"mode": "standoff"}, "mode 'standoff' is not known; write one of contact, stand-off"),
    ({"mode": ""}, "an infrared temperature pass needs a mode; write contact or stand-off"),
    ({"instrument": "camera"}, "instrument 'camera' is none of the campaign's loggers; write one "
                               "of thermal, shortwave, rednir-sky, rednir-ground"),
    ({"instrument": "shortwave"}, "instrument 'shortwave' has no column of brightness_temp"),
    ({"quantity": "albedo", "height_cm": "5"}, "mode 'contact' beside quantity albedo"),
    ({"start": "0.5"}, "start '0.5' is a fraction of a day as spreadsheets store it, it would "
                       "mean 12:00:00"),
    ({"start": "0,378"}, "it would mean 09:04:19"),  # 0.378 x 86400 = 32659 s
    ({"start": "45862.5"}, "it would mean 12:00:00"),
    ({"start": "noon"}, "start 'noon' is no time; write H:MM:SS"),
    ({"start": "25:00:00"}, "start '25:00:00' is no time of day"),
    ({"start": "13:00 PM"}, "with AM or PM hours run from 1 to 12"),
    ({"start": "2025-07-24T25:00"}, "is no time; write"),
    ({"stop": "12:00:00"}, "stop 12:00:00 is not after start 12:00:00"),
    ({"stop": "2025-07-25T12:01:00"}, "is more than a day after start 12:00:00"),
    ({"height_cm": "1e400"}, "height_cm '1e400' is no number"),
    ({"start": "2025-06-12T12:00:00"}, "is not on the campaign's date 2025-07-24"),
    ({"mode": "stand-off"}, "a stand-off pass needs height_cm"),
    ({"quantity": "albedo", "mode": ""}, "an albedo pass needs height_cm"),
    ({"quantity": "ndvi", "mode": ""}, "an ndvi pass needs height_cm"),
    ({"height_cm": "5 cm"}, "height_cm '5 cm' is no number"),
    ({"height_cm": "0"}, "height_cm '0' is too small; write a number above 0"),
    ({"length_m": "-1"}, "length_m '-1' is too small"),
    ({"width_m": "4"}, "width_m without length_m"),
    ({"lanes": "2.5"}, "lanes '2.5' is no whole number"),
    ({"lanes": "0"}, "lanes '0' is too small; write a number from 1 up"),
    ({"reading_u": "-0.1"}, "reading_u '-0.1' is too small"),
    ({"patch": "A\x07"}, "is no plain text"),
    ({"note": "x" * 2001}, "note has 2001 characters; up to 2000 fit"),
])
def test_a_row_at_fault_is_named_with_its_repair(tmp_path, changed, sentence):
    found = faults(tmp_path, {}, {**PASS, **changed})
    assert sentence in found
    assert "sheet.csv row 3: " in found


def test_all_faults_of_all_rows_come_together(tmp_path):
    rows = {**PASS, "start": "noon", "lanes": "x"}, {**ALBEDO, "surface": "snow"}
    found = faults(tmp_path, *rows).splitlines()
    assert [line[:16] for line in found] == ["sheet.csv row 2:"] * 2 + ["sheet.csv row 3:"]


# ---- daylight saving: European Union rule as in test_log_times

def test_gap_and_fold_on_the_sheet(tmp_path):
    def at(date, start):
        return {"study": {"date": date}}, {**PASS, "start": start, "stop": f"{date}T12:00:00"}

    study, row = at("2025-03-30", "01:30:00")
    assert "'01:30:00' does not exist in Europe/Lisbon on 2025-03-30" in faults(
        tmp_path, row, **study)
    study, row = at("2025-10-26", "01:30:00")
    assert "occurs twice in Europe/Lisbon on 2025-10-26 (clocks go back); write it with its " \
        "offset, such as 2025-10-26T01:30:00+01:00" in faults(tmp_path, row, **study)
    study, row = at("2025-10-26", "2025-10-26T01:30:00+00:00")
    assert read(tmp_path, row, **study).entries[0].start_ns == int(
        datetime(2025, 10, 26, 1, 30, tzinfo=UTC).timestamp()) * 10**9
    study, row = at("2025-03-30", "02:30:00")
    assert len(read(tmp_path, row, **study).entries) == 1


# ---- rows together

def test_overlaps_of_one_instrument_and_quantity(tmp_path):
    late = {**PASS, "start": "12:04:00", "stop": "12:09:00", "patch": "A2"}
    assert "sheet.csv row 3: starts at 12:04:00, before the pass of row 2 with the same " \
        "instrument (thermal) and quantity (temperature) stops at 12:05:00" in faults(
            tmp_path, PASS, late)
    assert len(read(tmp_path, PASS, {**late, "start": "12:05:00"}).entries) == 2
    other = {**ALBEDO, "start": "12:04:00", "stop": "12:09:00"}
    assert len(read(tmp_path, PASS, other).entries) == 2  # another quantity may overlap


def test_an_overlap_is_seen_past_a_shorter_pass(tmp_path):
    rows = ({**PASS, "stop": "12:30:00"}, {**PASS, "start": "12:05:00", "stop": "12:06:00"},
            {**PASS, "start": "12:20:00", "stop": "12:40:00"})
    found = faults(tmp_path, *rows)
    assert "row 3: starts at 12:05:00, before the pass of row 2" in found
    assert "row 4: starts at 12:20:00, before the pass of row 2" in found


def test_a_patch_has_one_surface_and_one_size(tmp_path):
    again = {**ALBEDO, "start": "13:00:00", "stop": "13:05:00"}
    assert "row 3: patch 'A1' is on surface lawn, but row 2 says asphalt" in faults(
        tmp_path, ALBEDO, {**again, "surface": "lawn"})
    assert "patch 'A1' is 4 m by 6 m, but row 2 says 4 m by 5 m" in faults(
        tmp_path, ALBEDO, {**again, "length_m": "6"})
    assert "patch 'A1' is a disc of 5 m, but row 2" in faults(
        tmp_path, ALBEDO, {**again, "width_m": ""})
    assert len(read(tmp_path, ALBEDO, again).entries) == 2
    assert len(read(tmp_path, ALBEDO, {**again, "width_m": "", "length_m": ""}).entries) == 2


def test_date_and_campaign_columns(tmp_path):
    columns = [*COLUMNS, "date", "campaign"]
    good = {**PASS, "date": "2025-07-24", "campaign": "mill-yard"}
    assert read(tmp_path, good, columns=columns).notices == ()
    for day in ("24.07.2025", "24/07/2025", "07/24/2025", "24.07.25", "24/07/25"):
        assert read(tmp_path, {**good, "date": day}, columns=columns).notices == ()
    later = {**PASS, "start": "13:00:00", "stop": "13:05:00"}
    old = {**good, "date": "2025-06-12", "campaign": "mill-yard-june"}
    found = faults(tmp_path, old, {**old, **later, "date": "2025-06-12"}, columns=columns)
    assert "row 2: date '2025-06-12' (and 1 more row): the sheet is from another day than the " \
        "campaign, 2025-07-24" in found
    assert "row 2: campaign 'mill-yard-june'" in found


# ---- the file

def test_unknown_columns_are_noticed_and_double_ones_refused(tmp_path):
    sheet = read(tmp_path, {**PASS, "crew": "x"}, columns=[*COLUMNS, "crew", "date"])
    assert sheet.notices[0] == "sheet.csv: the column 'crew' is not known and is left out"
    assert "rod_side 'left' is not known; write where it was, seen from the head" in faults(
        tmp_path, {**PASS, "rod_side": "left"}, columns=[*COLUMNS, "rod_side"])
    assert "row 1: the column mode stands twice" in faults(
        tmp_path, PASS, columns=[*COLUMNS, "mode"])


@pytest.mark.parametrize(("data", "sentence"), [
    (b"", "the field sheet is empty"),
    (b"\n\n", "the field sheet is empty"),
    (b"title\nentry,surface\n", "sheet.csv row 1: no column entry"),
    (b"PK\x03\x04 workbook", "is no readable workbook (BadZipFile)"),
    (b"\xd0\xcf\x11\xe0 workbook", "is a workbook of the old kind (.xls)"),
    ("entry,start".encode("utf-16"), "is UTF-16"),
    (b"entry,start\npass\0", "is UTF-16 or no text at all"),
    (b"entry,start\npass,12:00:00,more", "row 2: has 3 cells where the first row has 2"),
    (text_of(), "the field sheet holds no pass"),
    (b'entry,note\npass,"' + b"x" * 200_000 + b'"', "is no CSV table"),
])
def test_a_file_that_is_no_sheet(tmp_path, data, sentence):
    path = write(tmp_path, "sheet.csv", data)
    with pytest.raises(InputError) as caught:
        read_sheet(path, parameters(tmp_path))
    assert sentence in "\n".join(caught.value.faults)


def test_a_missing_sheet_is_refused(tmp_path):
    with pytest.raises(InputError, match=r"none.csv: the field sheet cannot be read"):
        read_sheet(tmp_path / "none.csv", parameters(tmp_path))


@settings(max_examples=100, deadline=None)
@given(st.dictionaries(st.sampled_from(COLUMNS), st.sampled_from(
    ["", "0", "-1", "1e400", "nan", "\u0663", "\u2028", '"', "=1+1", "12:61", "24:00:00",
     "2025-07-24T24:00", "2025-02-30T12:00:00", "9999-12-31T23:59:59+00:00", "0001-01-01T00:00:00",
     "0.99999999", "weather", "dark", "stand-off", "ndvi", "thermal", "x" * 130]), max_size=6))
def test_whatever_a_row_holds_it_is_read_or_refused_by_its_number(cells):
    with tempfile.TemporaryDirectory() as folder:
        try:
            sheet = read(Path(folder), {**PASS, **cells})
        except InputError as error:
            assert all(fault.startswith("sheet.csv") for fault in error.faults)  # noqa: PT017
        else:
            assert all(entry.row == 2 for entry in sheet.entries)
