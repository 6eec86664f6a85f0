"""What the name of a column may mean: quantity and unit, as guesses to be confirmed."""

from __future__ import annotations

import re

_UP = r"\bu[pw]\b|ground|refl|out|ascend|\brs\b"
_RULES: tuple[tuple[str, str], ...] = (
    (r"batt|volt|record|\bno\b|index|flag|status|panel|zenith|azimuth", ""),
    (r"hum|(?<![a-z])rh(?![a-z])", "relative_humidity"),
    (r"wind|(?<![a-z])ws(?![a-z])", "wind_speed"),
    (r"press|baro", "air_pressure"),
    (r"body|housing|case|internal|sensor.?t|(?<![a-z])die(?![a-z])", "housing_temperature"),
    (r"long.?wave|(?<![a-z])lw|(?<![a-z])[du]w ir(?![a-z])", "longwave"),
    (r"target|surface|object|bright|(?<![a-z])ir(?![a-z])|infra|(?<![a-z])ts(?![a-z])",
     "brightness_temperature"),
    (r"(?<![a-z])nir(?![a-z])|near.?infra|(?<![0-9])8[0-9]{2}(?![0-9])", "nir"),
    (r"(?<![a-z])red(?![a-z])|(?<![0-9])6[0-9]{2}(?![0-9])", "red"),
    (r"short.?wave|(?<![a-z])sw|solar|glob|pyran|irrad|ghi|sky|ground", "shortwave"),
    (r"air|amb|temp|(?<![a-z])ta?(?![a-z])", "air_temperature"),
)
_UNITS: tuple[tuple[str, str], ...] = (
    (r"(µ|u|μ)V(?![a-z])", "uV"), (r"mV(?![a-z])", "mV"), (r"W ?/? ?m|W·m", "W m-2"),
    (r"°C|(?i:deg[ _]?C|celsius)|(?<![a-zA-Z])C(?![a-zA-Z])", "degC"),
    (r"(?<![a-zA-Z])K(?![a-zA-Z])|kelvin", "K"), (r"%|percent", "%"), (r"hPa|mbar", "hPa"),
    (r"kPa", "kPa"), (r"(?<![a-zA-Z])Pa(?![a-zA-Z])", "Pa"), (r"m ?/ ?s|m s-1", "m s-1"),
    (r"(?i:count|cts|(?<![a-z])dn(?![a-z]))", "count"),
)
_USUAL = {"relative_humidity": "%", "wind_speed": "m s-1", "air_pressure": "hPa"}


def quantity_of(name: str) -> str:
    """Return the quantity a column's name suggests, "" if it suggests none.

    Examples
    --------
    >>> quantity_of("T_body [degC]"), quantity_of("sky_mV"), quantity_of("batt")
    ('housing_temperature', 'shortwave_down', '')
    """
    words = re.sub(r"[\[(].*?[\])]", " ", name).replace("_", " ").lower()
    for pattern, found in _RULES:
        if re.search(pattern, words):
            if found not in ("nir", "red", "longwave", "shortwave"):
                return found
            return f"{found}_{'up' if re.search(_UP, words) else 'down'}"
    return ""


def unit_of(name: str, unit_cell: str, quantity: str, median: float) -> str:
    """Return the unit that the line of units, the name, or the quantity suggests.

    Examples
    --------
    >>> unit_of("air", "°C", "air_temperature", 20.0), unit_of("sky_mV", "", "shortwave_down", 90.0)
    ('degC', 'mV')
    """
    for text in (unit_cell, " ".join(re.findall(r"[\[(](.*?)[\])]", name)), name.replace("_", " ")):
        for pattern, unit in _UNITS:
            if re.search(pattern, text):
                return unit
    if quantity.endswith("temperature"):
        return "K" if median > 150 else "degC"
    if quantity == "relative_humidity" and median <= 1:
        return "1"
    return _USUAL.get(quantity, "W m-2" if median < 1500 else "count")
