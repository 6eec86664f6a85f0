"""The field sheet as a spreadsheet saved it: cells by column, with row numbers."""

from __future__ import annotations

import csv
import io

from surveykit.core import InputError
from surveykit.intake.sheet_xlsx import read_cells

COLUMNS = ("entry", "surface", "patch", "quantity", "mode", "instrument", "start", "stop",
           "height_cm", "width_m", "length_m", "lanes", "reading", "reading_u", "note",
           "date", "campaign", "rod_side", "operator_side")
Row = tuple[int, dict[str, str]]  # as the spreadsheet counts them, the header being row 1; cells
SPACES = dict.fromkeys(map(ord, "\N{NO-BREAK SPACE}\N{NARROW NO-BREAK SPACE}"), " ")


def read_rows(data: bytes, where: str) -> tuple[list[Row], list[str], list[str]]:
    """Return the rows of a sheet, CSV or .xlsx, that are not blank; notices; faults.

    Raises
    ------
    InputError
        If the bytes are no table, or row 1 does not hold the column names.
    """
    table, mark = (read_cells(data, where), "") if data[:4] == b"PK\x03\x04" \
        else _csv_cells(data, where)
    header = [name.strip().lower() for name in table[0]]
    if "entry" not in header:
        raise InputError(f"{where} row 1: no column entry; the first row holds the columns "
                         f"{', '.join(COLUMNS[:15])}; got {', '.join(header)[:200]}")
    faults = [f"{where} row 1: the column {name} stands twice; keep one" for name in COLUMNS
              if header.count(name) > 1]
    notices = [f"{where}: the column {name!r} is not known and is left out" for name in header
               if name and name not in COLUMNS]
    rows = []
    for number, cells in enumerate(table[1:], start=2):
        cells = [cell.translate(SPACES).strip() for cell in cells]
        if any(cells[len(header):]):
            faults.append(f"{where} row {number}: has {len(cells)} cells where the first row has "
                          f"{len(header)}; "
                          + (f"put cells that hold {mark!r} in quotes" if mark else
                             "give each column its name in the first row"))
        elif any(cells):
            if mark and len(cells) < len(header):
                notices.append(f"{where} row {number}: has {len(cells)} cells where the first row "
                               f"has {len(header)}; was the file cut off? the rest counts as empty")
            named = dict(reversed([*zip(header, cells, strict=False)]))  # the first of a name
            rows.append((number, {name: named.get(name, "") for name in COLUMNS}))
    return rows, notices, faults


def _csv_cells(data: bytes, where: str) -> tuple[list[list[str]], str]:
    """Return the cells of a CSV and its delimiter."""
    text = _decoded(data, where)
    first = text.splitlines()[0] if text.strip() else ""
    if not text.strip():
        raise InputError(f"{where}: the field sheet is empty; its first row holds the columns "
                         f"{', '.join(COLUMNS[:15])}")
    delimiter = max((",", ";", "\t"), key=lambda mark: len(
        {name.strip().lower() for name in first.replace('"', "").split(mark)} & {*COLUMNS}))
    try:
        return list(csv.reader(io.StringIO(text, newline=""), delimiter=delimiter)), delimiter
    except csv.Error as error:
        raise InputError(f"{where}: is no CSV table ({error}); save the sheet as CSV") from None


def _decoded(data: bytes, where: str) -> str:
    if data[:4] == b"\xd0\xcf\x11\xe0":
        raise InputError(f"{where}: is a workbook of the old kind (.xls); save the sheet as .xlsx "
                         "or CSV (UTF-8)")
    if data[:2] in (b"\xff\xfe", b"\xfe\xff") or b"\0" in data:
        raise InputError(f"{where}: is UTF-16 or no text at all; save the sheet as CSV (UTF-8)")
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError:
        return data.decode("windows-1252", errors="replace")
