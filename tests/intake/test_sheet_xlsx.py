"""A field sheet in a spreadsheet's own file reads as the same sheet saved as CSV."""

from __future__ import annotations

import io
import sys
import zipfile
from dataclasses import replace
from datetime import date, datetime, time, timedelta

import pytest
from invented import ALBEDO, COLUMNS, PASS, WEATHER, parameters, text_of, write

from surveykit.core import InputError
from surveykit.intake.fieldsheet import read_sheet

openpyxl = pytest.importorskip("openpyxl")
ROWS = [PASS, {**ALBEDO, "start": "12:06:00", "stop": "12:07:30"},
        {**WEATHER, "reading": "31.5", "note": "Schatten, 2 m"}]


def typed(name: str, text: str):
    """Return a cell's value as a spreadsheet keeps what was typed in."""
    if not text:
        return None
    if name in ("start", "stop"):
        return time.fromisoformat(text)
    if name in ("height_cm", "width_m", "length_m", "lanes", "reading"):
        return float(text)
    return text


def book(rows=ROWS, columns=COLUMNS, spoil=None, first_sheet=None) -> bytes:
    workbook = openpyxl.Workbook()
    sheet = workbook.active
    if first_sheet is not None:
        sheet.append(first_sheet)
        sheet = workbook.create_sheet("field sheet")
    sheet.append(columns)
    for row in rows:
        sheet.append([typed(name, row.get(name, "")) for name in columns])
    for cell in (cell for row in sheet.iter_rows() for cell in row if isinstance(cell.value, time)):
        cell.number_format = "h:mm:ss"
    if spoil:
        spoil(sheet)
    out = io.BytesIO()
    workbook.save(out)
    return out.getvalue()


def entries(tmp_path, name, data):
    return read_sheet(write(tmp_path, name, data), parameters(tmp_path)).entries


def refusal(tmp_path, data) -> str:
    with pytest.raises(InputError) as caught:
        entries(tmp_path, "sheet.xlsx", data)
    return "\n".join(caught.value.faults)


@pytest.mark.parametrize("first_sheet", [None, ["Notes of the day", "nothing here"]])
def test_workbook_and_csv_give_the_same_entries(tmp_path, first_sheet):
    plain = entries(tmp_path, "sheet.csv", text_of(*ROWS))
    assert [repr(e) for e in entries(tmp_path, "sheet.xlsx", book(first_sheet=first_sheet))] \
        == [repr(e) for e in plain]


def at(day, hour=0):
    return datetime(2025, 7, day, hour)  # noqa: DTZ001 - a spreadsheet's wall time


def change(place, value, form=None):
    def spoil(sheet):
        sheet[place].value = value
        if form:
            sheet[place].number_format = form
    return spoil


START = f"{chr(65 + COLUMNS.index('start'))}2"  # the start of row 2


@pytest.mark.parametrize(("value", "form", "u_s", "start"), [
    (time(12, 0), "h:mm", 60.0, 0), (time(12, 0), "h:mm:ss", 5.0, 0),
    (time(12, 0, 7), "h:mm", 5.0, 7), (time(12, 0, 0, 500_000), "h:mm:ss.000", 5.0, 0.5),
    (timedelta(hours=12), "[h]:mm:ss", 5.0, 0),
    (at(24, 12), "yyyy-mm-dd h:mm:ss", 5.0, 0),
    ("12:00:00 PM", None, 5.0, 0), ("2025-07-24T11:00:00Z", None, 5.0, 0)])
def test_a_time_is_read_as_its_cell_shows_it(tmp_path, value, form, u_s, start):
    plain = entries(tmp_path, "sheet.csv", text_of(PASS))[0]
    entry = entries(tmp_path, "sheet.xlsx", book([PASS], spoil=change(START, value, form)))[0]
    assert entry.edge_u_s == u_s
    assert entry.start_ns - plain.start_ns == start * 10**9
    assert repr(replace(entry, start_ns=0, edge_u_s=0)) == repr(
        replace(plain, start_ns=0, edge_u_s=0))


@pytest.mark.parametrize(("value", "form", "sentence"), [
    (0.5, "General", "row 2: start '0.5' is a fraction of a day"),
    ("#REF!", None, "row 2: start '#REF!' is no time"),
    ("=A1+1", None, f"row 2: cell {START} holds a formula without its value"),
    (at(23, 12), "yyyy-mm-dd h:mm:ss", "row 2: "),
    (True, None, "row 2: start 'True' is no time")])
def test_a_cell_that_is_no_time_is_refused_by_its_row(tmp_path, value, form, sentence):
    assert f"sheet.xlsx {sentence}" in refusal(
        tmp_path, book([PASS], spoil=change(START, value, form)))


def test_date_column_of_a_workbook(tmp_path):
    columns = [*COLUMNS, "date"]
    cell = f"{chr(65 + len(COLUMNS))}2"
    for day, form in ((date(2025, 7, 24), "dd.mm.yyyy"), (at(24), "yyyy-mm-dd")):
        data = book([PASS], columns, change(cell, day, form))
        assert read_sheet(write(tmp_path, "sheet.xlsx", data), parameters(tmp_path)).notices == ()
    wrong = book([PASS], columns, change(cell, date(2025, 7, 23), "dd.mm.yyyy"))
    assert "row 2: date '2025-07-23': the sheet is from another day" in refusal(tmp_path, wrong)


def damaged(data: bytes, name: str, text: bytes) -> bytes:
    out = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as old, zipfile.ZipFile(out, "w") as new:
        for part in old.namelist():
            new.writestr(part, text if part == name else old.read(part))
    return out.getvalue()


@pytest.mark.parametrize("data", [
    book()[:2000], b"PK\x03\x04", damaged(book(), "xl/workbook.xml", b"<x"),
    damaged(book(), "xl/worksheets/sheet1.xml", b"\0" * 50),
    damaged(book(), "xl/worksheets/sheet1.xml", b"<worksheet><sheetData><row><c t='s'><v>999</v>"
            b"</c></row></sheetData></worksheet>")])
def test_a_damaged_workbook_is_refused(tmp_path, data):
    assert refusal(tmp_path, data).startswith("sheet.xlsx")


def test_worksheets_beside_the_field_sheet_may_hold_what_they_like(tmp_path):
    def beside(sheet):
        other = sheet.parent.create_sheet("calculations")
        other["A1"] = "=1+1"  # without its value
        other.append([""] * 300)
        for _ in range(20_001):
            other.append(["much"])

    found = entries(tmp_path, "sheet.xlsx", book(spoil=beside))
    assert repr(found) == repr(entries(tmp_path, "sheet.csv", text_of(*ROWS)))


def test_empty_and_huge_workbooks_are_refused(tmp_path):
    assert "holds no cells" in refusal(tmp_path, book([], []))
    assert "row 1: no column entry" in refusal(tmp_path, book([], ["a", "b"]))
    bomb = damaged(book(), "xl/worksheets/sheet1.xml", b" " * 30_000_000)
    assert "unpacks to more than 20 MB" in refusal(tmp_path, bomb)


def test_without_openpyxl_the_message_says_what_to_install(tmp_path, monkeypatch):
    monkeypatch.setitem(sys.modules, "openpyxl", None)
    said = refusal(tmp_path, book())
    assert "pip install 'surveykit[sheets]'" in said
    assert "save the sheet as CSV" in said
