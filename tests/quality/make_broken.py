"""Write tests/data/broken/checks: one faulty log a check beside the clean logs they differ from.

    python tests/quality/make_broken.py     (from anywhere; same bytes each time)

The readings are those of `small_survey`, invented; each fault is put in by one function below.
"""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import yaml

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))
from small_survey import KIT, LEVELS, lines, readings

FOLDER = Path(__file__).resolve().parents[1] / "data" / "broken" / "checks"
N, AT = 100, 60  # records at 1 Hz; a line inside the pass
LOGGERS = ("pair", "thermal", "longwave", "rednir-sky", "rednir-ground", "weather")
Log = list[str]
RAMP = np.arange(N, dtype=float)


def clean(logger: str) -> Log:
    """Return a log that no check objects to."""
    return lines("weather", n=4, step_s=60) if logger == "weather" else lines(logger, n=N)


def level(column: str) -> np.ndarray:
    """Return the readings of a clean log's column."""
    return readings(column, N, 1)


def cell(column: int, text: str, first: int = AT, last: int = AT + 1) -> Callable[[Log], None]:
    """Return a change that writes `text` into a column of some lines."""
    def change(log: Log) -> None:
        for i in range(first, last):
            cells = log[i].split(",")
            cells[column] = text
            log[i] = ",".join(cells)
    return change


def line(change: Callable[[str], str]) -> Callable[[Log], None]:
    return lambda log: log.__setitem__(AT, change(log[AT]))


def again(change: Callable[[Log], str]) -> Callable[[Log], None]:
    return lambda log: log.insert(AT, change(log))


def drop(rows: range) -> Callable[[Log], None]:
    def change(log: Log) -> None:
        for i in sorted(rows, reverse=True):
            del log[i]
    return change


def swap(log: Log) -> None:
    for i in range(1, len(log)):
        time, sky, ground = log[i].split(",")
        log[i] = f"{time},{ground},{sky}"


def block(column: str, value: float, first: int = 50, last: int = 70) -> np.ndarray:
    """Return a column that stands about `value` for a while, alive."""
    return np.where((RAMP >= first) & (RAMP < last), value / LEVELS[column] * level(column),
                    level(column))


def capped(column: str, before: float, after: float) -> np.ndarray:
    """Return a column whose head is capped for the first 15 s and from 88 s on."""
    shake = (level(column) / LEVELS[column] - 1) * 50
    dark = np.where(RAMP < 50, before, after) + shake
    return np.where((RAMP < 15) | (RAMP >= 88), dark, level(column))


def clipped(column: str, top: float) -> np.ndarray:
    return np.minimum(level(column), top)


def timed(step_s: float, shake_s: float = 0.0) -> Log:
    """Return a pair's log with another interval, or with times shaken."""
    log = lines("pair", n=N, step_s=step_s)
    shake = shake_s * np.random.default_rng(3).standard_normal(N)
    shift = np.round(1000 * shake).astype("m8[ms]")
    for i in range(1, N + 1):
        time, rest = log[i].split(",", 1)
        log[i] = f"{np.datetime64(time) + shift[i - 1]},{rest}"
    return log


def made(logger: str, **given: np.ndarray) -> Log:
    return lines(logger, n=N, **given)


def spoiled(logger: str, change: Callable[[Log], None]) -> Log:
    log = clean(logger)
    change(log)
    return log


def both(value: float, first: int = 50, last: int = 70) -> Log:
    return made("pair", sky=block("sky", value, first, last),
                ground=block("ground", value / 5, first, last))


