"""What the ground reflects during a pass: sky and walls, as modelled or as measured."""

from __future__ import annotations

from dataclasses import replace
from functools import partial

import numpy as np

from surveykit.core import Input
from surveykit.evidence.brightness import seen_in_rows, window_of
from surveykit.evidence.conditions import Day, Sky, Span
from surveykit.evidence.models import NEUTRAL, background
from surveykit.evidence.parts import HALF_WIDTH, fixed, need
from surveykit.intake.params import Channel
from surveykit.intake.params.amounts import Uncertain
from surveykit.intake.sheet_words import Entry
from surveykit.physics.emissivity import foil_background
from surveykit.physics.propagation import combined_u
from surveykit.physics.surroundings import (
    hemispheric_emissivity,
    sky_emissivity_window,
    sky_radiance,
    sky_view_of_horizon,
    vapour_pressure_hpa,
)

CLOUDY = ("mixed", "diffuse")
Found = tuple[dict[str, Input], tuple[str, ...]]


def sky_inputs(day: Day, this: Span, sky: Sky, channel: Channel) -> Found:
    """Return the inputs of the sky's radiance in the band, and flags."""
    settings = day.parameters.campaign.settings.temperature
    air = need(day.weather("air_temperature", this), "air temperature during the pass")
    humidity = need(day.weather("relative_humidity", this), "relative humidity during the pass")
    flags: tuple[str, ...] = ()
    cloud = day.weather("cloud_fraction", this)
    clouded = sky.kind in CLOUDY or (cloud is not None and cloud.value > 0)
    if clouded and cloud is None:
        flags += ("cloud in the sky model",)
    if vapour_pressure_hpa(air.value, humidity.value) > settings.vapour_pressure_max_hpa:
        flags += ("sky model at its edge: very humid air",)
    inputs = {
        "air_k": replace(air, name="air_k"),
        "relative_humidity": replace(humidity, name="relative_humidity"),
        "sky_factor": Input(
            "sky_factor", 1.0,
            settings.sky_radiance_cloud_u if clouded else settings.sky_radiance_u,
            f"{day.name}:sky", "modelled sky radiance in the band, cloud in it" if clouded else
            "modelled clear-sky radiance in the band"),
    }
    if cloud is not None and cloud.value > 0:
        inputs |= {"cloud_fraction": replace(cloud, name="cloud_fraction"),
                   "cloud_base_k": fixed("cloud_base_k", settings.cloud_base_k)}
    return _with_measured_sky(day, this, channel, inputs, flags)


def surroundings(day: Day, this: Span, sky: Sky, channel: Channel) -> Found:
    """Return the inputs of all that a stand-off reading reflects: sky, walls, a foil's reading."""
    inputs, flags = sky_inputs(day, this, sky, channel)
    site, settings = day.parameters.campaign.site, day.parameters.campaign.settings.temperature
    view = site.sky_view if site.horizon_deg is None else Uncertain(
        value=sky_view_of_horizon(site.horizon_deg), u=settings.sky_view_u)
    inputs["sky_view"] = Input("sky_view", view.value, view.u, f"{day.name}:sky view",
                               "share of sky over the site")
    if site.walls is None:
        walls = Input("walls_k", inputs["air_k"].value, settings.walls_u_k, f"{day.name}:walls",
                      "temperature of what hides the sky, taken as the air's")
        emissivity = settings.walls_emissivity
        if view.value < 1:
            flags += ("walls not measured",)
    else:
        given = site.walls.temperature_degC
        walls = Input("walls_k", given.value + 273.15, given.u, f"{day.name}:walls",
                      "temperature of what hides the sky, as stated")
        emissivity = site.walls.emissivity
    inputs |= {"walls_k": walls, "walls_emissivity": fixed("walls_emissivity", emissivity),
               "background_factor": fixed("background_factor", 1.0)}
    inputs, flags = _with_foil(day, this, channel, inputs, flags)
    if day.parameters.campaign.surfaces[this.surface].reflection == "specular":
        inputs["background_factor"] = _overhead(day, this, channel, inputs)
    return inputs, flags


