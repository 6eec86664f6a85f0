"""Write the demo: three survey days at an invented schoolyard, with the truth beside them.

    python demo_data/make_demo.py            rewrites everything under demo_data/, byte for byte
    python demo_data/make_demo.py --check    says what on disk differs, and fails if anything does
"""

from __future__ import annotations

import sys
import warnings
from datetime import datetime
from pathlib import Path

import numpy as np
from heads import Log, Stay, Swap, red_near_infrared, shortwave, thermal, weather
from logs import ZONE, Faults, files, freeze, spoil, texts
from truth import clocks, truth_file, truths
from yard import DAYS, Day, World, shared_error, solar_noon, stream

HERE = Path(__file__).resolve().parent
ROUND = ("A1", "C1", "L1", "C2", "L2", "A2", "B1", "K1", "A3", "L3", "C3", "L4", "C4", "A4")
HEIGHTS_M = {"A": 0.40, "C": 0.40, "L": 0.45, "B": 0.35, "K": 0.40}
BEFORE_NOON_S, LEAD_S, TAIL_S = 55 * 60.0, 480.0, 800.0
SWAPS, SWAP_S, TURN_S = 3, 70.0, 15.0
HEADER = ("entry,surface,patch,quantity,mode,instrument,start,stop,height_cm,width_m,length_m,"
          "lanes,reading,reading_u,note,date,campaign").split(",")
PATCH_SHARE, PASS_SHARE = 0.6, 0.3  # of the spread within a patch
LANES, LANES_S, MAPPED = 8, 160.0, "L2"  # the last day's patch that is walked lane by lane
CAPPED = ("shortwave", "rednir-sky", "rednir-ground")


def schedule(day: Day) -> list[Stay]:
    """Return what the crew does: A to Z, Z to A, A to Z, the control first, midway and last."""
    rng = stream(day.date, "schedule")
    surfaces = {patch: name for name, s in day.surfaces.items() for patch in s.patches}
    now = solar_noon(day.date) - BEFORE_NOON_S
    stays: list[Stay] = []
    visits = (*ROUND, *ROUND[::-1], *ROUND)
    for visit, patch in enumerate(visits):
        if day is DAYS[-1] and visit == len(visits) - 1:  # before the control's last visit
            stays.append(Stay(visit, 4, surfaces[MAPPED], MAPPED, "lanes", now, now + LANES_S,
                              HEIGHTS_M[MAPPED[0]], *effects(day, surfaces[MAPPED], MAPPED, 4,
                                                             "lanes"), (), LANES))
            now += LANES_S + rng.uniform(30, 40)
        turn, surface = visit // len(ROUND) + 1, surfaces[patch]
        contact, dwells, since = rng.uniform(68, 72), [], 0.0
        while since + 4.0 < contact:
            stop = min(since + rng.uniform(6.0, 7.5), contact)
            dwells.append((since, stop))
            since = stop + rng.uniform(1.3, 1.7)
        for kind, length in (("contact", contact), ("walk", rng.uniform(97, 103))):
            stays.append(Stay(visit, turn, surface, patch, kind, now, now + length,
                              HEIGHTS_M[patch[0]] if kind == "walk" else 0.0,
                              *effects(day, surface, patch, turn, kind),
                              tuple(dwells) if kind == "contact" else ()))
            now += length + (rng.uniform(11, 14) if kind == "contact" else rng.uniform(30, 40))
    return stays


def effects(day: Day, name: str, patch: str, turn: int, kind: str) -> tuple[float, float, float]:
    """Return what is this patch's and this pass's own: K, relative albedo, relative greenness."""
    surface = day.surfaces[name]
    spread = np.array([surface.spread_k, surface.spread_albedo, surface.spread_green])
    patch_z = stream("patch", patch).standard_normal(3) * (len(surface.patches) > 1)
    pass_z = stream(day.date, "pass", patch, turn, kind).standard_normal(3)
    own = spread * (PATCH_SHARE * patch_z + PASS_SHARE * pass_z)
    return float(own[0]), float(own[1]), float(own[2])