BODY = level("body")
# check: logger whose log is faulty, the log
BROKEN: dict[str, tuple[str, Log]] = {
    "unreadable line": ("pair", spoiled("pair", line(lambda text: text + ",7"))),
    "unreadable time": ("pair", spoiled("pair", cell(0, "noon"))),
    "repeated record": ("pair", spoiled("pair", again(lambda log: log[AT]))),
    "conflicting records": ("pair", spoiled("pair", again(lambda log: log[AT] + "7"))),
    "time stepped back": ("pair", spoiled("pair", again(
        lambda log: log[AT - 20].replace(".000,", ".500,")))),
    "no reading": ("pair", spoiled("pair", cell(1, ""))),
    "unreadable value": ("pair", spoiled("pair", cell(1, "?"))),
    "out of range": ("thermal", spoiled("thermal", cell(1, "105"))),
    "physically impossible": ("pair", spoiled("pair", cell(1, "1990"))),
    "saturated": ("thermal", made("thermal", target=clipped("target", 47.0))),
    "stuck reading": ("pair", spoiled("pair", cell(2, "180.1234", AT, AT + 20))),
    "spike": ("thermal", spoiled("thermal", cell(1, "49.5"))),
    "more light up than down": ("pair", made("pair", sky=block("sky", 170.0))),
    "improbable albedo": ("pair", made("pair", ground=block("ground", 6.0))),
    "longwave against air": ("longwave", made("longwave", down=block("down", 150.0))),
    "far from the air": ("thermal", made("thermal", target=level("target")
                                          + np.clip(2 * (RAMP - 45), 0, 31))),
    "housing out of range": ("thermal", made("thermal", body=block("body", 63.0))),
    "housing shock": ("thermal", made("thermal", body=30 + 0.04 * RAMP + (BODY - 30) / 10)),
    "too little light": ("pair", both(45.0)),
    "extremely rare irradiance": ("pair", both(1600.0, 0, N)),
    "end of range": ("rednir-sky", made("rednir-sky", red=2188 + 10 * (level(
        "rednir-sky.red") - 70))),
    "step": ("thermal", made("thermal", target=block("target", 54.0, 50, 90))),
    "irradiance history": ("pair", made("pair", sky=block("sky", 700.0, 0, 10))),
    "sky not steady": ("pair", made("pair", sky=level("sky") - 3 * RAMP,
                                    ground=level("ground") - 0.6 * RAMP)),
    "housing warms or cools": ("thermal", made("thermal", body=30 + 0.015 * RAMP
                                               + (BODY - 30) / 10)),
    "brighter than the sky": ("rednir-ground", made("rednir-ground", red=20 * level(
        "rednir-ground.red"))),
    "gap": ("pair", spoiled("pair", drop(range(AT, AT + 3)))),
    "missing records": ("pair", spoiled("pair", drop(range(24, 94, 8)))),
    "rate": ("pair", timed(1.03)),
    "jitter": ("pair", timed(1.0, 0.02)),
    "swapped": ("pair", spoiled("pair", swap)),
    "sun too low": ("pair", lines("pair", n=N, start="05:40:00", sky=level("sky") / 9,
                                  ground=level("ground") / 9)),
    "negative reflectance": ("rednir-ground", made("rednir-ground", red=block(
        "rednir-ground.red", -0.4))),
}
# the same checks at their other ends and in other channels; named "check, end"
BROKEN |= {
    # zenith 18 deg (Long & Shi 2008; upward from memory): possible 1.2 * 1318 * .951**1.2 + 50 =
    # 1539 W m-2, rare 1318 * .951**1.2 + 50 = 1291 W m-2
    "physically impossible, upward": ("pair", spoiled("pair", cell(2, "1545"))),
    "extremely rare irradiance, upward": ("pair", made(
        "pair", sky=block("sky", 1500.0, 0, N), ground=block("ground", 1320.0, 0, N))),
    "out of range, longwave down": ("longwave", spoiled("longwave", cell(1, "39"))),
    "out of range, longwave up": ("longwave", spoiled("longwave", cell(2, "901"))),
    "out of range, cold": ("thermal", spoiled("thermal", cell(1, "-41"))),
    "longwave against air, warm": ("longwave", made("longwave", down=block("down", 515.0))),
    "far from the air, cold": ("thermal", made("thermal", target=level("target")
                                               - np.clip(2 * (RAMP - 45), 0, 33))),
    "improbable albedo, bright": ("pair", made("pair", ground=block("ground", 880.0))),
    "end of range, stated top": ("thermal", clean("thermal")),
    "end of range, stated bottom": ("thermal", clean("thermal")),
    "end of range, stated wide": ("thermal", clean("thermal")),
    "saturated, low": ("thermal", made("thermal", target=np.maximum(level("target"), 47.0))),
    "housing out of range, cold": ("thermal", made("thermal", body=block("body", -12.0))),
}

BROKEN |= {
    "dark drift": ("pair", made("pair", **{c: capped(c, before=-1.0, after=9.5) for c in (
        "sky", "ground")})),
    "dark drift, none": ("pair", made("pair", **{c: capped(c, before=-1.0, after=-1.4) for c in (
        "sky", "ground")})),
    "wet ground": ("pair", clean("pair")), "panel": ("rednir-ground", clean("rednir-ground")),
    "panel, near": ("rednir-ground", clean("rednir-ground")),
}
PANEL = {"entry": "panel", "instrument": "rednir-ground", "reading": "0.98", "reading_u": "0.01"}
DARK = [{"entry": "dark", "instrument": "pair", "start": a, "stop": b}
        for a, b in (("12:00:00", "12:00:15"), ("12:01:28", "12:01:39"))]
DARK_PASS = {"start": "12:00:20", "stop": "12:01:25"}
# what the case's log alone does not say: rows, the passes' times, keys of the head or the campaign
BESIDE: dict[str, dict[str, Any]] = {
    "sun too low": {"times": {"start": "05:40:20", "stop": "05:41:30"}},
    "end of range, stated top": {"head": {"target": {"range": [-40, 47.6]}}},
    "end of range, stated bottom": {"head": {"target": {"range": [46.6, 150]}}},
    "end of range, stated wide": {"head": {"target": {"range": [-40, 150]}}},
    "dark drift": {"rows": DARK, "times": DARK_PASS},
    "dark drift, none": {"rows": DARK, "times": DARK_PASS},
    "wet ground": {"conditions": {"sky": "clear", "rain_48h_mm": 4}},
    "panel": {"rows": [{**PANEL, "start": "12:40:00", "stop": "12:40:20"}]},
    "panel, near": {"rows": [{**PANEL, "start": "12:30:00", "stop": "12:30:20"}]},
}
BESIDE_FILE = "beside.yml"


def files() -> dict[str, str]:
    """Return the text of every file by its name."""
    out = {f"clean-{logger}.csv": clean(logger) for logger in LOGGERS}
    out |= {file(case): log for case, (_, log) in BROKEN.items()}
    texts = {name: "\n".join([*log, ""]) for name, log in out.items()}
    return texts | {BESIDE_FILE: yaml.safe_dump(BESIDE)}


def file(case: str) -> str:
    return f"{case.replace(', ', '.').replace(' ', '-')}.csv"


if __name__ == "__main__":
    FOLDER.mkdir(parents=True, exist_ok=True)
    for name, text in files().items():
        (FOLDER / name).write_text(text, encoding="utf-8")
    sys.stdout.write(f"{len(files())} files, {len(KIT)} instruments known\n")
