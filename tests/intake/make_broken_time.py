"""Write tests/data/broken/time: logs and sheets that cannot be placed in time, and clean twins.

    python tests/intake/make_broken_time.py     (from anywhere; same bytes each time)

Loggers are those of `under_sky`, invented; each case names what differs from its clean twin.
"""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Any

import numpy as np
import yaml

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))
sys.path.insert(0, str(Path(__file__).resolve().parent))
from small_survey import DAY, SHEET, STAND_OFF, lines, row
from under_sky import log, sheet

FOLDER = Path(__file__).resolve().parents[1] / "data/broken/time"
N = 600
COVERS = ((60.0, 71.3), (290.4, 300.9), (530.7, 542.2))
MOVED = (COVERS[0], (COVERS[1][0] + 9, COVERS[1][1] + 9), COVERS[2])
FOUR = (COVERS[0], (160.2, 171.0), (490.4, 501.1), (560.7, 572.2))  # none near the step back
FAR = (COVERS[0], (1200.4, 1210.9), (2400.7, 2412.2))  # apart enough to tell a drift
PASSES, BETWEEN = ((90, 150), (400, 480)), ((90, 150), (510, 552))
LATE_S = 50000  # more than the 12 h that a clock may be off
NEAR_S = 40000
GOOD = {"offset_s": 0, "u_s": 0.1}
FOUND, OTHER = {"cover_events": True}, {"align_with": "rednir-sky"}


def written(name: str, **given: Any) -> list[str]:
    """Return a logger's file under the covers, as short as its readings allow."""
    return [line.replace(".000,", ",") for line in log(name, **{"covers": COVERS, "n": N} | given)]


def hours(shift_s: float) -> list[str]:
    """Return three hours of a pair, one record a minute, under light `shift_s` later."""
    late = log("pair", covers=(), n=10800, shift_s=shift_s)
    return [late[0], *(line.replace(".000,", ",") for line in late[1::60])]


def earlier(text: list[str], by_s: float) -> list[str]:
    """Return a file whose times are `by_s` too early."""
    return [text[0], *(f"{np.datetime64(line.split(',')[0]) - np.timedelta64(int(by_s), 's')},"
                       f"{line.split(',', 1)[1]}" for line in text[1:])]


def long(name: str, drift_ppm: float = 0.0) -> list[str]:
    """Return what 2700 s hold of passes and of 45 s on each side of the covers."""
    text = written(name, covers=FAR, n=2700, drift_ppm=drift_ppm)
    time = np.arange(2700)
    kept = np.zeros(time.size, dtype=bool)
    for start, stop in (*FAR, *PASSES):
        kept |= (time > start - 45) & (time < stop + 45)
    return [text[0], *(line for line, keep in zip(text[1:], kept, strict=True) if keep)]


def set_back(covers: Any, back_s: float = 100.0, at: int = 300) -> list[str]:
    """Return one file whose clock was set back in the middle."""
    later = written("pair", covers=covers, n=N - at, first_s=at - back_s, offset_s=back_s)
    return written("pair", covers=covers, n=at) + later[1:]


def crossed(start_s: int, stop_s: int, without: slice = slice(0, 0)) -> list[str]:
    """Return an infrared log that changes by 15 K where the head comes over the patch."""
    time = np.arange(N)
    target = np.where((time >= start_s) & (time < stop_s), 48.0, 33.0)
    text = lines("thermal", n=N, target=target
                 + 0.4 * np.random.default_rng(1).standard_normal(N))
    del text[1 + without.start:1 + without.stop]
    return [line.replace(".000,", ",") for line in text]


def ndvi(covers: Any = COVERS) -> list[dict[str, str]]:
    return [one for one in sheet(covers, PASSES) if one.get("quantity") != "albedo"]


def walks(*times: tuple[str, str]) -> list[dict[str, str]]:
    return [row(**STAND_OFF, start=start, stop=stop) for start, stop in times]


FILES = {
    "sky": written("rednir-sky"), "ground": written("rednir-ground"), "pair": written("pair"),
    "ground.cover-moved": written("rednir-ground", covers=MOVED),
    "pair.cover-moved": written("pair", covers=MOVED),
    "ground.fast": long("rednir-ground", 800), "ground.far": long("rednir-ground"),
    "sky.far": long("rednir-sky"),
    "ground.one-cover": written("rednir-ground", covers=COVERS[:1]),
    "sky.no-cover": written("rednir-sky", covers=()),
    "ground.days-off": earlier(written("rednir-ground"), LATE_S),
    "ground.hours-off": earlier(written("rednir-ground"), NEAR_S),
    "pair.four": written("pair", covers=FOUR), "pair.two": written("pair", covers=COVERS[:2]),
    "pair.set-back": set_back(FOUR), "pair.set-back-one": set_back((*FOUR[:2], FOUR[3])),
    "pair.set-back-open": set_back((), 50.0), "pair.open": written("pair", covers=()),
    "pair.hours": hours(0.0), "pair.wrong-hour": hours(3600.0),
    "thermal": crossed(120, 240), "thermal.late": crossed(150, 240),
    "thermal.gap": crossed(120, 240, slice(110, 250)),
    "thermal.elsewhere": crossed(120, 240, slice(0, 300)),
}
SHEETS = {
    "three": sheet(COVERS, PASSES, ndvi=False), "three-ndvi": ndvi(),
    "far-ndvi": ndvi(FAR), "long": sheet((), ((600, 2400),), ndvi=False),
    "four": sheet(FOUR, BETWEEN, ndvi=False),
    "without-third": sheet((*FOUR[:2], FOUR[3]), BETWEEN, ndvi=False),
    "two": sheet(COVERS[:2], PASSES, ndvi=False), "none": sheet((), PASSES, ndvi=False),
    "walk": walks(("12:02:00", "12:04:00")),
    "walks": walks(("12:02:00", "12:04:00"), ("12:06:00", "12:07:00")),
    "short": walks(("12:02:00", "12:02:39")),
}
PAIRED = {"rednir-sky": "sky", "rednir-ground": "ground"}
ALIGNED = {"rednir-sky": GOOD, "rednir-ground": OTHER}
SEARCH = {"pair": {**FOUND, "search_s": 400}}


