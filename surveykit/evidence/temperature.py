"""Surface temperature of a pass: stand-off, contact and longwave."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from surveykit.core import FloatArray, Input
from surveykit.evidence import models
from surveykit.evidence.conditions import NS, Day, Sky
from surveykit.evidence.parts import (
    HALF_WIDTH,
    NotEvaluated,
    PassValue,
    calibration_flags,
    fixed,
    gain,
    in_range,
    need,
    offset,
    series,
    surface_scope,
)
from surveykit.intake.params import Channel
from surveykit.intake.passes import Pass
from surveykit.physics.thermal import head_cooling_k
from surveykit.statistics.series import mean_of_series

FEW_PLACEMENTS = 3


def stand_off(day: Day, this: Pass, sky: Sky) -> PassValue:
    """Return a stand-off pass: emissivity, modelled sky and what stands beside the sky."""
    _, brightness = series(day, this, "brightness_temperature")
    inputs, flags = _infrared(day, this, brightness)
    site, settings = day.parameters.campaign.site, day.parameters.campaign.settings.temperature
    inputs |= _sky(day, this)
    inputs["sky_view"] = Input("sky_view", site.sky_view.value, site.sky_view.u,
                               f"{day.name}:sky view", "share of sky over the site")
    if site.walls is None:
        walls = Input("walls_k", inputs["air_k"].value, settings.walls_u_k, f"{day.name}:walls",
                      "temperature of what hides the sky, taken as the air's")
        emissivity = settings.walls_emissivity
        if site.sky_view.value < 1:
            flags += ("walls not measured",)
    else:
        given = site.walls.temperature_degC
        walls = Input("walls_k", given.value + 273.15, given.u, f"{day.name}:walls",
                      "temperature of what hides the sky, as stated")
        emissivity = site.walls.emissivity
    inputs["walls_k"] = walls
    inputs["walls_emissivity"] = fixed("walls_emissivity", emissivity)
    if sky.kind in ("mixed", "diffuse"):
        flags += ("cloud in the sky model",)
    if this.height_m > settings.path_limit_m:
        flags += (f"higher than {settings.path_limit_m:g} m: the air in between is not corrected",)
    return _along(models.stand_off, inputs, brightness, flags)


def contact(day: Day, this: Pass, sky: Sky) -> PassValue:
    """Return a contact pass: the mean over its placements of the cavity's balance."""
    time, brightness = series(day, this, "brightness_temperature")
    inputs, flags = _infrared(day, this, brightness)
    channel = this.channels["brightness_temperature"]
    settings = day.parameters.campaign.settings.temperature
    body = _body(day, this, channel)
    if body is None:
        raise NotEvaluated("the housing temperature of the contact head is missing")
    inputs["body_k"] = replace(body, name="body_k")
    bore = channel.bore_emissivity
    inputs["bore_emissivity"] = Input("bore_emissivity", bore.value, bore.u,
                                      f"{channel.gain_scope}:bore", "emissivity of the bore")
    inputs |= _sky(day, this)
    inputs["rim_gap_error"] = Input(
        "rim_gap_error", 0.0, settings.rim_gap_max * HALF_WIDTH,
        f"{day.name}:{this.surface}:rim gap", "gap under the rim, not corrected", "rectangular")
    spans = day.quality.passes[this.name].dwells
    if not spans:
        raise NotEvaluated("no settled placement of the head was found in the contact pass")
    settle = day.parameters.campaign.settings.passes.settle_time_constants
    longest = max(float(time[b - 1] - time[a]) / NS for a, b in spans)
    sun = sky.irradiance_w_m2
    if not np.isfinite(sun):
        sun = float(day.sun(time).clear_sky_w_m2.mean())
    cooled = float(head_cooling_k(sun, longest / 2 + settle * (channel.time_constant_s or 0.0),
                                  settings.effusivity))
    inputs["head_cooling_error"] = Input(
        "head_cooling_error", 0.0, cooled * HALF_WIDTH, f"{day.name}:{this.surface}:head cooling",
        "cooling of the ground under the head, not corrected", "rectangular")
    flags += ("head cooling not corrected", "rim gap not corrected")
    per_record = _per_record(models.contact, inputs, brightness)
    found = [mean_of_series(per_record[a:b], unit="K", method="contact") for a, b in spans]
    rows = [(int(time[a]), int(time[b - 1]), one.value, one.u, one.n)
            for (a, b), one in zip(spans, found, strict=True)]
    means = np.array([one.value for one in found])
    n = means.size
    u = float(means.std(ddof=1) / np.sqrt(n)) if n > 1 else float(per_record.std(ddof=1))
    if n < FEW_PLACEMENTS:
        flags += ("few placements",)
    value = float(means.mean())
    raw = float(np.mean([brightness[a:b].mean() for a, b in spans]))
    inputs["brightness_k"] = fixed("brightness_k", raw)
    return PassValue(raw, value, u, float(n), tuple(inputs.values()), flags,
                     (("raw", raw), ("emissivity and bore", value)), tuple(rows))


