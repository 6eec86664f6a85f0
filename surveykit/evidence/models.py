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
from surveykit.physics.bands import Band, band
from surveykit.physics.shortwave import patch_albedo, zenith_factor
from surveykit.physics.surroundings import background_radiance, sky_radiance
from surveykit.physics.thermal import (
    brightness_without_setting,
    contact_temperature_k,
    longwave_temperature_k,
    standoff_temperature_k,
)
from surveykit.physics.vegetation import ndvi, reflectance_factor, savi
from surveykit.statistics.draws import Draws

Values = Mapping[str, Any]
CHUNK = 8192  # draws that a model is given at once: 64 kB a vector stays in the cache
RESPONSE = "response at um "  # and the wavelength: an input of a head's tabulated response

# Effects that a pass may or may not have, at the value at which they do nothing.
NEUTRAL: dict[str, float] = {
    "emissivity_setting": 1.0, "reflected_k": 300.0, "cloud_fraction": 0.0, "cloud_base_k": 0.0,
    "background_factor": 1.0, "check_error": 0.0, "rim_gap": 0.0, "rim_gap_error": 0.0,
    "head_cooling_k": 0.0, "head_cooling_error": 0.0,
    "gain_ratio": 1.0, "ratio_per_up_zero": 0.0, "ratio_per_down_zero": 0.0,
    "surroundings_corrected": 0.0, "shade_corrected": 0.0,
    "footprint_error": 0.0, "shade_error": 0.0, "contamination_error": 0.0,
    "up_class_error": 0.0, "down_class_error": 0.0, "spectral_error": 0.0, "operator_error": 0.0,
    "directional_error_next": 0.0, "clock_skew_s": 0.0, "lag_s": 0.0, "red_lag_s": 0.0,
    "nir_lag_s": 0.0,
    "down_per_s": 0.0, "red_down_per_s": 0.0, "nir_down_per_s": 0.0,
    "zenith_deg": 60.0, "reference_zenith_deg": 60.0, "zenith_dependence": 0.0,
    "red_ratio": 1.0, "nir_ratio": 1.0, "panel_error": 0.0,
    "conversion_slope": 1.0, "conversion_intercept": 0.0, "conversion_error": 0.0,
}


def stand_off(x: Values) -> FloatArray:
    """Surface temperature [K] from above: the balance of emitted and reflected band radiance."""
    x = NEUTRAL | dict(x)
    window = window_of(x)
    return _left(x) + standoff_temperature_k(
        window, _brightness(x, window), x["emissivity"], background(x, window))


def window_of(x: Values) -> Band:
    """Return the band of the infrared head: flat, or of the response its inputs hold."""
    response = tuple((float(name.removeprefix(RESPONSE)), round(float(value), 12))
                     for name, value in x.items() if name.startswith(RESPONSE))
    return band(float(x["band_low_um"]), float(x["band_high_um"]), response)


def background(x: Values, window: Band) -> FloatArray:
    """Radiance [W m-2 sr-1] that sky and walls throw on the ground, as modelled or measured."""
    x = NEUTRAL | dict(x)
    return np.asarray(x["background_factor"] * background_radiance(
        window, _sky(x, window), x["sky_view"], x["walls_k"], x["walls_emissivity"]))


def contact(x: Values) -> FloatArray:
    """Surface temperature [K] under the head: the bore's cavity, rim gap and head cooling.

    `rim_gap` is the gap that is corrected. Where none is, the rim is taken as closed, and
    `rim_gap_error` allows what a gap does on either side of the closed value.
    """
    x = NEUTRAL | dict(x)
    window = window_of(x)
    sky = _sky(x, window)
    rest = _brightness(x, window), x["emissivity"], x["body_k"], x["bore_emissivity"]
    closed = contact_temperature_k(window, *rest, np.clip(x["rim_gap"], 0.0, 1.0), sky)
    leaking = contact_temperature_k(window, *rest, np.abs(x["rim_gap_error"]), sky)
    return np.asarray(closed + np.sign(x["rim_gap_error"]) * (leaking - closed)
                      + x["head_cooling_k"] + x["head_cooling_error"] + _left(x))


def longwave(x: Values) -> FloatArray:
    """Surface temperature [K] from broadband up- and downwelling longwave irradiance."""
    up = x["up"] * (1 + x["up_gain_error"]) + x["up_offset_error"]
    down = x["down"] * (1 + x["down_gain_error"]) + x["down_offset_error"]
    return longwave_temperature_k(up, down, x["emissivity_broadband"]) + _left(x)


