"""What is true of Pellowick Yard, written beside the demo: surfaces, passes, changes, errors."""

from __future__ import annotations

import json

import numpy as np
from heads import CLOCKS, Stay, clock
from yard import CONTROL, ERRORS, ICE_K, SEED, Day, Surface, World

QUANTITIES = (("temperature", "contact", "contact", "degC"),
              ("temperature", "stand-off", "walk", "degC"),
              ("albedo", "clear", "walk", "1"), ("ndvi", "", "walk", "1"))
WORDS = {"contact": "contact", "stand-off": "standoff", "clear": "albedo", "": "ndvi"}
Done = tuple[Day, World, list[Stay]]
Rows = list[dict[str, object]]


def ndvi(red: float, nir: float) -> float:
    return (nir - red) / (nir + red)


def counts(stay: Stay, quantity: str, how: str) -> bool:
    """Return whether a stay is a pass of this quantity and kind; along lanes, temperature only."""
    return stay.kind == how or (stay.kind == "lanes" and (quantity, how) == ("temperature", "walk"))


def truth_series(world: World, name: str, quantity: str, as_on: Day) -> np.ndarray:
    """Return the true series of a kind of ground in this world, with its properties of `as_on`."""
    surface = as_on.surfaces[name]
    if quantity == "temperature":
        return world.balance(name, surface) - ICE_K
    if quantity == "albedo":
        return world.albedo(surface)
    return np.full(world.time_s.size, ndvi(surface.red, surface.nir))


def own_value(value: float, stay: Stay, quantity: str, surface: Surface) -> float:
    """Return the true value of one pass: the kind of ground with this patch's and pass's own."""
    if quantity == "temperature":
        return value + stay.effect_k
    if quantity == "albedo":
        return value * (1 + stay.effect_albedo)
    return ndvi(surface.red * (1 - stay.effect_green), surface.nir * (1 + stay.effect_green))


def over(world: World, values: np.ndarray, stays: list[Stay]) -> float:
    """Return the mean over the passes of the time mean within each."""
    return float(np.mean([world.mean(values, stay.start_s, stay.stop_s) for stay in stays]))


def truths(done: list[Done]) -> dict[str, Rows]:
    """Return the true surfaces, passes and changes, one row each, keyed as the tables are."""
    tables: dict[str, Rows] = {"surfaces": [], "passes": [], "changes": []}
    for number, (day, world, stays) in enumerate(done):
        for quantity, kind, how, unit in QUANTITIES:
            everyone = [stay for stay in stays if counts(stay, quantity, how)]
            for name, surface in day.surfaces.items():
                mine = [stay for stay in everyone if stay.surface == name]
                series = truth_series(world, name, quantity, day)
                key = {"campaign": day.campaign, "surface": name, "quantity": quantity,
                       "kind": kind}
                cos = over(world, world.cos_zenith, mine)
                tables["surfaces"].append({
                    **key, "unit": unit, "value": _round(over(world, series, mine)),
                    "value_common_time": _round(over(world, series, everyone)),
                    "zenith_deg": round(float(np.degrees(np.arccos(cos))), 3)})
                tables["passes"] += [
                    {**key, "patch": stay.patch, "pass": f"{stay.patch}-{WORDS[kind]}-{stay.turn}",
                     "start_s": round(stay.start_s, 2), "stop_s": round(stay.stop_s, 2),
                     "value": _round(own_value(over(world, series, [stay]), stay, quantity,
                                               surface))} for stay in mine]
                tables["changes"] += [{**key, **change(done[number], earlier, name, quantity, how)}
                                      for earlier in done[:number]]
    return tables


def change(later: Done, earlier: Done, name: str, quantity: str, how: str) -> dict[str, object]:
    """Return how one kind of ground changed between two days, at its own pass times."""
    (day, world, stays), (before, world_before, stays_before) = later, earlier
    mine, theirs = ([stay for stay in some if stay.surface == name and counts(stay, quantity, how)]
                    for some in (stays, stays_before))
    now = over(world, truth_series(world, name, quantity, day), mine)
    had = over(world, truth_series(world, name, quantity, before), mine)
    was = over(world_before, truth_series(world_before, name, quantity, before), theirs)
    row: dict[str, object] = {"unit": "K" if quantity == "temperature" else "1",
                              "earlier": before.campaign, "change": _round(now - had),
                              "raw_change": _round(now - was)}
    if quantity == "albedo":
        row["change_at_45_deg"] = _round(day.surfaces[name].albedo - before.surfaces[name].albedo)
    return row


def _round(value: float) -> float:
    return round(value, 6) + 0.0


def clocks(done: list[Done]) -> Rows:
    """Return the true clocks: seconds to add at `from_s` (seconds since 1970 UTC), and drift."""
    rows: Rows = []
    for day, world, _ in done:
        for name in CLOCKS:
            offset, drift = clock(day.campaign, name)
            rows.append({"campaign": day.campaign, "logger": name, "offset_s": _round(offset),
                         "drift_ppm": _round(1e6 * drift), "from_s": _round(world.time_s[0])})
    return rows


def truth_file(tables: dict[str, Rows], faults: Rows, clocks: Rows) -> bytes:
    """Return truth.json, one row a line."""
    about = ("temperature degC, its changes K. surfaces.value: the kind of ground (random part of "
             "patch and pass zero) over its own pass times; value_common_time: over the times of "
             "all passes of that kind. changes.change: against what the surface would have been at "
             "the later date with its earlier properties; raw_change: later value - earlier value. "
             "errors: what was drawn once per scope, in the unit of its u.")
    parts = {**tables, "faults": faults, "clocks": clocks,
             "errors": [{"scope": scope, **ERRORS[scope]} for scope in sorted(ERRORS)]}
    lines = [f'{{"seed": {SEED}, "control": "{CONTROL}",', f' "about": {json.dumps(about)},']
    for name, rows in parts.items():
        body = ",\n".join("  " + json.dumps(row) for row in rows)
        lines.append(f' "{name}": [\n{body}\n ],')
    return ("\n".join(lines).removesuffix(",") + "\n}\n").encode()
