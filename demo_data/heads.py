"""The instruments of Pellowick Yard: what each would log of a known world, errors included.

Every error here is one that the reduction corrects or carries in its budget; `shared_error` names
what it belongs to. Signs follow the field sheet and the parameter files: seconds to ADD to a
logger's time, value = offset + gain x reading.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from yard import (
    BEAM,
    ICE_K,
    STEP_S,
    World,
    brightness_k,
    follow,
    pattern,
    radiance,
    shared_error,
    stream,
    true_emissivity,
    wander,
)

Series = dict[str, np.ndarray]


@dataclass(frozen=True)
class Stay:
    """The head on one patch, pressed to the ground or walked over it, from start to stop."""

    visit: int
    turn: int  # 1, 2, 3
    surface: str
    patch: str
    kind: str  # contact | walk | lanes
    start_s: float
    stop_s: float
    height_m: float  # as on the sheet; 0 in contact
    effect_k: float  # what this patch and this pass have that the kind of ground has not
    effect_albedo: float
    effect_green: float
    dwells: tuple[tuple[float, float], ...]
    lanes: int = 0  # of the infrared head alone, each returning


@dataclass(frozen=True)
class Swap:
    """The shortwave pair over one spot as it is used, then turned over, on a stand."""

    number: int
    surface: str
    patch: str
    height_m: float
    normal: tuple[float, float]
    inverted: tuple[float, float]


@dataclass(frozen=True)
class Log:
    """What one logger holds: the true time of each record, its own time, its readings."""

    logger: str
    true_s: np.ndarray
    logged_s: np.ndarray
    columns: Series


CLOCKS = {"thermal": (12.0, 0.5), "shortwave": (-4.0, 0.5), "rednir-sky": (3.0, 0.3),
          "rednir-ground": (-6.5, 0.3), "weather": (0.0, 0.5)}  # seconds to add, u
DRIFT_PPM = {"thermal": 38.0, "rednir-ground": -24.0}  # of the clocks that covers must find
GAINS = {"sky_mV": (10.4, 0.015, 3.0), "ground_mV": (10.1, 0.015, 1.0),  # W m-2 per unit, u, W m-2
         "red_sky": (0.0042, 0.01, 0.02), "nir_sky": (0.0038, 0.01, 0.02),
         "red_ground": (0.0043, 0.01, 0.02), "nir_ground": (0.0039, 0.01, 0.02)}
CALIBRATIONS = {"sky_mV": "shortwave-2025-01", "ground_mV": "shortwave-2025-01",
                "red_sky": "rednir-sky-2025-01", "nir_sky": "rednir-sky-2025-01",
                "red_ground": "rednir-ground-2025-01", "nir_ground": "rednir-ground-2025-01"}
HEAD_RADIUS_M = 0.012
HELD_S = 6.0  # that a position lasts beyond its written times
BORE, BORE_U = 0.95, 0.06
BANDS = {"red": (0.0735, 0.83), "nir": (0.0550, 0.89)}  # share of the irradiance, share of beam


def clock(campaign: str, logger: str) -> tuple[float, float]:
    """Return the seconds to add to a logger's time as the world begins, and their rate."""
    offset, u = CLOCKS[logger]
    return (offset + shared_error(f"{campaign}:{logger}:clock", u),
            1e-6 * DRIFT_PPM.get(logger, 0.0))


def record(world: World, logger: str, rate_hz: float, series: Series) -> Log:
    """Read the smooth series at the logger's own ticks."""
    offset, drift = clock(world.day.campaign, logger)
    first = np.ceil((world.time_s[0] - offset + 2) * rate_hz) / rate_hz
    logged = np.arange(first, world.time_s[-1] - offset - 2, 1 / rate_hz)
    true = logged + offset + drift * (logged - world.time_s[0])
    return Log(logger, true, logged,
               {name: np.interp(true, world.time_s, values) for name, values in series.items()})


def respond(values: np.ndarray, time_constant_s: float) -> np.ndarray:
    """Return the first-order response of a head."""
    memory = float(np.exp(-STEP_S / time_constant_s))
    return follow((1 - memory) * (values - values[0]), memory) + values[0]


def noise(world: World, column: str, n: int, sd: float) -> np.ndarray:
    return sd * stream(world.day.date, column, "noise").standard_normal(n)


def square_share(size_m: tuple[float, float], height_m: float) -> float:
    """Return the share of a cosine head's view that a rectangle below its middle fills."""
    a, b = size_m[0] / 2, size_m[1] / 2
    p, q = np.hypot(a, height_m), np.hypot(b, height_m)
    return float(2 / np.pi * (a / p * np.arctan(b / p) + b / q * np.arctan(a / q)))


def shade_share(height_m: float, cos_zenith: np.ndarray) -> np.ndarray:
    """Return the share of the light that a small head takes from its own view (r << h)."""
    ratio = (HEAD_RADIUS_M / height_m) ** 2
    return ratio * (BEAM * cos_zenith**4 + (1 - BEAM) / 3)


