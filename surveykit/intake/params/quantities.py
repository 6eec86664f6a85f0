"""The quantities of a channel, the units they are logged in, and where a default u comes from."""

from __future__ import annotations

from typing import Literal

Quantity = Literal[
    "brightness_temperature", "housing_temperature", "shortwave_down", "shortwave_up",
    "longwave_down", "longwave_up", "red_down", "red_up", "nir_down", "nir_up",
    "air_temperature", "relative_humidity", "wind_speed", "air_pressure"]
Unit = Literal["degC", "K", "W m-2", "mV", "uV", "count", "1", "%", "hPa", "kPa", "Pa", "m s-1"]

RAW_UNITS = ("mV", "uV", "count")
# unit -> (scale, shift): SI = shift + scale * value. The first is what gain and offset of a raw
# unit (mV, uV, count) lead to.
_TEMPERATURE = {"degC": (1.0, 273.15), "K": (1.0, 0.0)}
_IRRADIANCE = {"W m-2": (1.0, 0.0)}
PHYSICAL_UNITS: dict[str, dict[str, tuple[float, float]]] = {
    "brightness_temperature": _TEMPERATURE, "housing_temperature": _TEMPERATURE,
    "air_temperature": _TEMPERATURE,
    **dict.fromkeys(("shortwave_down", "shortwave_up", "longwave_down", "longwave_up",
                     "red_down", "red_up", "nir_down", "nir_up"), _IRRADIANCE),
    "relative_humidity": {"%": (0.01, 0.0), "1": (1.0, 0.0)},
    "wind_speed": {"m s-1": (1.0, 0.0)},
    "air_pressure": {"hPa": (100.0, 0.0), "kPa": (1000.0, 0.0), "Pa": (1.0, 0.0)},
}
# u of a channel that needs not state one, in SI: the setting it comes from
DEFAULT_U = {
    "housing_temperature": "body_temperature_u_k", "air_temperature": "air_temperature_u_k",
    "relative_humidity": "relative_humidity_u", "wind_speed": "wind_speed_u_m_s",
    "air_pressure": "air_pressure_u_pa",
}
MAIN = tuple(quantity for quantity in PHYSICAL_UNITS if quantity not in DEFAULT_U)