def longwave(day: Day, this: Pass, sky: Sky) -> PassValue:
    """Return a pass of a longwave pair by the Stefan-Boltzmann balance."""
    _, up = series(day, this, "longwave_up")
    _, down = series(day, this, "longwave_down")
    entry = day.parameters.campaign.surfaces[this.surface].emissivity_broadband
    if entry is None:
        raise NotEvaluated(f"surfaces.{this.surface}.emissivity_broadband is missing")
    pair = this.channels["longwave_up"], this.channels["longwave_down"]
    inputs = {
        "up": fixed("up", float(up.mean())), "down": fixed("down", float(down.mean())),
        "up_gain_error": gain(pair[0], "up_gain_error"),
        "down_gain_error": gain(pair[1], "down_gain_error"),
        "up_offset_error": offset(pair[0], "up_offset_error"),
        "down_offset_error": offset(pair[1], "down_offset_error"),
        "emissivity_broadband": Input(
            "emissivity_broadband", entry.value, entry.u,
            surface_scope("emissivity broadband", this.surface, entry),
            f"broadband emissivity of the surface ({entry.source})"),
    }
    nominal = {name: i.value for name, i in inputs.items()}
    values = in_range(np.asarray(models.longwave({**nominal, "up": up, "down": down})))
    raw = float(models.longwave({**nominal, "up": up.mean(), "emissivity_broadband": 1.0}))
    mean = mean_of_series(values, unit="K", method="longwave")
    return PassValue(raw, mean.value, mean.u, mean.n_eff, tuple(inputs.values()),
                     calibration_flags(day, list(pair)),
                     (("raw", raw), ("emissivity and sky", mean.value)))


def _infrared(day: Day, this: Pass,
              brightness: FloatArray) -> tuple[dict[str, Input], tuple[str, ...]]:
    channel = this.channels["brightness_temperature"]
    if channel.emissivity_setting is None:
        raise NotEvaluated(f"emissivity_setting of {channel.logger}, {channel.column} is missing")
    if channel.emissivity_setting != 1.0:
        raise NotEvaluated(
            f"{channel.logger}, {channel.column} was logged with emissivity setting "
            f"{channel.emissivity_setting:g}; undoing it is not available yet")
    entry = day.parameters.campaign.surfaces[this.surface].emissivity
    if entry is None:
        raise NotEvaluated(f"surfaces.{this.surface}.emissivity is missing")
    if channel.band_um is None:
        raise NotEvaluated(f"band_um of {channel.logger}, {channel.column} is missing")
    mean = float(brightness.mean())
    low, high = channel.band_um
    inputs = [
        fixed("brightness_k", mean), fixed("gain_reading", mean - channel.offset.value),
        fixed("band_low_um", low), fixed("band_high_um", high),
        gain(channel, "gain_error"), offset(channel, "offset_error"),
        Input("emissivity", entry.value, entry.u, surface_scope("emissivity", this.surface, entry),
              f"emissivity of the surface ({entry.source})"),
    ]
    settings = day.parameters.campaign.settings.temperature
    inputs += [fixed("body_rate_k_min", _body_rate_k_min(day, this, channel)),
               Input("body_rate_error", 0.0, settings.body_rate_u_min,
                     f"{day.name}:{channel.logger}:body rate",
                     "warming or cooling of the instrument's housing")]
    return {i.name: i for i in inputs}, calibration_flags(day, [channel])


def _sky(day: Day, this: Pass) -> dict[str, Input]:
    settings = day.parameters.campaign.settings.temperature
    air = need(day.weather("air_temperature", this), "air temperature during the pass")
    humidity = need(day.weather("relative_humidity", this), "relative humidity during the pass")
    return {
        "air_k": replace(air, name="air_k"),
        "relative_humidity": replace(humidity, name="relative_humidity"),
        "sky_factor": Input("sky_factor", 1.0, settings.sky_radiance_u, f"{day.name}:sky",
                            "modelled clear-sky radiance in the band"),
    }


def _body(day: Day, this: Pass, channel: Channel) -> Input | None:
    for body in day.channels.get("housing_temperature", []):
        if body.logger == channel.logger:
            _, value = day.readings(body, this.from_ns, this.to_ns)
            if value.size:
                return Input("body_k", float(value.mean()), body.u_offset, body.offset_scope,
                             f"housing temperature of {body.logger}")
    return None


def _body_rate_k_min(day: Day, this: Pass, channel: Channel) -> float:
    for body in day.channels.get("housing_temperature", []):
        if body.logger == channel.logger:
            time, value = day.readings(body, this.start_ns, this.stop_ns)
            if value.size > 2:
                return float(np.polyfit((time - time[0]) / NS / 60.0, value, 1)[0])
    return 0.0


def _per_record(model: models.Callable, inputs: dict[str, Input],
                brightness: FloatArray) -> FloatArray:
    nominal = {name: i.value for name, i in inputs.items()}
    return in_range(np.asarray(model({**nominal, "brightness_k": brightness})))


def _along(model: models.Callable, inputs: dict[str, Input], brightness: FloatArray,
           flags: tuple[str, ...]) -> PassValue:
    """Return the mean of the per-record values: the area's mean temperature."""
    raw = float(brightness.mean())
    mean = mean_of_series(_per_record(model, inputs, brightness), unit="K", method="stand-off")
    return PassValue(raw, mean.value, mean.u, mean.n_eff, tuple(inputs.values()), flags,
                     (("raw", raw), ("emissivity and surroundings", mean.value)))
