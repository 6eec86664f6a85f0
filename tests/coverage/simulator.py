"""A survey of six surfaces on two dates, simulated apart from the package's own code paths.

Truths, weather and errors are drawn here; the readings follow by formulas of this file: Planck's
law summed over wavelengths, the balance of a grey surface under sky and walls, gains and zeros of
the heads. Only the names of inputs and the types that carry them are the package's. What is stated
as an uncertainty is what the errors are drawn with, no more and no less.

`plain` is what a spreadsheet makes of the same passes: the mean, sd / sqrt(n) twice over,
emissivity by the fourth root without the sky, the mean of the passes' ratios.
"""

# ruff: noqa: E402
from __future__ import annotations

import sys
from dataclasses import dataclass, field
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np

sys.path[:0] = [str(Path(__file__).parents[1]), str(Path(__file__).parents[1] / "evidence")]

from pass_values import ALBEDO_REST, LOGGERS, NDVI_REST, NS, THERMAL_REST, channel_of

from surveykit.core import Input
from surveykit.evidence.conditions import Sky
from surveykit.evidence.estimates import PassEstimate
from surveykit.evidence.models import MODELS
from surveykit.intake.passes import Pass

SURFACES = ("control", "paving", "gravel", "path", "coated", "worn")
QUANTITIES = ("temperature", "albedo", "ndvi")
RELEVANT = {"temperature": 1.0, "albedo": 0.02, "ndvi": 0.03}
CHANGED = {"coated": -2.0, "worn": 2.0}  # in relevant changes
# Scatter between passes and within one: temperature [K], albedo, NDVI.
SCATTER = {
    "clear": {"temperature": (0.4, 0.15), "albedo": (0.004, 0.0015), "ndvi": (0.008, 0.003)},
    "mixed": {"temperature": (1.0, 0.4), "albedo": (0.012, 0.004), "ndvi": (0.020, 0.008)},
}
FOLLOWS, DEPENDENCE, WIDER = 0.3, 0.1, "path"
FORM, GREEN = (0.01, 0.02), 0.3  # matched, partly matched; doubled above this NDVI
DATES = ("yard-2025-06-11", "yard-2025-07-16")

_WAVES = np.linspace(8e-6, 14e-6, 601)
_KELVIN = np.linspace(200.0, 400.0, 4001)
_SHAPE = np.exp(1.438777e-2 / np.outer(_KELVIN, _WAVES)) - 1
_RADIANCE = np.trapezoid(1.191043e-16 / _WAVES**5 / _SHAPE, _WAVES, axis=1)


def radiance(kelvin: Any) -> Any:
    return np.interp(kelvin, _KELVIN, _RADIANCE)


def kelvin_of(band_radiance: Any) -> Any:
    return np.interp(band_radiance, _RADIANCE, _KELVIN)


def sky_of(air_k: float, humidity: float) -> float:
    """Clear-sky radiance, 8-14 um, of the whole sky: Idso 1981 and Kimball et al. 1982."""
    celsius = air_k - 273.15
    vapour = humidity * 6.112 * np.exp(17.62 * celsius / (243.12 + celsius))
    zenith = 0.24 + 2.98e-8 * vapour**2 * np.exp(3000.0 / air_k)
    return float(zenith * (1.4 - 0.4 * zenith) * radiance(air_k))


@dataclass
class Simulated:
    """Two dates of passes, what was true, and the plain method's numbers."""

    passes: dict[str, list[PassEstimate]] = field(default_factory=lambda: {d: [] for d in DATES})
    value: dict[tuple[str, str, str], float] = field(default_factory=dict)
    at_common: dict[tuple[str, str, str], float] = field(default_factory=dict)
    change: dict[tuple[str, str], float] = field(default_factory=dict)
    plain: dict[tuple[str, str, str], tuple[float, float]] = field(default_factory=dict)


