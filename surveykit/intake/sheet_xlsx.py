"""The field sheet as a spreadsheet's own file (.xlsx): its cells as the texts a CSV would hold."""

from __future__ import annotations

import io
import zipfile
from datetime import date, datetime, time, timedelta
from typing import Any

from surveykit.core import InputError

MAX_ROWS, MAX_COLUMNS, MAX_BYTES = 20_000, 200, 20_000_000
_DAY_ZERO = date(1904, 1, 2)  # a time alone lies on day 0 of either epoch, 1899-12-30 or 1904-01-01


def read_cells(data: bytes, where: str) -> list[list[str]]:
    """Return the cells of the first worksheet that has a column `entry`, else of the first one.

    Times are written as the cell shows them: without seconds where its format has none.

    Raises
    ------
    InputError
        If openpyxl is not installed, or the file is no workbook, too large, or holds formulas
        without their values.
    """
    try:
        import openpyxl
    except ImportError:
        raise InputError(
            f"{where}: reading a spreadsheet's own file needs openpyxl; install it with "
            "pip install 'surveykit[sheets]', or save the sheet as CSV (UTF-8)") from None
    try:
        if sum(part.file_size for part in zipfile.ZipFile(io.BytesIO(data)).infolist()) > MAX_BYTES:
            raise InputError(f"{where}: the workbook unpacks to more than {MAX_BYTES // 10**6} MB; "
                             "save the field sheet alone as CSV (UTF-8)")
        book, formulas = (openpyxl.load_workbook(io.BytesIO(data), read_only=True, data_only=only)
                          for only in (True, False))
        sheets = sorted(book.worksheets, key=lambda sheet: "entry" not in _first_row(sheet))
        tables = (_texts(sheet, formulas[sheet.title], where) for sheet in sheets)
        table = next((table for table in tables if table), None)
    except InputError:
        raise
    except Exception as error:  # openpyxl lets through whatever a broken part raises
        raise InputError(f"{where}: is no readable workbook ({type(error).__name__}); open and "
                         "save it again, or save the sheet as CSV (UTF-8)") from None
    if table is None:
        raise InputError(f"{where}: the workbook holds no cells; write the field sheet into its "
                         "first worksheet")
    return table


def _first_row(sheet: Any) -> list[str]:
    return [str(cell.value).strip().lower()
            for row in sheet.iter_rows(max_row=1, max_col=MAX_COLUMNS) for cell in row]


def _texts(sheet: Any, formulas: Any, where: str) -> list[list[str]]:
    rows: list[list[str]] = []
    faults = []
    pairs = zip(sheet.iter_rows(max_col=MAX_COLUMNS), formulas.iter_rows(max_col=MAX_COLUMNS),
                strict=False)
    for number, (cells, written) in enumerate(pairs, start=1):
        if number > MAX_ROWS:
            raise InputError(f"{where}: worksheet {sheet.title!r} has more than {MAX_ROWS} rows; "
                             "save the rows of the field sheet alone")
        rows.append([_text(cell.value, getattr(cell, "number_format", "")) for cell in cells])
        for cell, formula in zip(cells, written, strict=False):
            if cell.value is None and formula.value is not None:
                faults.append(f"{where} row {number}: cell {formula.coordinate} holds a formula "
                              "without its value; open and save the workbook, or write the value")
    if faults:
        raise InputError(*faults)
    while rows and not any(rows[-1]):
        rows.pop()
    return rows


def _text(value: Any, form: str) -> str:
    """Return one cell as text.

    Examples
    --------
    >>> _text(time(12, 5), "h:mm"), _text(time(12, 5), "h:mm:ss"), _text(4.0, "General")
    ('12:05', '12:05:00', '4')
    >>> _text(datetime(2025, 7, 24), "yyyy-mm-dd"), _text("=x", "@")
    ('2025-07-24', '=x')
    """
    if value is None:
        return ""
    if isinstance(value, timedelta):
        value = datetime(1899, 12, 30) + value  # noqa: DTZ001 - wall time
    if isinstance(value, datetime):
        if value.date() <= _DAY_ZERO:
            value = value.time()
        elif value.time() == time(0) and "h" not in form.lower():
            value = value.date()
        else:
            return _seconds(value, "%Y-%m-%dT", form)
    if isinstance(value, time):
        return _seconds(value, "", form)
    if isinstance(value, date):
        return value.isoformat()
    if isinstance(value, float):
        return repr(int(value)) if value.is_integer() and abs(value) < 1e15 else repr(value)
    return str(value).strip()


def _seconds(moment: datetime | time, day: str, form: str) -> str:
    shown = "s" in form.lower().replace("aaa", "") or bool(moment.second or moment.microsecond)
    text = moment.strftime(f"{day}%H:%M:%S" if shown else f"{day}%H:%M")
    if shown and moment.microsecond:
        text += f".{moment.microsecond:06d}".rstrip("0")
    return text
