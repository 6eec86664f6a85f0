"""The field sheet: one row an entry, read into UTC and SI, with every fault of every row."""

from __future__ import annotations

import hashlib
from collections.abc import Callable
from dataclasses import dataclass
from datetime import date
from pathlib import Path
from typing import Any, TypeVar

from surveykit.core import InputError
from surveykit.intake.params import Parameters
from surveykit.intake.serving import MODES, QUANTITIES, Offers, Service, offers, serve
from surveykit.intake.sheet_checks import day_faults, overlap_faults, patch_faults, swap_faults
from surveykit.intake.sheet_csv import read_rows
from surveykit.intake.sheet_times import SheetTime, read_time
from surveykit.intake.sheet_words import (
    NAN,
    SIDES,
    Entry,
    number,
    row_reading,
    weather_reading,
)

NS = 1_000_000_000
NEEDED = {
    "pass": ("surface", "patch", "quantity", "start", "stop"),
    "cover": ("start", "stop"),
    "dark": ("start", "stop"),
    "weather": ("quantity", "start", "reading"),
    "sky": ("instrument", "start", "stop"),
    "foil": ("instrument", "start", "stop"),
    "swap": ("instrument", "surface", "patch", "start", "stop", "reading"),
    "reference": ("surface", "patch", "instrument", "start", "stop", "reading", "reading_u"),
    "panel": ("instrument", "start", "stop", "reading"),
    "check": ("instrument", "start", "stop", "reading"),
    "lid": ("surface", "patch", "instrument", "start", "stop", "reading"),
}
MAX_LABEL, MAX_NOTE = 120, 2000
T = TypeVar("T")


@dataclass(frozen=True)
class Sheet:
    """The field sheet: path under the project folder, SHA-256, entries in order of their start.

    `services` holds by row the channels that serve a pass; `notices` are sentences worth reading
    that are no faults.
    """

    path: str
    sha256: str
    entries: tuple[Entry, ...]
    services: dict[int, Service]
    notices: tuple[str, ...]


def read_sheet(path: Path, parameters: Parameters,
               doubtful: frozenset[str] = frozenset()) -> Sheet:
    """Return the entries of a field sheet.

    Times are wall time at the site on the campaign's date, or full ISO 8601, plus the watch's
    offset (`watch.offset_s`; positive: the watch was slow). Heights and sizes are in m, hand-read
    weather in SI.

    Parameters
    ----------
    path : Path
        A CSV file as spreadsheets save it: comma, semicolon or tab, decimal point or comma, UTF-8
        (with or without a byte-order mark) or Windows-1252; or a spreadsheet's own file (.xlsx,
        needs openpyxl).
    parameters : Parameters
        The campaign and its kit.
    doubtful : frozenset of str
        Top-level keys of the parameter file that could not be read: rows are not held against
        what they would say (`date`, `site`, `surfaces`, `loggers`).

    Raises
    ------
    InputError
        All faults of all rows, each with the spreadsheet's row (header = 1).
    """
    where = path.relative_to(parameters.root).as_posix() \
        if path.is_relative_to(parameters.root) else path.name
    try:
        data = path.read_bytes()
    except OSError as error:
        raise InputError(f"{where}: the field sheet cannot be read ({error.strerror}); "
                         "check field_sheet and data_folder") from None
    rows, notices, faults = read_rows(data, where)
    entries: list[Entry] = []
    services: dict[int, Service] = {}
    times: dict[int, dict[str, SheetTime]] = {}
    offered = offers(parameters)
    for row, cells in rows:
        reader = _Row(row, cells, parameters, offered, doubtful)
        entry = reader.entry()
        times[row] = reader.times
        faults += [f"{where} row {row}: {fault}" for fault in reader.faults]
        if entry is not None:
            entries.append(entry)
            if reader.service is not None:
                services[row] = reader.service
    of_day, undated = day_faults(rows, times, parameters.campaign)
    notices += [f"{where}: {notice}" for notice in undated]
    if not doubtful & {"date", "site"}:
        faults += [f"{where} {fault}" for fault in of_day]
    if not faults and not any(entry.entry == "pass" for entry in entries):
        faults.append(f"{where}: the field sheet holds no pass; write one row for each")
    found = [*patch_faults(entries), *swap_faults(entries),
             *overlap_faults(entries, services, times)]
    faults += [f"{where} row {row}: {fault}" for row, fault in found]
    if faults:
        raise InputError(*faults)
    entries.sort(key=lambda entry: (entry.start_ns, entry.row))
    return Sheet(where, hashlib.sha256(data).hexdigest(), tuple(entries), services, tuple(notices))