def simulate(seed: int, k: int, sky: str, wider: float = 1.0) -> Simulated:
    """Return one survey; `k` passes a surface, out and back; sky clear or mixed (broken).

    The passes of the surface `WIDER` scatter so many times as widely as those of the others.
    """
    rng = np.random.default_rng([seed, k, sky == "clear"])
    times = np.array([wider if s == WIDER else 1.0 for s in SURFACES])[:, None]
    made = Simulated()
    errors: dict[str, float] = {}

    def error(scope: str, law: str = "normal") -> float:
        if scope not in errors:
            errors[scope] = float(rng.standard_normal() if law == "normal"
                                  else rng.uniform(-np.sqrt(3), np.sqrt(3)))
        return errors[scope]

    hours = np.array([[11.0 + 0.25 * r + 0.035 * (j if r % 2 == 0 else 5 - j) for r in range(k)]
                      for j in range(6)])
    theta = np.concatenate([[1.0], rng.uniform(0.5, 1.2, 5)])
    albedo = rng.uniform(0.08, 0.4, 6)
    red = rng.uniform(0.05, 0.25, 6)
    index = rng.uniform(0.05, 0.7, 6)
    zeniths = rng.uniform(25.0, 50.0, 2)
    earlier: tuple[float, ...] = ()
    for number, date in enumerate(DATES):
        moved = np.array([CHANGED.get(s, 0.0) * number for s in SURFACES])
        light, wind = rng.uniform(500, 950), rng.uniform(0.5, 4.0)
        air, humidity = rng.uniform(293.0, 305.0), rng.uniform(0.25, 0.6)
        excess = rng.uniform(14.0, 30.0)
        zenith = zeniths[number]
        weather = Sky(light, 1.0 if sky == "clear" else 0.7, sky)

        # temperature
        tau, s = SCATTER[sky]["temperature"]
        seen = light, wind, float(np.cos(np.radians(zenith)))
        share = np.where(index > GREEN, 2, 1) * FORM[not _matched(seen, earlier, sky)]
        form = np.where(np.arange(6) > 0, share * excess * rng.standard_normal(6) * number, 0.0)
        earlier = seen
        mean = air + theta * excess + form + moved * RELEVANT["temperature"]
        slope = rng.normal(0.0, 0.7) * theta * (
            1 + np.where(np.arange(6) > 0, FOLLOWS * rng.standard_normal(6), 0.0))
        course = slope[:, None] * (hours - hours.mean())
        truth = mean[:, None] + course + tau * times * rng.standard_normal((6, k))
        emissivity = np.array([0.95 + 0.01 * error(f"emissivity:{n}") for n in SURFACES])[:, None]
        stated_air = air + 0.5 * error("kit:air:offset")
        stated_humidity = humidity + 0.05 * error("kit:humidity:offset")
        view = 0.95 + 0.05 * error(f"{date}:sky view", "rectangular")
        above = view * (1 + 0.15 * error(f"{date}:sky")) * sky_of(air, humidity)
        wall_k = stated_air + 10.0 * error(f"{date}:walls")
        around = above + (1 - view) * (0.92 * radiance(wall_k) + 0.08 * above / view)
        brightness = kelvin_of(emissivity * radiance(truth) + (1 - emissivity) * around)
        logged = brightness - 0.2 * error("kit:target:offset") + s * rng.standard_normal((6, k))
        fixed = {"band_low_um": 8.0, "band_high_um": 14.0, "walls_emissivity": 0.92,
                 "gain_reading": 30.0}
        uncertain = [
            ("offset_error", 0.0, 0.2, "kit:target:offset", "normal"),
            ("air_k", stated_air, 0.5, "kit:air:offset", "normal"),
            ("relative_humidity", stated_humidity, 0.05, "kit:humidity:offset", "normal"),
            ("sky_factor", 1.0, 0.15, f"{date}:sky", "normal"),
            ("sky_view", 0.95, 0.05, f"{date}:sky view", "rectangular"),
            ("walls_k", stated_air, 10.0, f"{date}:walls", "normal")]
        made.passes[date] += _passes(
            rng, date, "temperature", hours, weather, zenith, wind, s, THERMAL_REST, fixed,
            {"brightness_k": logged}, uncertain, 0.5, stated_air,
            per_surface=("emissivity", 0.95, 0.01))
        for j, name in enumerate(SURFACES):
            made.value[date, name, "temperature"] = float(mean[j] + course[j].mean())
            made.at_common[date, name, "temperature"] = float(mean[j])
            plain = logged[j] / 0.95**0.25
            made.plain[date, name, "temperature"] = _spread(plain)

        # albedo, at this date's sun
        tau, s = SCATTER[sky]["albedo"]
        turn = _turn(zenith, zeniths[0], DEPENDENCE)
        lean = np.array([error(f"zenith dependence:{n}") for n in SURFACES]) * number
        level = albedo * (1 + (turn - 1) * lean) + moved * RELEVANT["albedo"]
        patch = level[:, None] + tau * times * rng.standard_normal((6, k))
        down = light * rng.uniform(0.8, 1.1, (6, k))
        tilt = 1 + 0.006 * rng.standard_normal((6, k))
        up = patch * down
        logged_up = (up * (1 + s / albedo[:, None] * rng.standard_normal((6, k)))
                     - 1.0 * error(f"{date}:up:zero")) / (1 + 0.015 * error("kit:up:gain"))
        true_down = down * (1 + 0.01 * error("kit:down:direction", "rectangular")) * tilt
        logged_down = ((true_down - 3.0 * error(f"{date}:down:zero"))
                       / (1 + 0.015 * error("kit:down:gain")))
        uncertain = [
            ("up_gain_error", 0.0, 0.015, "kit:up:gain", "normal"),
            ("down_gain_error", 0.0, 0.015, "kit:down:gain", "normal"),
            ("up_zero_error", 0.0, 1.0, f"{date}:up:zero", "normal"),
            ("down_zero_error", 0.0, 3.0, f"{date}:down:zero", "normal"),
            ("directional_error", 0.0, 0.01, "kit:down:direction", "rectangular"),
            ("levelling_error", 0.0, 0.006, "", "normal")]
        made.passes[date] += _passes(
            rng, date, "albedo", hours, weather, zenith, wind, s, ALBEDO_REST, {},
            {"up": logged_up, "down": logged_down}, uncertain)
        for j, name in enumerate(SURFACES):
            made.value[date, name, "albedo"] = made.at_common[date, name, "albedo"] = \
                float(level[j])
            made.plain[date, name, "albedo"] = _spread(logged_up[j] / logged_down[j])

        # NDVI
        tau, s = SCATTER[sky]["ndvi"]
        level = index + moved * RELEVANT["ndvi"]
        patch = level[:, None] + tau * times * rng.standard_normal((6, k))
        noisy = patch + s * rng.standard_normal((6, k))
        reds = np.broadcast_to(red[:, None], (6, k)) * rng.uniform(0.9, 1.1, (6, k))
        nirs = reds * (1 + noisy) / (1 - noisy)
        gains = {n: 1 + 0.01 * error(f"kit:{n}:gain") for n in
                 ("red_up", "red_down", "nir_up", "nir_down")}
        read = {"red_up": 200 * reds / gains["red_up"], "nir_up": 200 * nirs / gains["nir_up"],
                "red_down": np.full((6, k), 200.0) / gains["red_down"],
                "nir_down": np.full((6, k), 200.0) / gains["nir_down"]}
        uncertain = [(f"{n}_gain_error", 0.0, 0.01, f"kit:{n}:gain", "normal") for n in gains]
        made.passes[date] += _passes(rng, date, "ndvi", hours, weather, zenith, wind, s, NDVI_REST,
                                     {}, read, uncertain)
        for j, name in enumerate(SURFACES):
            made.value[date, name, "ndvi"] = made.at_common[date, name, "ndvi"] = float(level[j])
            r, n = read["red_up"][j] / read["red_down"][j], read["nir_up"][j] / read["nir_down"][j]
            made.plain[date, name, "ndvi"] = _spread((n - r) / (n + r))
    for name in SURFACES:
        for quantity in QUANTITIES:
            made.change[name, quantity] = float(CHANGED.get(name, 0.0) * RELEVANT[quantity])
            # the sun's height stands in the interval of an albedo's change: it is no change
    return made


