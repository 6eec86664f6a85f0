"""Measurement models: what a pass's value is, as a function of its uncertain inputs.

Each model takes a mapping of input name -> number or vector of draws and returns the value in the
unit of its quantity. The same function gives the value, the sensitivities and the draws.
Inputs called `..._error` are zero by expectation: their u is the size of an effect that is known
but not removed.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any

import numpy as np

from surveykit.core import FloatArray, Input
from surveykit.physics.thermal import (
    background_radiance,
    band,
    contact_temperature_k,
    longwave_temperature_k,
    sky_radiance,
    standoff_temperature_k,
)
from surveykit.physics.vegetation import ndvi
from surveykit.statistics.draws import Draws

Values = Mapping[str, Any]


def stand_off(x: Values) -> FloatArray:
    """Surface temperature [K] from above: the balance of emitted and reflected band radiance."""
    window = band(float(x["band_low_um"]), float(x["band_high_um"]))
    sky = x["sky_factor"] * sky_radiance(window, x["air_k"], x["relative_humidity"])
    around = background_radiance(window, sky, x["sky_view"], x["walls_k"], x["walls_emissivity"])
    return standoff_temperature_k(window, _brightness(x), x["emissivity"], around)


def contact(x: Values) -> FloatArray:
    """Surface temperature [K] under the head: the bore's cavity, rim gap and head cooling."""
    window = band(float(x["band_low_um"]), float(x["band_high_um"]))
    sky = x["sky_factor"] * sky_radiance(window, x["air_k"], x["relative_humidity"])
    surface = contact_temperature_k(
        window, _brightness(x), x["emissivity"], x["body_k"], x["bore_emissivity"],
        x["rim_gap_error"], sky)
    return surface + x["head_cooling_error"]


def longwave(x: Values) -> FloatArray:
    """Surface temperature [K] from broadband up- and downwelling longwave irradiance."""
    up = x["up"] * (1 + x["up_gain_error"]) + x["up_offset_error"]
    down = x["down"] * (1 + x["down_gain_error"]) + x["down_offset_error"]
    return longwave_temperature_k(up, down, x["emissivity_broadband"])


def albedo(x: Values) -> FloatArray:
    """Albedo [1]: ratio of sums, with what is budgeted and not removed around it."""
    up = x["up"] * (1 + x["up_gain_error"]) + x["up_zero_error"]
    down = x["down"] * (1 + x["down_gain_error"]) + x["down_zero_error"]
    ratio = up / down * (1 + x["directional_error"] + x["levelling_error"])
    seen = 1 - x["footprint_share"]
    return (ratio + x["shade_error"] * x["shade_share"] * ratio
            + x["contamination_error"] * seen * (x["around_albedo"] - ratio))


def vegetation_index(x: Values) -> FloatArray:
    """NDVI [1] of the patch: index of the ratios of sums of both bands."""
    factor = {}
    for name in ("red", "nir"):
        up = x[f"{name}_up"] * (1 + x[f"{name}_up_gain_error"]) + x[f"{name}_up_zero_error"]
        down = (x[f"{name}_down"] * (1 + x[f"{name}_down_gain_error"])
                + x[f"{name}_down_zero_error"])
        factor[name] = up / down
    index = ndvi(factor["red"], factor["nir"])
    seen = 1 - x["footprint_share"]
    return index + x["contamination_error"] * seen * (x["around_ndvi"] - index)


MODELS: dict[str, Callable[[Values], FloatArray]] = {
    "stand-off": stand_off, "contact": contact, "longwave": longwave, "albedo": albedo,
    "ndvi": vegetation_index,
}


def evaluate(model: str, inputs: Sequence[Input]) -> float:
    """Return the model's value at the inputs' own values."""
    return float(MODELS[model]({i.name: i.value for i in inputs}))


def sensitivities(model: str, inputs: Sequence[Input]) -> dict[str, float]:
    """Return per input its signed contribution: half the change from value - u to value + u."""
    nominal = {i.name: i.value for i in inputs}
    out = {}
    for i in inputs:
        if i.u > 0:
            high = MODELS[model]({**nominal, i.name: i.value + i.u})
            low = MODELS[model]({**nominal, i.name: i.value - i.u})
            out[i.name] = float(high - low) / 2
    return out


def deviations(model: str, inputs: Sequence[Input], draws: Draws, pass_scope: str) -> FloatArray:
    """Return draws of value minus nominal value, shape (M,), shared inputs moved together.

    Inputs of the pass's own scope stay at their value: they are part of the pass's own scatter.
    """
    x: dict[str, Any] = {i.name: i.value for i in inputs}
    nominal = MODELS[model](x)
    moved = [i for i in inputs if i.u > 0 and i.scope != pass_scope]
    for i in moved:
        x[i.name] = i.value + i.u * draws.standard(i.scope, i.distribution)
    if not moved:
        return np.zeros(draws.size)
    return np.asarray(MODELS[model](x) - nominal)


def _brightness(x: Values) -> Any:
    return (x["brightness_k"] + x["gain_error"] * x["gain_reading"] + x["offset_error"]
            + x["body_rate_error"])