def thermal(world: World, stays: list[Stay], covers: list[tuple[float, float]]) -> Log:
    """The infrared head: brightness in contact and stand-off, its body, its swings between."""
    day, date, n = world.day, world.day.date, world.time_s.size
    elapsed = world.time_s - world.time_s[0]
    body = world.air_k + 4 + 6 * (1 - np.exp(-elapsed / 3000))
    bore = float(np.clip(BORE + shared_error("thermal-2025-02:bore", BORE_U), 0.85, 0.99))
    carried = world.temperature_k["worn-asphalt"] - 4 + 2 * wander(stream(date, "carried"), n, 20)
    seen = brightness_k(0.95 * radiance(carried) + 0.05 * world.background)
    texture = wander(stream(date, "texture"), n, 2.5)
    for stay in stays:
        surface = day.surfaces[stay.surface]
        part = world.between(stay.start_s, stay.stop_s)
        local = world.temperature_k[stay.surface][part] + stay.effect_k
        emissivity = true_emissivity(stay.surface, surface)
        if stay.kind != "contact":
            walked = (world.time_s[part] - stay.start_s) / (stay.stop_s - stay.start_s)
            local = local + surface.spread_k * (pattern(
                stay.patch, surface.size_m, stay.lanes, walked) if stay.lanes else texture[part])
            seen[part] = brightness_k(emissivity * radiance(local)
                                      + (1 - emissivity) * world.background[part])
            continue
        rng = stream(date, stay.patch, stay.turn, "dwells")
        since = world.time_s[part] - stay.start_s
        swing, spot = np.zeros(local.size), np.zeros(local.size)
        absorbed = (1 - world.albedo(surface)[part]) * world.irradiance[part]
        last = 0.0
        gone = stay.stop_s - stay.start_s + STEP_S  # lifted for good after the last placement
        for start, stop in (*stay.dwells, (gone, gone)):
            lifted = (since >= last) & (since < start)
            phase = (since[lifted] - last) / max(start - last, STEP_S)
            swing[lifted] = -rng.uniform(10, 24) * np.sin(np.pi * phase)
            spot[since >= last] = surface.spread_k * rng.standard_normal()
            under = (since >= start) & (since < stop)  # Carslaw & Jaeger: a step of flux
            spot[under] -= (2 * absorbed[under] / surface.effusivity
                            * np.sqrt((since[under] - start) / np.pi))
            last = stop
        wall = ((1 - surface.rim_gap) * bore * radiance(body[part])
                + surface.rim_gap * world.sky[part])
        cavity = 1 - (1 - emissivity) * (1 - bore)
        seen[part] = swing + brightness_k(
            (emissivity * radiance(local + spot) + (1 - emissivity) * wall) / cavity)
    for start, stop in covers:
        part = world.between(start, stop)
        seen[part] = world.air_k[part] + 2  # a board from the shade
    log = record(world, "thermal", 2.0, {"target": respond(seen, 0.3), "body": body})
    size = log.true_s.size
    log.columns["target"] += (noise(world, "target", size, 0.08) - ICE_K
                              + shared_error("thermal-2025-02:target:offset", 0.2))
    log.columns["body"] += (noise(world, "body", size, 0.03) - ICE_K
                            + shared_error("thermal-2025-02:body:offset", 0.5))
    return log


def level(world: World, stays: list[Stay], pole: str, beam: float,
          swaps: list[Swap] | None = None) -> np.ndarray:
    """Return the relative error of an up head that is carried, not fixed: 1 deg on a pass."""
    tilt = 2.0 * wander(stream(world.day.date, pole, "sway"), world.time_s.size, 8.0)
    jitter = 0.3 * wander(stream(world.day.date, pole, "jitter"), world.time_s.size, 1.0)
    for stay in stays:
        if stay.kind == "walk":
            rng = stream(world.day.date, pole, stay.patch, stay.turn, "tilt")
            tilt[world.between(stay.start_s - 4, stay.stop_s + 4)] = (
                rng.standard_normal() * np.sqrt(0.5))
    for swap in swaps or ():  # on a stand, levelled each time
        for number, (start, stop) in enumerate((swap.normal, swap.inverted)):
            part = world.between(start - HELD_S, stop + HELD_S)
            rng = stream(world.day.date, pole, "swap", swap.number, number)
            tilt[part], jitter[part] = 0.15 * rng.standard_normal(), 0.0
    angle = np.radians(tilt + jitter)
    tangent = np.sqrt(1 / world.cos_zenith**2 - 1)
    return beam * (np.cos(angle) + np.sin(angle) * tangent - 1)