def albedo(x: Values) -> FloatArray:
    """Albedo [1]: ratio of sums over the heads' gain ratio, less surroundings and own shade.

    What is not corrected is budgeted around the value: its whole size on either side. `..._per_m`
    say how the shares move with the height of the head, so that passes held at other heights than
    written scatter; `..._per_s` how the light changed, relative, while two loggers' clocks differ
    by `clock_skew_s` and the head that looks up follows `lag_s` later than the other.
    """
    x = NEUTRAL | dict(x)
    up = x["up"] * (1 + x["up_gain_error"] + x["up_class_error"]) + x["up_zero_error"]
    down = x["down"] * (1 + x["down_gain_error"] + x["down_class_error"]
                        + (x["clock_skew_s"] + x["lag_s"]) * x["down_per_s"]) + x["down_zero_error"]
    gains = x["gain_ratio"] * (1 + x["ratio_per_up_zero"] * x["up_zero_error"]
                               + x["ratio_per_down_zero"] * x["down_zero_error"])
    ratio = up / down / gains * (
        1 + x["directional_error"] + x["directional_error_next"] + x["levelling_error"]
        + x["spectral_error"] + x["operator_error"])
    seen, lit = x["surroundings_corrected"], x["shade_corrected"]
    higher = x["height_error"]
    share = 1 - seen * (1 - x["footprint_share"] - x["footprint_error"]
                        - higher * x["footprint_per_m"])
    shade = lit * (x["shade_share"] * (1 + x["shade_error"]) + higher * x["shade_per_m"])
    patch = patch_albedo(ratio, x["around_albedo"] + x["around_error"], share, shade)
    budgeted = (1 - lit) * ratio * (x["shade_error"] * x["shade_share"] + higher * x["shade_per_m"])
    budgeted = budgeted + (1 - seen) * _foreign(x, x["around_albedo"] - ratio)
    turn = (zenith_factor(x["reference_zenith_deg"], x["zenith_dependence"])
            / zenith_factor(x["zenith_deg"], x["zenith_dependence"]))
    return np.asarray((patch + budgeted) * turn + _left(x))


def vegetation_index(x: Values) -> FloatArray:
    """NDVI [1] of the patch: index of the ratios of sums of both bands."""
    x = NEUTRAL | dict(x)
    index = (x["conversion_intercept"] + x["conversion_slope"] * ndvi(*reflectances(x))
             + x["conversion_error"])
    return index + _foreign(x, x["around_ndvi"] - index) + _left(x)


def reflectances(x: Values) -> tuple[FloatArray, FloatArray]:
    """Reflectance factors [1] of red and near infrared, over the heads' gain ratios."""
    x = NEUTRAL | dict(x)
    red, nir = (reflectance_factor(
        x[f"{name}_up"] * (1 + x[f"{name}_up_gain_error"]) + x[f"{name}_up_zero_error"],
        x[f"{name}_down"] * (1 + x[f"{name}_down_gain_error"]
                             + (x["clock_skew_s"] + x[f"{name}_lag_s"]) * x[f"{name}_down_per_s"])
        + x[f"{name}_down_zero_error"], x[f"{name}_ratio"]) * (1 + x["panel_error"])
        for name in ("red", "nir"))
    return red, nir


def soil_adjusted(x: Values) -> FloatArray:
    """Soil-adjusted vegetation index [1] of the patch; foreign ground in view is left out."""
    return savi(*reflectances(x), x["soil_factor"])


MODELS: dict[str, Callable[[Values], FloatArray]] = {
    "stand-off": stand_off, "contact": contact, "longwave": longwave, "albedo": albedo,
    "ndvi": vegetation_index, "savi": soil_adjusted,
}


def deviations(model: str, inputs: Sequence[Input], draws: Draws, pass_scope: str) -> FloatArray:
    """Return draws of value minus nominal value, shape (M,), shared inputs moved together.

    Inputs of the pass's own scope stay at their value: they are part of the pass's own scatter.
    The model runs on one chunk of draws after another, so that what it holds in between does not
    grow with their number.
    """
    x: dict[str, Any] = {i.name: i.value for i in inputs}
    nominal = MODELS[model](x)
    moved = [(i, draws.standard(i.scope, i.distribution)) for i in inputs
             if i.u > 0 and i.scope != pass_scope]
    out = np.zeros(draws.size)
    for start in range(0, draws.size if moved else 0, CHUNK):
        some = slice(start, start + CHUNK)
        out[some] = MODELS[model](
            x | {i.name: i.value + i.u * vector[some] for i, vector in moved}) - nominal
    return out


def _foreign(x: Values, contrast: Any) -> Any:
    """What foreign ground in view can have done: surroundings less patch, known to around_error."""
    return ((x["contamination_error"] * contrast - x["around_error"]) * (1 - x["footprint_share"])
            + x["height_error"] * x["footprint_per_m"] * contrast)


def _brightness(x: Values, window: Band) -> Any:
    logged = (x["brightness_k"] + x["gain_error"] * x["gain_reading"] + x["offset_error"]
              + x["check_error"] + x["body_rate_error"] * x["body_rate_k_min"])
    if np.all(x["emissivity_setting"] == 1.0):
        return logged
    return brightness_without_setting(window, logged, x["emissivity_setting"], x["reflected_k"])


def _sky(x: Values, window: Band) -> Any:
    """Sky radiance: the clear model, the base of the clouds where there are some, as measured."""
    clear = sky_radiance(window, x["air_k"], x["relative_humidity"])
    cloud = x["cloud_fraction"]
    if np.any(cloud != 0.0):
        clear = (1 - cloud) * clear + cloud * window.radiance(x["air_k"] - x["cloud_base_k"])
    return x["sky_factor"] * clear


def _left(x: Values) -> Any:
    """Return the sum of what is left uncorrected because a correction is switched off."""
    return sum(value for name, value in x.items() if name.endswith("_left"))