def clock_text(second: float) -> str:
    moment = datetime.fromtimestamp(round(second), tz=ZONE)
    return f"{moment.hour}:{moment:%M:%S}"


def sheet(day: Day, stays: list[Stay], caps: list[tuple[float, float]],
          covers: list[tuple[float, float]], swaps: list[Swap]) -> bytes:
    """Return the field sheet: written by hand, 2 s either way, by a watch of its own."""
    rng = stream(day.date, "sheet")
    watch = shared_error(f"{day.campaign}:watch", 1.0)
    sized: set[str] = set()
    rows: list[tuple[float, dict[str, str]]] = []
    free = 0.0
    for start, stop in caps:
        for logger in CAPPED:
            rows.append((start, {"entry": "dark", "instrument": logger,
                                 "start": clock_text(start - watch),
                                 "stop": clock_text(stop - watch)}))
    called = stream(day.date, "covers called")  # read off the watch as it happens, not from memory
    for cover in covers:
        start, stop = (clock_text(edge - watch + 0.3 * called.standard_normal()) for edge in cover)
        rows.append((cover[0], {"entry": "cover", "start": start, "stop": stop}))
    for swap in swaps:
        for word, (start, stop) in (("normal", swap.normal), ("inverted", swap.inverted)):
            rows.append((start, {"entry": "swap", "surface": swap.surface, "patch": swap.patch,
                                 "instrument": "shortwave", "start": clock_text(start - watch),
                                 "stop": clock_text(stop - watch), "reading": word,
                                 "height_cm": f"{100 * swap.height_m:.0f}"}))
    for stay in stays:
        start = max(stay.start_s - watch + 2 * rng.standard_normal(), free + 2)
        stop = free = stay.stop_s - watch + 2 * rng.standard_normal()
        common = {"entry": "pass", "surface": stay.surface, "patch": stay.patch,
                  "start": clock_text(start), "stop": clock_text(stop)}
        if stay.patch not in sized:
            width, length = day.surfaces[stay.surface].size_m
            common |= {"width_m": f"{width:g}", "length_m": f"{length:g}"}
            sized.add(stay.patch)
        if stay.kind == "contact":
            rows.append((stay.start_s, {**common, "quantity": "temperature", "mode": "contact",
                                        "reading": str(len(stay.dwells))}))
            continue
        common["height_cm"] = f"{100 * stay.height_m:.0f}"
        if stay.lanes:
            common["lanes"] = str(stay.lanes)
        for quantity in ("temperature", "albedo", "ndvi")[:1 if stay.lanes else 3]:
            mode = {"mode": "stand-off"} if quantity == "temperature" else {}
            rows.append((stay.start_s, {**common, **mode, "quantity": quantity}))
    if day is DAYS[0]:
        first = next(row for at, row in rows if at == stays[1].start_s
                     and row["quantity"] == "albedo")
        first["note"] = "hair-line cracks along one edge, kept off them"
    semicolons = day is DAYS[1]  # as another spreadsheet saves it
    separator = ";" if semicolons else ","
    lines = [separator.join(HEADER)]
    for _, row in sorted(rows, key=lambda row: row[0]):
        cells = {**row, "date": day.date, "campaign": day.campaign}
        lines.append(separator.join(_cell(cells.get(key, ""), separator) for key in HEADER))
    return "\n".join([*lines, ""]).encode("utf-8-sig" if semicolons else "utf-8")


def _cell(text: str, separator: str) -> str:
    return f'"{text}"' if separator in text else text