class _Row:
    """One row being read; every fault is kept, an entry comes out only if there is none."""

    def __init__(self, row: int, cells: dict[str, str], parameters: Parameters,
                 offered: Offers, doubtful: frozenset[str]) -> None:
        self.row, self.cells, self.offered, self.doubtful = row, cells, offered, doubtful
        self.parameters = parameters
        self.faults: list[str] = []
        self.times: dict[str, SheetTime] = {}
        self.service: Service | None = None

    def entry(self) -> Entry | None:
        kind = self.cells["entry"].lower()
        if kind not in NEEDED:
            self.faults.append(f"entry {self.cells['entry']!r} is not known; write one of "
                               f"{', '.join(NEEDED)}")
        if self.faults:
            return None
        self.faults += [f"a {kind} row needs {name}; the cell is empty" for name in NEEDED[kind]
                        if not self.cells[name]]
        for name in ("start", "stop"):
            if self.cells[name]:
                self._time(name)
        self._order()
        texts = self._texts(kind)
        values = self._values(kind, texts)
        if self.faults:
            return None
        start = self.times["start"]
        stop = self.times.get("stop", start)
        watch_ns = round(self.parameters.campaign.watch.offset.value * NS)
        limits = self.parameters.settings.passes
        written = all(time.seconds for time in self.times.values())
        return Entry(
            row=self.row, entry=kind, **texts, note=self.cells["note"],
            start_ns=start.time_ns + watch_ns, stop_ns=stop.time_ns + watch_ns,
            edge_u_s=limits.sheet_u_s if written else limits.sheet_minutes_u_s, **values)

    def _time(self, name: str) -> None:
        campaign = self.parameters.campaign
        day = date.fromisoformat(campaign.date)
        time = self._read(
            lambda: read_time(self.cells[name], day, campaign.site.time_zone), None, f"{name} ")
        if time is None:
            return
        self.times[name] = time
        # A full time may lie a day off: a station's UTC day reaches into the site's neighbour days.
        away = abs((time.wall.date() - day).days)
        if name == "start" and away > (1 if time.full else 0) and "date" not in self.doubtful:
            self.faults.append(f"start {self.cells[name]!r} is not on the campaign's date {day}")

    def _order(self) -> None:
        start, stop = self.times.get("start"), self.times.get("stop")
        if start and stop and stop.time_ns <= start.time_ns:
            self.faults.append(
                f"stop {self.cells['stop']} is not after start {self.cells['start']}; a pass over "
                f"midnight needs full times such as {start.wall.isoformat()}")
        elif start and stop and stop.time_ns - start.time_ns > 86400 * NS:
            self.faults.append(f"stop {self.cells['stop']} is more than a day after start "
                               f"{self.cells['start']}")

    def _texts(self, kind: str) -> dict[str, Any]:
        cells = self.cells
        texts = {"surface": cells["surface"], "patch": cells["patch"],
                 "quantity": cells["quantity"].lower(), "mode": cells["mode"].lower(),
                 "instrument": cells["instrument"]}
        surfaces = self.parameters.campaign.surfaces
        if texts["surface"] and texts["surface"] not in surfaces \
                and "surfaces" not in self.doubtful:
            self.faults.append(f"surface {texts['surface']!r} is not known; write one of "
                               f"{', '.join(surfaces)}")
        if len(texts["patch"]) > MAX_LABEL or not texts["patch"].isprintable():
            self.faults.append(f"patch {texts['patch'][:40]!r} is no plain text of up to "
                               f"{MAX_LABEL} characters")
        if len(cells["note"]) > MAX_NOTE:
            self.faults.append(f"note has {len(cells['note'])} characters; up to {MAX_NOTE} fit")
        if kind == "weather":
            return texts
        known = True
        for name, words in (("quantity", QUANTITIES), ("mode", MODES)):
            if texts[name] and texts[name] not in words:
                known = False
                self.faults.append(f"{name} {texts[name]!r} is not known; write one of "
                                   f"{', '.join(words)}")
        if "loggers" in self.doubtful:
            return texts
        if kind == "pass" and texts["quantity"] and known:
            self.service = self._read(lambda: serve(
                self.offered, texts["quantity"], texts["mode"], texts["instrument"]), None)
        elif texts["instrument"] and texts["instrument"] not in self.offered:
            self.faults.append(f"instrument {texts['instrument']!r} is none of the campaign's "
                               f"loggers; write one of {', '.join(self.offered)}")
        return texts

    def _values(self, kind: str, texts: dict[str, Any]) -> dict[str, Any]:
        values: dict[str, Any] = {}
        for name, scale in (("height_cm", 100.0), ("width_m", 1.0), ("length_m", 1.0)):
            value = self._number(name, 0.0, above=True)
            values[f"{name.split('_')[0]}_m"] = value / scale
        lanes = self._number("lanes", 1.0)
        if lanes % 1 > 0:
            self.faults.append(f"lanes {self.cells['lanes']!r} is no whole number")
        values["lanes"] = int(lanes) if lanes == lanes else 0
        values["reading"] = self._read(
            lambda: row_reading(kind, self.cells["reading"]), NAN) if self.cells["reading"] else NAN
        values["reading_u"] = self._number("reading_u", 0.0)
        for name in ("rod_side", "operator_side"):
            values[name] = self.cells[name].lower()
            if values[name] not in ("", *SIDES):
                self.faults.append(f"{name} {self.cells[name]!r} is not known; write where it was, "
                                   f"seen from the head: {', '.join(SIDES)} (towards or from it)")
        if kind == "weather" and texts["quantity"] and self.cells["reading"]:
            values |= self._read(lambda: weather_reading(
                texts["quantity"], values["reading"], values["reading_u"],
                self.parameters.settings.temperature), dict[str, float]())
        if kind == "pass":
            product = texts["quantity"]
            level = product in ("albedo", "ndvi")
            if not self.cells["height_cm"] and (level or texts["mode"] == "stand-off"):
                self.faults.append(f"{f'an {product}' if level else 'a stand-off'} pass needs "
                                   "height_cm, the head's height over the ground; the cell is "
                                   "empty")
            if self.cells["width_m"] and not self.cells["length_m"]:
                self.faults.append("width_m without length_m; a disc has length_m (its diameter) "
                                   "alone, a rectangle both")
        return values

    def _number(self, name: str, low: float, *, above: bool = False) -> float:
        if not self.cells[name]:
            return NAN
        value = self._read(lambda: number(self.cells[name]), NAN, f"{name} ")
        if value < low or (above and value == low):
            self.faults.append(f"{name} {self.cells[name]!r} is too small; write a number "
                               f"{'above' if above else 'from'} {low:g}{'' if above else ' up'}")
            return NAN
        return value

    def _read(self, action: Callable[[], T], otherwise: T, before: str = "") -> T:
        """Return what `action` reads; where it cannot, keep the fault and return `otherwise`."""
        try:
            return action()
        except ValueError as error:
            self.faults.append(f"{before}{error}")
            return otherwise