def _matched(now: tuple[float, ...], then: tuple[float, ...], sky: str) -> bool:
    """Whether irradiance, wind and sun height of two clear dates agree as far as is declared."""
    return bool(sky == "clear" and then and abs(now[0] / then[0] - 1) <= 0.10
                and abs(now[1] - then[1]) <= 1.0 and abs(now[2] - then[2]) <= 0.05)


def _turn(zenith: float, other: float, d: float) -> float:
    """Ratio of albedos at two sun heights, (1 + d) / (1 + 2 d cos z): Briegleb et al. 1986."""
    return float((1 + 2 * d * np.cos(np.radians(other))) / (1 + 2 * d * np.cos(np.radians(zenith))))


def _spread(values: Any) -> tuple[float, float]:
    return float(np.mean(values)), float(2 * np.std(values, ddof=1) / np.sqrt(len(values)))


@cache
def _pass(date: str, surface: str, quantity: str, n: int, hour: float) -> Pass:
    start = round(hour * 3600) * NS + (0 if date == DATES[0] else 35 * 86400 * NS)
    return Pass(
        name=f"{surface}-{quantity}-{n}", surface=surface, patch=surface, quantity=quantity,
        kind="stand-off" if quantity == "temperature" else "", mode="", row=n, start_ns=start,
        stop_ns=start + 60 * NS, trim_s=0.0, from_ns=start, to_ns=start + 60 * NS,
        channels=channel_of(LOGGERS[quantity]), height_m=0.4, width_m=4.0, length_m=4.0, lanes=0,
        reading=float("nan"))