def covered(day: Day, stays: list[Stay]) -> list[tuple[float, float]]:
    """Return when all heads were covered at once: before the first pass, midway, after the last."""
    rng = stream(day.date, "covers")
    midway = [stay for stay in stays if stay.kind == "walk"][len(ROUND) + len(ROUND) // 2]
    starts = stays[0].start_s - 60, midway.stop_s + 10, stays[-1].stop_s + 40
    return [(start, start + rng.uniform(9.3, 12.6)) for start in starts]


def swapping(stays: list[Stay]) -> list[Swap]:
    """Return the swaps of the shortwave pair, after the day's last caps, over the last patch."""
    last, swaps = stays[-1], []
    for number in range(SWAPS):
        start = last.stop_s + 240 + number * 2 * (SWAP_S + TURN_S)
        again = start + SWAP_S + TURN_S
        swaps.append(Swap(number, last.surface, last.patch, HEIGHTS_M[last.patch[0]],
                          (start, start + SWAP_S), (again, again + SWAP_S)))
    return swaps


def cap_light(world: World, caps: list[tuple[float, float]],
              covers: list[tuple[float, float]]) -> np.ndarray:
    """Return 1 where the heads are open and 0 under covers and caps, put on 8 s around each row."""
    light = np.ones(world.time_s.size)
    for start, stop in covers:
        light[world.between(start, stop)] = 0.0
    for start, stop in caps:
        light[(world.time_s > start - 8) & (world.time_s < stop + 8)] = 0.0
    return light


def survey(day: Day) -> tuple[dict[str, bytes], World, list[Stay], Faults]:
    """Return the files of one survey day and the world that they were taken in."""
    stays = schedule(day)
    first, last = stays[0].start_s, stays[-1].stop_s
    world = World(day, first - LEAD_S, last + TAIL_S)
    caps = [(first - 240, first - 160), (last + 120, last + 200)]
    covers = covered(day, stays)
    light = cap_light(world, caps, covers)
    faults = Faults(day, stays)
    forgotten = faults.stay()  # both shortwave caps left on at the start of one pass
    left_on = light.copy()
    left_on[world.between(forgotten.start_s - 20, forgotten.start_s + 36)] = 0.0
    faults.note("shortwave", "capped", 36, forgotten)
    swaps = swapping(stays)
    pair = shortwave(world, stays, left_on, swaps)
    infrared = thermal(world, stays, covers)
    freeze(pair, "ground_mV", 20, faults)
    freeze(infrared, "target", 15, faults)
    station = weather(world)
    out = {"field_sheet.csv": sheet(day, stays, caps, covers, swaps),
           **files(station, texts(station))}
    loggers: tuple[Log, ...] = (infrared, pair, *red_near_infrared(world, stays, light))
    for log in loggers:
        out |= files(log, spoil(log, texts(log), faults))
    return out, world, stays, faults


def build() -> dict[str, bytes]:
    """Return every file of the demo, path under demo_data/ to content."""
    out: dict[str, bytes] = {}
    done, wrong = [], []
    for day in DAYS:
        written, world, stays, faults = survey(day)
        out |= {f"{day.campaign}/{name}": content for name, content in written.items()}
        done.append((day, world, stays))
        wrong += faults.noted
    out["truth.json"] = truth_file(truths(done), wrong, clocks(done))
    return out


def main(arguments: list[str]) -> int:
    # pvlib touches DatetimeIndex.dayofyear, deprecated in pandas 3.1
    warnings.filterwarnings("ignore", "DatetimeIndex.dayofyear")
    built = build()
    if arguments == ["--check"]:
        odd = [name for name, content in built.items()
               if not (HERE / name).is_file() or (HERE / name).read_bytes() != content]
        sys.stdout.write("".join(f"differs: {name}\n" for name in odd) or "demo is as committed\n")
        return 1 if odd else 0
    for name, content in built.items():
        (HERE / name).parent.mkdir(exist_ok=True)
        (HERE / name).write_bytes(content)
    total = sum(map(len, built.values()))
    sys.stdout.write(f"{len(built)} files, {total / 1e6:.2f} MB\n")
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
