"""An entry of the field sheet, and what its cells mean: numbers and hand-read weather."""

from __future__ import annotations

import re
from dataclasses import dataclass

from surveykit.intake.params.settings import TemperatureSettings

NAN = float("nan")
_NUMBER = re.compile(r"[+-]?(\d+[.,]?\d*|[.,]\d+)([eE][+-]?\d{1,2})?", re.ASCII)
# quantity: scale and shift to SI, lowest and highest reading, unit, setting that gives u [SI]
WEATHER: dict[str, tuple[float, float, float, float, str, str]] = {
    "air_temperature": (1.0, 273.15, -60.0, 60.0, "degC", "air_temperature_u_k"),
    "relative_humidity": (0.01, 0.0, 1.0, 100.0, "%", "relative_humidity_u"),
    "wind_speed": (1.0, 0.0, 0.0, 75.0, "m s-1", "wind_speed_u_m_s"),
    "cloud_fraction": (1.0, 0.0, 0.0, 1.0, "a fraction of the sky", ""),
}


@dataclass(frozen=True)
class Entry:
    """One row of the field sheet.

    Attributes
    ----------
    row : int
        The spreadsheet's row (header = 1).
    entry : str
        pass, dark, cover, weather, sky, foil, swap, reference, panel, check or lid.
    start_ns, stop_ns : int
        UTC in ns, the watch's offset included; equal in a weather row without stop.
    edge_u_s : float
        Standard uncertainty of a written time [s]: with or without seconds.
    height_m, width_m, length_m : float
        NaN where the cell is empty.
    lanes : int
        0 where the cell is empty.
    reading, reading_u : float
        As written; in weather rows in SI (K, 1, m s-1; cloud fraction 1), an empty reading_u taken
        from the settings; of a swap +1 for normal, -1 for inverted. NaN where there is none.
    rod_side, operator_side : str
        Where rod and operator were, seen from the head: sun, across, away, or "".
    """

    row: int
    entry: str
    surface: str
    patch: str
    quantity: str
    mode: str
    instrument: str
    start_ns: int
    stop_ns: int
    edge_u_s: float
    height_m: float
    width_m: float
    length_m: float
    lanes: int
    reading: float
    reading_u: float
    note: str
    rod_side: str = ""
    operator_side: str = ""


SIDES = ("sun", "across", "away")
SWAPS = {"normal": 1.0, "inverted": -1.0}
# entry: lowest and highest reading, its unit
READINGS: dict[str, tuple[float, float, str]] = {
    "reference": (-60.0, 100.0, "degC"), "check": (-60.0, 100.0, "degC"),
    "lid": (-60.0, 150.0, "degC"), "foil": (-60.0, 100.0, "degC"), "panel": (0.02, 1.0, "1"),
}


def number(text: str) -> float:
    """Return a number written with a decimal point or comma.

    Raises
    ------
    ValueError
        If the text is anything else.

    Examples
    --------
    >>> number("0,12")
    0.12
    """
    if not _NUMBER.fullmatch(text):
        raise ValueError(f"{text!r} is no number; write digits alone, the unit stands in the "
                         "column's name")
    return float(text.replace(",", "."))


def row_reading(kind: str, text: str) -> float:
    """Return the reading of a row that has one of its own kind: a swap's word, a bounded number.

    Raises
    ------
    ValueError
        If the cell holds anything else.

    Examples
    --------
    >>> row_reading("swap", "inverted"), row_reading("panel", "0,98")
    (-1.0, 0.98)
    """
    if kind == "swap":
        if text.lower() not in SWAPS:
            raise ValueError(f"reading {text!r} of a swap; write normal or inverted")
        return SWAPS[text.lower()]
    try:
        value = number(text)
    except ValueError as error:
        raise ValueError(f"reading {error}") from None
    low, high, unit = READINGS.get(kind, (-1e12, 1e12, ""))
    if not low <= value <= high:
        raise ValueError(f"reading {value:g} of a {kind} row; write a number from {low:g} to "
                         f"{high:g}" + ("" if unit in ("", "1") else f", in {unit}"))
    return value


def weather_reading(quantity: str, reading: float, reading_u: float,
                    settings: TemperatureSettings) -> dict[str, float]:
    """Return a hand-read weather value and its u in SI.

    Raises
    ------
    ValueError
        If the quantity is not known, the reading outside what its unit allows, or a cloud fraction
        comes without its u.
    """
    if quantity not in WEATHER:
        raise ValueError(f"quantity {quantity!r} is no hand-read weather; write one of "
                         f"{', '.join(WEATHER)}")
    scale, shift, low, high, unit, setting = WEATHER[quantity]
    if reading == reading and not low <= reading <= high:
        raise ValueError(f"reading {reading:g} is no {quantity} in {unit}; write a number from "
                         f"{low:g} to {high:g}")
    u_si = reading_u * scale
    if reading_u != reading_u:
        if not setting:
            raise ValueError(f"a {quantity} needs reading_u, its standard uncertainty")
        u_si = getattr(settings, setting)
    return {"reading": reading * scale + shift, "reading_u": u_si}