def case(said: str, logs: dict[str, str], clean: dict[str, str], clocks: dict[str, Any],
         sheet: str = "three", **more: Any) -> dict[str, Any]:
    return {"said": said, "logs": logs, "clean": clean, "clocks": clocks, "sheet": sheet, **more}


CASES: dict[str, dict[str, Any]] = {
    "an event off the line of two loggers": case(
        "off the line", PAIRED | {"rednir-ground": "ground.cover-moved"}, PAIRED, ALIGNED,
        "three-ndvi"),
    "an event off the written times": case(
        "off the line", {"pair": "pair.cover-moved"}, {"pair": "pair"}, {"pair": FOUND}),
    "a drift beyond 200 ppm": case(
        "beyond 200 ppm", {"rednir-sky": "sky.far", "rednir-ground": "ground.fast"},
        {"rednir-sky": "sky.far", "rednir-ground": "ground.far"}, ALIGNED, "far-ndvi"),
    "an offset beyond 12 h": case(
        "its offset of +50000 s is beyond 43200 s", PAIRED | {"rednir-ground": "ground.days-off"},
        PAIRED | {"rednir-ground": "ground.hours-off"},
        {"rednir-sky": GOOD, "rednir-ground": {"offset_s": LATE_S, "u_s": 1}}, "three-ndvi",
        clean_clocks={"rednir-sky": GOOD, "rednir-ground": {"offset_s": NEAR_S, "u_s": 1}}),
    "one event and nothing to correlate": case(
        "1 of 3 covers show", PAIRED | {"rednir-ground": "ground.one-cover"}, PAIRED, ALIGNED,
        "three-ndvi"),
    "events in one logger only": case(
        "the covers show in rednir-ground only, not in rednir-sky",
        PAIRED | {"rednir-sky": "sky.no-cover"}, PAIRED, ALIGNED, "three-ndvi"),
    "one event after a reset": case(
        "1 of 3 covers show in its records, and 2 are needed", {"pair": "pair.set-back-one"},
        {"pair": "pair.set-back"}, SEARCH, "without-third", clean_sheet="four"),
    "a declared clock that steps back": case(
        "steps back to", {"pair": "pair.set-back-open"}, {"pair": "pair.open"}, {"pair": GOOD},
        "none"),
    "a pass beyond the events": case(
        "clock extrapolated", {"pair": "pair.two"}, {"pair": "pair"}, {"pair": FOUND}, "two",
        clean_sheet="three"),
    "an hour of zone": case(
        "follows the clear sky", {"pair": "pair.wrong-hour"}, {"pair": "pair.hours"},
        {"pair": GOOD}, "long"),
    "an edge that disagrees": case(
        "edge disagrees (start +30 s)", {"thermal": "thermal.late"}, {"thermal": "thermal"}, {},
        "walk", sheet_u_s=5.0),
    "a pass without a record": case(
        "row 2: thermal holds no record during the pass", {"thermal": "thermal.gap"},
        {"thermal": "thermal"}, {}, "walks", sheet_u_s=5.0),
    "records that miss every pass": case(
        "miss every pass it serves", {"thermal": "thermal.elsewhere"}, {"thermal": "thermal"}, {},
        "walk", sheet_u_s=5.0),
    "a pass too short": case(
        "28 s of the pass lie between its uncertain edges, less than 30 s",
        {"thermal": "thermal"}, {"thermal": "thermal"}, {}, "short", sheet_u_s=5.0,
        clean_sheet="walk"),
}


def files() -> dict[str, str]:
    """Return the text of every file by its name."""
    out = {f"{name}.csv": text for name, text in FILES.items()}
    out |= {f"sheet.{name}.csv": [",".join(SHEET), *(
        ",".join(one.get(key, "") for key in SHEET) for one in rows)]
        for name, rows in SHEETS.items()}
    return {name: "\n".join([*text, ""]) for name, text in out.items()} | {
        "cases.yml": yaml.safe_dump(CASES, sort_keys=False)}


if __name__ == "__main__":
    FOLDER.mkdir(parents=True, exist_ok=True)
    for name, text in files().items():
        (FOLDER / name).write_text(text, encoding="utf-8")
    sys.stdout.write(f"{len(files())} files of {DAY}\n")
