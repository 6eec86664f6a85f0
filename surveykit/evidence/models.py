"""Measurement models: what a pass's value is, as a function of its uncertain inputs.

Each model takes a mapping of input name -> number or vector of draws and returns the value in the
unit of its quantity. The same function gives the value, the sensitivities and the draws.
Inputs called `..._error` are zero by expectation: their u is the size of an effect that is known
but not removed. Where such an effect has one sign only, its whole size is allowed on either side:
the value is not moved, and the interval holds the effect.
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
    """Surface temperature [K] under the head: the bore's cavity, rim gap and head cooling.

    The rim is taken as closed. A gap lies between 0 and its largest and is never negative; what it
    does to the temperature is allowed on either side of the closed value.
    """
    window = band(float(x["band_low_um"]), float(x["band_high_um"]))
    sky = x["sky_factor"] * sky_radiance(window, x["air_k"], x["relative_humidity"])
    rest = _brightness(x), x["emissivity"], x["body_k"], x["bore_emissivity"]
    closed = contact_temperature_k(window, *rest, 0.0, sky)
    leaking = contact_temperature_k(window, *rest, np.abs(x["rim_gap_error"]), sky)
    return closed + np.sign(x["rim_gap_error"]) * (leaking - closed) + x["head_cooling_error"]


def longwave(x: Values) -> FloatArray:
    """Surface temperature [K] from broadband up- and downwelling longwave irradiance."""
    up = x["up"] * (1 + x["up_gain_error"]) + x["up_offset_error"]
    down = x["down"] * (1 + x["down_gain_error"]) + x["down_offset_error"]
    return longwave_temperature_k(up, down, x["emissivity_broadband"])


def albedo(x: Values) -> FloatArray:
    """Albedo [1]: ratio of sums, with what is budgeted and not removed around it.

    Shade and foreign ground are not removed: `..._per_m` say how their shares move with the
    height of the head, so that passes held at other heights than written scatter.
    """
    up = x["up"] * (1 + x["up_gain_error"]) + x["up_zero_error"]
    down = x["down"] * (1 + x["down_gain_error"]) + x["down_zero_error"]
    ratio = up / down * (1 + x["directional_error"] + x["levelling_error"])
    return (ratio * (1 + x["shade_error"] * x["shade_share"]
                     + x["height_error"] * x["shade_per_m"])
            + _foreign(x, x["around_albedo"] - ratio))


def vegetation_index(x: Values) -> FloatArray:
    """NDVI [1] of the patch: index of the ratios of sums of both bands."""
    factor = {}
    for name in ("red", "nir"):
        up = x[f"{name}_up"] * (1 + x[f"{name}_up_gain_error"]) + x[f"{name}_up_zero_error"]
        down = (x[f"{name}_down"] * (1 + x[f"{name}_down_gain_error"])
                + x[f"{name}_down_zero_error"])
        factor[name] = up / down
    index = ndvi(factor["red"], factor["nir"])
    return index + _foreign(x, x["around_ndvi"] - index)


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


def _foreign(x: Values, contrast: Any) -> Any:
    """What foreign ground in view can have done: surroundings less patch, known to around_error."""
    return ((x["contamination_error"] * contrast - x["around_error"]) * (1 - x["footprint_share"])
            + x["height_error"] * x["footprint_per_m"] * contrast)


def _brightness(x: Values) -> Any:
    return (x["brightness_k"] + x["gain_error"] * x["gain_reading"] + x["offset_error"]
            + x["body_rate_error"] * x["body_rate_k_min"])
