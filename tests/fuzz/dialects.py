"""The campaign of `yard` written in other dialects: the same records, the same sheet."""

from __future__ import annotations

import gzip
import io
from dataclasses import dataclass
from datetime import time
from zoneinfo import ZoneInfo

import numpy as np
import openpyxl
import pandas as pd
import yaml
import yard

UNITS = {"sky": "mV", "ground": "mV", "target": "°C", "body": "°C", "air": "°C", "humidity": "%",
         "wind": "m/s"}
FORMS = {  # form: names of the columns, format in the kit, strftime of each column
    "iso": (["time"], "iso8601", ["%Y-%m-%dT%H:%M:%S.%f"]),
    "iso with offset": (["time"], "iso8601", ["%Y-%m-%d %H:%M:%S.%f%z"]),
    "day first": (["time"], "%d.%m.%Y %H:%M:%S{d}%f", ["%d.%m.%Y %H:%M:%S{d}%f"]),
    "month first": (["time"], "%m/%d/%y %I:%M:%S.%f %p", ["%m/%d/%y %I:%M:%S.%f %p"]),
    "two columns": (["day", "clock"], "%d/%m/%Y %H:%M:%S{d}%f", ["%d/%m/%Y", "%H:%M:%S{d}%f"]),
    "epoch_s": (["s"], "epoch_s", []),
    "day_of_year": (["year", "doy", "hhmm", "sec"], "day_of_year", ["%Y", "%j", "%H%M", "%S{d}%f"]),
}


@dataclass(frozen=True)
class Dialect:
    """How loggers and field sheet are written."""

    delimiter: str = ","
    decimal: str = "."
    form: str = "iso"
    zone: str = "UTC"
    preamble: int = 0
    unit_line: bool = False
    restarts: int = 0
    parts: int = 1
    reverse: bool = False
    packed: bool = False
    end: str = "\n"
    encoding: str = "utf-8"
    kelvin: bool = False
    sheet: str = "plain"


def stamps(time_ms: np.ndarray, d: Dialect) -> list[list[str]]:
    """Return the cells of the time of each record."""
    if d.form == "epoch_s":
        return [[f"{ms // 1000}{d.decimal}{ms % 1000:03d}"] for ms in time_ms.tolist()]
    wall = pd.to_datetime(time_ms, unit="ms", utc=True).tz_convert(ZoneInfo(d.zone))
    return [[moment.strftime(form.replace("{d}", d.decimal)) for form in FORMS[d.form][2]]
            for moment in wall.to_pydatetime()]


def log_files(logger: str, log: yard.Log, d: Dialect) -> dict[str, bytes]:
    """Return the files of one logger by name."""
    values = {name: column + (273.15 if d.kelvin and UNITS[name] == "°C" else 0.0)
              for name, column in log.columns.items()}
    rows = [d.delimiter.join([*stamp, *(f"{v:.3f}".replace(".", d.decimal) for v in row)])
            for stamp, *row in zip(stamps(log.time_ms, d), *values.values(), strict=True)]
    names = FORMS[d.form][0]
    head = [f"station {logger}, ü, line {n}" for n in range(d.preamble)]
    head += [d.delimiter.join([*names, *values])]
    if d.unit_line:
        head += [d.delimiter.join([*["-"] * len(names), *(UNITS[name] for name in values)])]
    for n in range(d.restarts):
        at = (n + 1) * len(rows) // (d.restarts + 1)
        rows[at] = d.end.join([*head, rows[at]])
    files = {}
    for n, part in enumerate(np.array_split(np.arange(len(rows)), d.parts)):
        text = d.end.join([*head, *(rows[i] for i in part), ""])
        name = f"{logger}_{d.parts - n if d.reverse else n}.csv"
        data = text.encode(d.encoding)
        files[name + ".gz" if d.packed else name] = gzip.compress(data) if d.packed else data
    return files


def kit(d: Dialect) -> dict:
    entries = yard.kit()
    names, form, _ = FORMS[d.form]
    for entry in entries.values():
        entry["time"] = {"column": names if len(names) > 1 else names[0],
                         "format": form.replace("{d}", d.decimal), "zone": d.zone}
        entry["layout"] = {"delimiter": d.delimiter, "decimal": d.decimal, "encoding": d.encoding,
                           "skip_lines": d.preamble, "unit_lines": int(d.unit_line)}
        for column in entry["columns"].values():
            if d.kelvin and column["unit"] == "degC":
                column["unit"] = "K"
    return entries


def sheet(d: Dialect) -> tuple[str, bytes]:
    """Return the name and the bytes of the field sheet."""
    rows = [list(row) for row in yard.ROWS]
    start, stop = (yard.COLUMNS.index(name) for name in ("start", "stop"))
    if d.sheet == "workbook":
        book = openpyxl.Workbook()
        book.active.append(yard.COLUMNS)
        for row in rows:
            book.active.append([
                time.fromisoformat(cell) if at in (start, stop) else
                float(cell) if cell.replace(".", "").isdigit() else cell or None
                for at, cell in enumerate(row)])
        out = io.BytesIO()
        for cells in book.active.iter_rows(min_row=2):
            for at in (start, stop):
                cells[at].number_format = "h:mm:ss"
        book.save(out)
        return "sheet.xlsx", out.getvalue()
    mark = {"semicolon": ";", "tab": "\t"}.get(d.sheet, ",")
    for row in rows:
        for at in (start, stop):
            if d.sheet == "full times":
                row[at] = f"2025-06-11T{row[at]}+01:00"
            elif d.sheet == "tab":
                row[at] = time.fromisoformat(row[at]).strftime("%I:%M:%S %p").lstrip("0")
        if d.sheet == "semicolon":
            row[:] = [cell.replace("30", "30,0") if cell == "30" else cell for cell in row]
    text = "\r\n".join(mark.join(row) for row in (yard.COLUMNS, *rows)) + "\r\n"
    return "sheet.csv", (b"\xef\xbb\xbf" if d.sheet == "semicolon" else b"") + text.encode()


def files(d: Dialect) -> dict[str, bytes]:
    """Return the files of the campaign by path under the project folder."""
    name, data = sheet(d)
    campaign = yard.campaign() | {"field_sheet": name}
    found = {yard.PARAMETERS: yaml.safe_dump(campaign, sort_keys=False).encode(),
             yard.KIT_FILE: yaml.safe_dump(kit(d), sort_keys=False).encode(),
             f"{yard.FOLDER}/{name}": data}
    for logger, log in yard.logs().items():
        found |= {f"{yard.FOLDER}/{file}": text for file, text in log_files(logger, log, d).items()}
    return found