def _passes(rng: np.random.Generator, date: str, quantity: str, hours: Any, sky: Sky,
            zenith: float, wind: float, s: float, rest: str, fixed: dict[str, float],
            read: dict[str, Any], uncertain: list[tuple[str, float, float, str, str]],
            air_u: float = 0.0, air: float = 300.0,
            per_surface: tuple[str, float, float] | None = None) -> list[PassEstimate]:
    model = "stand-off" if quantity == "temperature" else quantity
    held = {name: float(v) for name, v in (pair.split("=") for pair in rest.split())} | fixed
    held |= {name: value for name, value, *_ in uncertain}
    if per_surface:
        held[per_surface[0]] = per_surface[1]
    values = np.asarray(MODELS[model](held | read))
    names = {name for name, *_ in uncertain} | set(read) | ({per_surface[0]} if per_surface
                                                           else set())
    plain = [Input(name, value, 0.0, "", "") for name, value in held.items() if name not in names]
    shared = [Input(name, value, u, scope, name, law) for name, value, u, scope, law in uncertain
              if scope]
    weather = Input("air_temperature", air, air_u, "kit:air:offset", "air")
    out = []
    for j, surface in enumerate(SURFACES):
        of_surface = [] if per_surface is None else [
            Input(*per_surface, f"emissivity:{surface}", "emissivity")]
        for r in range(hours.shape[1]):
            this = _pass(date, surface, quantity, r, float(hours[j, r]))
            own = [Input(name, value, u, f"{date}:pass:{this.name}", name, law)
                   for name, value, u, scope, law in uncertain if not scope]
            reading = [Input(name, float(v[j, r]), 0.0, "", "") for name, v in read.items()]
            stated = s * np.sqrt(rng.chisquare(50) / 50)
            out.append(PassEstimate(
                this, {"temperature": "stand-off", "albedo": sky.kind, "ndvi": ""}[quantity],
                model, float(values[j, r]), float(values[j, r]), float(stated), 500, 50.0, zenith,
                sky, weather, wind, "ok", "", (),
                (*plain, *reading, *shared, *of_surface, *own)))
    return out