def ground(world: World, stays: list[Stay], swaps: list[Swap] | None = None) -> Series:
    """Return the albedo and the red and near-infrared reflectance that the down heads see."""
    date, n = world.day.date, world.time_s.size
    blur = wander(stream(date, "brightness"), n, 3.0)
    green = wander(stream(date, "green"), n, 3.0)
    seen = {"albedo": 0.17 + 0.02 * wander(stream(date, "between"), n, 6.0)}
    seen["red"], seen["nir"] = 0.7 * seen["albedo"], 1.2 * seen["albedo"]
    for stay in stays:
        if stay.kind != "walk":
            continue
        surface = world.day.surfaces[stay.surface]
        part = world.between(stay.start_s, stay.stop_s)
        sun = world.cos_zenith[part]
        bright = (1 + stay.effect_albedo + surface.spread_albedo * blur[part])
        greener = stay.effect_green + surface.spread_green * green[part]
        held = stay.height_m + 0.01 * stream(date, stay.patch, stay.turn, "height").normal()
        share = square_share(surface.size_m, held)
        around = surface.around + shared_error(f"around:{stay.surface}", surface.around_u)
        seen["albedo"][part] = (world.albedo(surface)[part] * bright
                                * (share - shade_share(held, sun)) + (1 - share) * around)
        zenith = world.albedo(surface)[part] / surface.albedo
        seen["red"][part] = surface.red * zenith * bright * (1 - greener)
        seen["nir"][part] = surface.nir * zenith * bright * (1 + greener)
    for swap in swaps or ():
        surface = world.day.surfaces[swap.surface]
        share = square_share(surface.size_m, swap.height_m)
        around = surface.around + shared_error(f"around:{swap.surface}", surface.around_u)
        for start, stop in (swap.normal, swap.inverted):
            part = world.between(start - HELD_S, stop + HELD_S)
            seen["albedo"][part] = (1 - share) * around + world.albedo(surface)[part] * (
                share - shade_share(swap.height_m, world.cos_zenith[part]))
    return seen


def counted(world: World, column: str, truth: np.ndarray, light: np.ndarray,
            time_constant_s: float, dark: float,
            zero_factor: np.ndarray | float = 1.0) -> np.ndarray:
    """Return the reading of one head: its zero error, gain error, dark reading and lag.

    `light` is 1 where the head is open and 0 under its cap; a cap shows the dark reading only.
    `zero_factor` is what turning the head does to its zero, which comes of a cold sky above it.
    """
    gain, gain_u, offset_u = GAINS[column]
    calibration = CALIBRATIONS[column]
    zero = shared_error(f"{calibration}:{column}:offset", offset_u)
    gain *= 1 + shared_error(f"{calibration}:{column}:gain", gain_u)
    drift = 1 + 0.2 * np.linspace(-1, 1, light.size)
    return respond((truth + zero * zero_factor) * light, time_constant_s) / gain + dark * drift


def shortwave(world: World, stays: list[Stay], light: np.ndarray, swaps: list[Swap]) -> Log:
    """The up/down pair; a head's directional error stays within 2 % of the beam.

    In a swap's second half each head looks where the other did.
    """
    turned = np.zeros(light.size, dtype=bool)
    for swap in swaps:
        turned[world.between(swap.inverted[0] - HELD_S, swap.inverted[1] + HELD_S)] = True
    tilted = level(world, stays, "shortwave", BEAM, swaps)
    below = world.irradiance * ground(world, stays, swaps)["albedo"]
    columns = {}
    for column, dark, up in (("sky_mV", -0.42, ~turned), ("ground_mV", 0.21, turned)):
        facing = shared_error(f"shortwave-2025-01:{column}:directional", 0.5, 1.0)
        directional = BEAM * np.clip(0.02 * facing / world.cos_zenith, -0.02, 0.02)
        truth = np.where(up, world.irradiance * (1 + directional + tilted), below)
        factor = np.where(turned, 1 / 3 if column == "sky_mV" else 3.0, 1.0)
        columns[column] = counted(world, column, truth, light, 1.0, dark, factor)
    log = record(world, "shortwave", 1.0, columns)
    for column, sd in (("sky_mV", 0.02), ("ground_mV", 0.008)):
        log.columns[column] += noise(world, column, log.true_s.size, sd)
    return log


def red_near_infrared(world: World, stays: list[Stay], light: np.ndarray) -> tuple[Log, Log]:
    """The red and near-infrared heads, up on one logger and down on another."""
    seen = ground(world, stays)
    up, down = {}, {}
    for band, (share, beam) in BANDS.items():
        incoming = share * world.irradiance
        sky = incoming * (1 + level(world, stays, "rednir", beam))
        up[f"{band}_sky"] = counted(world, f"{band}_sky", sky, light, 0.5, 31.0)
        down[f"{band}_ground"] = counted(world, f"{band}_ground", incoming * seen[band], light,
                                         0.5, 24.0)
    logs = (record(world, "rednir-sky", 1.0, up), record(world, "rednir-ground", 1.0, down))
    for log in logs:
        for column in log.columns:
            log.columns[column] += noise(world, column, log.true_s.size, 1.8)
    return logs


def weather(world: World) -> Log:
    """The station on its mast, once a minute."""
    air = world.air_k - ICE_K + shared_error("weather:air", 0.3)
    humidity = 100 * world.humidity + shared_error("weather:humidity", 3.0)
    wind = world.wind_m_s * (1 + shared_error("weather:wind", 0.03))
    log = record(world, "weather", 1 / 60, {"air": air, "humidity": humidity, "wind": wind})
    for column, sd in (("air", 0.08), ("humidity", 0.4), ("wind", 0.2)):
        log.columns[column] += noise(world, column, log.true_s.size, sd)
    log.columns["wind"] = np.maximum(log.columns["wind"], 0.0)
    return log