def _overhead(day: Day, this: Span, channel: Channel, inputs: dict[str, Input]) -> Input:
    """Return the factor by which polished ground shows the sky overhead in place of all around.

    No ground is a mirror: the difference of the two, rectangular, is its uncertainty.
    """
    x = NEUTRAL | {name: i.value for name, i in inputs.items()} | {"background_factor": 1.0}
    window, whole = window_of(channel), inputs["background_factor"]
    zenith = np.minimum(sky_emissivity_window(
        x["air_k"], vapour_pressure_hpa(x["air_k"], x["relative_humidity"])), 1.0)
    cloud, base = x["cloud_fraction"], window.radiance(x["air_k"] - x["cloud_base_k"])
    overhead = x["sky_factor"] * (
        (1 - cloud) * zenith * window.radiance(x["air_k"]) + cloud * base)
    ratio = float(overhead / background(x, window))
    return Input(
        "background_factor", whole.value * ratio,
        float(np.hypot(whole.u * ratio, whole.value * (1 - ratio) * HALF_WIDTH)),
        f"{day.name}:background of polished ground", "sky overhead in place of the whole sky")


def _with_measured_sky(day: Day, this: Span, channel: Channel, inputs: dict[str, Input],
                       flags: tuple[str, ...]) -> Found:
    """Replace the model's factor by measured over modelled sky, interpolated between the rows.

    A sky row is read at the zenith; the model's own ratio makes it hemispheric.
    """
    u_own = day.parameters.campaign.settings.temperature.sky_measured_u
    window = window_of(channel)
    ratios, below = {}, False
    for entry, seen in seen_in_rows(day, "sky", channel):
        air, humidity = (day.weather(q, entry) for q in ("air_temperature", "relative_humidity"))
        below |= seen is None
        if seen is None or air is None or humidity is None:
            continue
        zenith = np.minimum(sky_emissivity_window(
            air.value, vapour_pressure_hpa(air.value, humidity.value)), 1.0)
        model = sky_radiance(window, air.value, humidity.value)
        ratios[entry] = float(
            window.radiance(seen) * hemispheric_emissivity(zenith) / zenith / model)
    if below:
        flags += ("sky reading below the instrument's range",)
    if not ratios:
        return inputs, flags
    factor, spread = _between(ratios, this)
    held = {name: i for name, i in inputs.items() if not name.startswith("cloud")}
    held |= {name: fixed(name, held[name].value) for name in ("air_k", "relative_humidity")}
    held["sky_factor"] = Input("sky_factor", factor, float(np.hypot(u_own * factor, spread)),
                               f"{day.name}:sky", "sky radiance measured at the zenith")
    return held, tuple(f for f in flags if not f.startswith(("cloud in", "sky model")))


def _with_foil(day: Day, this: Span, channel: Channel, inputs: dict[str, Input],
               flags: tuple[str, ...]) -> Found:
    """Replace the modelled background by what a diffuse foil showed, interpolated between rows."""
    settings = day.parameters.campaign.settings.temperature
    window = window_of(channel)
    values = {name: i.value for name, i in inputs.items()}
    ratios, errors = {}, []
    for entry, seen in seen_in_rows(day, "foil", channel):
        air = day.weather("air_temperature", entry)
        if seen is None or (air is None and np.isnan(entry.reading)):
            flags += ("foil reading outside the instrument's range",) if seen is None else ()
            continue
        own_k = entry.reading + 273.15 if np.isfinite(entry.reading) else need(air, "air").value
        own_u = settings.foil_temperature_u_k if np.isnan(entry.reading) else (
            entry.reading_u if np.isfinite(entry.reading_u) else settings.body_temperature_u_k)
        humidity = day.weather("relative_humidity", entry)
        then = values | ({} if air is None or humidity is None else {
            "air_k": air.value, "relative_humidity": humidity.value})
        model = float(background(then, window))
        known = seen, own_k, settings.foil_reflectance
        ratios[entry] = float(foil_background(window, *known)) / model
        errors.append(combined_u(partial(foil_background, window), known, (
            channel.u_offset, own_u, settings.foil_reflectance_u)) / model)
    if not ratios:
        return inputs, flags
    factor, spread = _between(ratios, this)
    held = {name: fixed(name, i.value) for name, i in inputs.items()}
    held["background_factor"] = Input(
        "background_factor", factor, float(np.hypot(np.mean(errors), spread)),
        f"{day.name}:foil", "background measured with a diffuse foil")
    return held, tuple(f for f in flags if not f.startswith(
        ("cloud in", "sky model", "walls not", "sky reading")))


def _between(ratios: dict[Entry, float], this: Span) -> tuple[float, float]:
    """Return rows' ratios interpolated to a pass, and the u of their whole course, rectangular."""
    at = [(row.start_ns + row.stop_ns) / 2 for row in ratios]
    values = list(ratios.values())
    return (float(np.interp((this.start_ns + this.stop_ns) / 2, at, values)),
            float(np.ptp(values)) / np.sqrt(12.0))
