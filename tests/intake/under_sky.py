"""Invented loggers under one sky, each with a clock of its own, for the tests of clocks.

The light is the clear sky of the site (the package's own, of which only its course matters) times
a random course of clouds where a test asks for them.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
from scipy.signal import lfilter
from small_survey import ALBEDO, DAY, NDVI, SITE, lines, row, small

from surveykit.intake.aligning import Ingested, align, read_logs
from surveykit.intake.params import Parameters
from surveykit.physics.sun import sun_track

START = np.datetime64(f"{DAY}T12:00:00", "ns").astype("int64")
NS = 10**9
COVERS = ((60.0, 71.3), (1200.4, 1210.9), (2400.7, 2412.2))  # seconds after 12:00
LAST_S = 2700
PASSES = ((300, 420), (600, 720), (1500, 1620), (1800, 1920))
SCALE = {"sky": 1.0, "ground": 0.2, "rednir-sky.red": 0.08, "rednir-sky.nir": 0.055,
         "rednir-ground.red": 0.004, "rednir-ground.nir": 0.02}


def clock_text(second: float) -> str:
    return str(np.datetime64(DAY, "s") + 12 * 3600 + int(round(second)))[11:]


def sky(true_s: np.ndarray, *, cloudy: bool) -> np.ndarray:
    """Return the irradiance [W m-2] at seconds after 12:00 UTC."""
    grid = np.arange(-14400, 14400.0)
    sun = sun_track(START + (grid * NS).astype("int64"), SITE["latitude"], SITE["longitude"],
                    SITE["elevation_m"])
    values = sun.clear_sky_w_m2
    if cloudy:
        rng = np.random.default_rng(20251)
        course = lfilter([1.0], [1.0, -0.98], rng.standard_normal(grid.size))
        values = values * np.clip(0.65 + 0.09 * course, 0.15, 1.05)
    return np.interp(true_s, grid, values)


def log(name: str, *, offset_s: float = 0.0, drift_ppm: float = 0.0, covers: Any = COVERS,
        cloudy: bool = False, n: int = LAST_S, first_s: float = 0.0,
        shift_s: float = 0.0) -> list[str]:
    """Return a logger's file: at its time t it shows the light of t + offset + drift t.

    `shift_s` moves the whole course of light, as a wrong zone does.
    """
    logged = first_s + np.arange(n, dtype=float)
    true = logged + offset_s + drift_ppm * 1e-6 * logged
    light = sky(true + shift_s, cloudy=cloudy)
    for start, stop in covers:
        light[(true >= start) & (true < stop)] = 0.0
    rng = np.random.default_rng([*name.encode()])
    columns = {"pair": ("sky", "ground"), "rednir-sky": ("red", "nir"),
               "rednir-ground": ("red", "nir")}[name]
    given = {}
    for column in columns:
        scale = SCALE.get(column, SCALE.get(f"{name}.{column}", 1.0))
        noise = 1 + 0.004 * rng.standard_normal(n)
        given[column] = scale * (light * noise + 0.3 * rng.standard_normal(n))
    return lines(name, start=clock_text(first_s), n=n, **given)


def sheet(covers: Any = COVERS, passes: Any = PASSES, *, ndvi: bool = True) -> list[dict[str, str]]:
    rows = [row(entry="cover", start=clock_text(a), stop=clock_text(b)) for a, b in covers]
    for number, (start, stop) in enumerate(passes):
        times = {"start": clock_text(start), "stop": clock_text(stop), "patch": f"C{number}"}
        rows.append(row(**ALBEDO, **times))
        if ndvi:
            rows.append(row(**NDVI, **times))
    return rows


def survey(root: Path, logs: dict[str, list[str] | list[list[str]]], clocks: dict[str, Any], *,
           rows: list[dict[str, str]] | None = None, **sections: Any) -> Ingested:
    """Write a survey, bring it onto one time line as the pipeline does."""
    parameters = written(root, logs, clocks, rows=rows, **sections)
    return align(parameters, *read_logs(parameters))


def written(root: Path, logs: dict[str, list[str] | list[list[str]]], clocks: dict[str, Any], *,
            rows: list[dict[str, str]] | None = None, **sections: Any) -> Parameters:
    if rows is None:
        rows = sheet(ndvi="rednir-sky" in logs)
    uses = {name: {"files": f"{name}_*.csv"} | (
        {"clock": clocks[name]} if clocks.get(name) is not None else {}) for name in logs}
    return small(root, rows, logs, loggers=uses, **sections).parameters
