"""The log files of Pellowick Yard: each logger's dialect, and the faults of an ordinary day."""

from __future__ import annotations

from dataclasses import dataclass, field
from datetime import UTC, datetime
from zoneinfo import ZoneInfo

import numpy as np
from heads import Log, Stay
from yard import SITE, Day, stream

ZONE = ZoneInfo(str(SITE["zone"]))
PREAMBLE = "Pellowick Yard, station on the mast\nheight 2 m; means of a minute\n"


@dataclass(frozen=True)
class Dialect:
    """How one logger writes: header, separator, decimal sign, decimals, time format, zone.

    A separator within the time format puts date and time into columns of their own.
    """

    files: tuple[str, ...]
    names: tuple[str, ...]
    decimals: tuple[int, ...]
    time_format: str
    zone: ZoneInfo | None = None  # None: UTC
    separator: str = ","
    comma: bool = False
    preamble: str = ""
    encoding: str = "utf-8"
    missing: str = "-9999"
    units: tuple[str, ...] = ()  # in a line of their own, under the header


DIALECTS = {
    "thermal": Dialect(("thermal_1.csv", "thermal_2.csv"), ("time", "target", "body"), (2, 2),
                       "%Y-%m-%dT%H:%M:%S.{tenth}Z"),
    "shortwave": Dialect(("shortwave.csv",), ("local_time", "sky_mV", "ground_mV"), (3, 3),
                         "%d/%m/%Y %H:%M:%S", ZONE),
    "rednir-sky": Dialect(("rednir_sky.csv",), ("time", "red_sky", "nir_sky"), (0, 0),
                          "%Y-%m-%d %H:%M:%S"),
    "rednir-ground": Dialect(("rednir_ground.csv",), ("time", "red_ground", "nir_ground"), (0, 0),
                             "%Y-%m-%dT%H:%M:%S{offset}", ZONE, "\t"),
    "weather": Dialect(("weather.csv",), ("date", "time", "air", "humidity", "wind"), (2, 1, 2),
                       "%d.%m.%Y;%H:%M", None, ";", True, PREAMBLE, "windows-1252",
                       units=("", "UTC", "°C", "%", "m/s")),
}


@dataclass
class Faults:
    """What goes wrong on one day, and where; kept for truth.json."""

    day: Day
    stays: list[Stay]
    noted: list[dict[str, object]] = field(default_factory=list)

    def __post_init__(self) -> None:
        walks = [stay for stay in self.stays if stay.kind == "walk"]
        order = stream(self.day.date, "faults").permutation(len(walks))
        self._walks = [walks[i] for i in order]

    def stay(self) -> Stay:
        """Return the next pass to suffer, each at most once."""
        return self._walks.pop()

    def note(self, logger: str, fault: str, records: int, stay: Stay | None) -> None:
        self.noted.append({"campaign": self.day.campaign, "logger": logger, "fault": fault,
                           "records": records, "patch": stay.patch if stay else "",
                           "turn": stay.turn if stay else 0})


def inside(log: Log, stay: Stay, after_s: float, for_s: float) -> np.ndarray:
    """Return the record numbers of `log` from `after_s` into the pass, `for_s` long."""
    start = stay.start_s + after_s
    return np.flatnonzero((log.true_s >= start) & (log.true_s < start + for_s))


def freeze(log: Log, column: str, for_s: float, faults: Faults) -> None:
    """Let one channel repeat its last reading for a while."""
    stay = faults.stay()
    rows = inside(log, stay, 40, for_s)
    log.columns[column][rows] = log.columns[column][rows[0]]
    faults.note(log.logger, f"stuck {column}", rows.size, stay)


def texts(log: Log) -> list[str]:
    """Return the records of `log` as lines, without line ends."""
    dialect = DIALECTS[log.logger]
    times = [_time_text(second, dialect) for second in log.logged_s.tolist()]
    columns = [[f"{value:.{places}f}".replace(".", "," if dialect.comma else ".")
                for value in values.tolist()]
               for values, places in zip(log.columns.values(), dialect.decimals, strict=True)]
    return [dialect.separator.join(cells) for cells in zip(times, *columns, strict=True)]


def _time_text(second: float, dialect: Dialect) -> str:
    moment = datetime.fromtimestamp(second, tz=dialect.zone or UTC)
    shift = moment.strftime("%z")
    text = moment.strftime(dialect.time_format)
    return text.replace("{tenth}", str(moment.microsecond // 100000)).replace(
        "{offset}", f"{shift[:3]}:{shift[3:]}")


def spoil(log: Log, lines: list[str], faults: Faults) -> list[str]:
    """Return the lines as the day left them: codes, unreadable lines, a gap, a repeated block."""
    separator = DIALECTS[log.logger].separator
    lines = list(lines)

    def cell(row: int, column: int, text: str) -> None:
        cells = lines[row].split(separator)
        cells[column] = text
        lines[row] = separator.join(cells)

    stay = faults.stay()
    rows = inside(log, stay, 30, 40)[::12][:4]
    for row in rows:
        cell(row, 1, DIALECTS[log.logger].missing)
    faults.note(log.logger, "missing code", rows.size, stay)
    stay = faults.stay()
    rows = inside(log, stay, 25, 50)[[3, 19, 37]]
    lines[rows[0]] = lines[rows[0]][:11]  # cut short: no reading left
    cell(rows[1], 2, "#.#1")
    lines[rows[2]] += separator + "7"  # one field too many
    faults.note(log.logger, "unreadable line", rows.size, stay)
    if log.logger == "thermal":
        stay = faults.stay()
        rows = inside(log, stay, 30, 40)[[5, 41]]
        for row in rows:
            cell(row, 1, "327.67")
        faults.note(log.logger, "out of range", rows.size, stay)
    if log.logger == "rednir-sky":
        stay = faults.stay()
        rows = inside(log, stay, 45, 12)
        del lines[rows[0]:rows[-1] + 1]
        faults.note(log.logger, "gap", rows.size, stay)
    if log.logger in ("thermal", "rednir-ground"):
        stay = faults.stay()
        rows = inside(log, stay, 30, 25)
        after = rows[-1] + 1
        lines[after:after] = lines[rows[0]:after]
        faults.note(log.logger, "repeated block", rows.size, stay)
    return lines


def files(log: Log, lines: list[str]) -> dict[str, bytes]:
    """Return the file or files of one logger, name to content."""
    dialect = DIALECTS[log.logger]
    header = dialect.preamble + "\n".join(
        dialect.separator.join(line) for line in (dialect.names, dialect.units) if line)
    share = -(-len(lines) // len(dialect.files))
    return {name: "\n".join([header, *lines[i * share:(i + 1) * share], ""]).encode(
        dialect.encoding) for i, name in enumerate(dialect.files)}
