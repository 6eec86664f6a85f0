"""Heads and their columns: calibration, optics, gain and offset, as the kit states them."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator
from datetime import date, timedelta
from typing import Annotated, Literal

from pydantic import Discriminator, Field, Tag

from surveykit.intake.params.amounts import Amount, BareNumber, Uncertain, given_once
from surveykit.intake.params.base import (
    DATE_WRITE,
    TEXT_WRITE,
    DateText,
    Fault,
    Strict,
    Text,
    key,
)
from surveykit.intake.params.quality import Pair
from surveykit.intake.params.quantities import MAIN, PHYSICAL_UNITS, RAW_UNITS, Quantity, Unit


class Calibration(Strict):
    """The calibration a gain and an offset come from."""

    id: Text = key("Its name; equal ids share one error.", write=TEXT_WRITE)
    date: DateText = key("Its date.", write=DATE_WRITE)
    valid_days: int | None = key(
        "Days it holds; absent: it does not expire.", default=None, gt=0, unit="days", whole=True)

    def expired_on(self, day: str) -> bool:
        """Return whether it had run out by `day` ("YYYY-MM-DD")."""
        if self.valid_days is None:
            return False
        limit = date.fromisoformat(self.date) + timedelta(days=min(self.valid_days, 36500))
        return date.fromisoformat(day) > limit


class Bands(Strict):
    """One number for each of the two bands."""

    red: float = key("Red band.", gt=0, le=5000, unit="nm")
    nir: float = key("Near-infrared band.", gt=0, le=5000, unit="nm")


class ClassTermsStated(Strict):
    """Limits of a pyranometer, as a certificate or a leaflet states them (bounds)."""

    directional_w_m2: float = key("Directional error at 1000 W m-2 of beam.", ge=0, unit="W m-2")
    zero_offset_w_m2: float = key("Zero offset under a clear sky.", ge=0, unit="W m-2")
    gain: float = key(
        "Non-linearity, temperature, tilt and ageing together, relative.", ge=0, lt=1, unit="")


class BandRatio(Strict):
    """Ratio of the gains of near infrared to red, ground head over sky head, of a certificate."""

    value: float = key("The ratio.", gt=0, unit="")
    u: float = key("Its standard uncertainty (k = 1).", ge=0, unit="")
    source: Text = key("Where it comes from.", write="where the value comes from, plain text")


class BandConversion(Strict):
    """A linear conversion of a head's NDVI to that of other bands."""

    slope: float = key("Slope.", gt=0, unit="")
    intercept: float = key("Intercept.", unit="")
    u: float = key("Standard uncertainty of a converted NDVI (k = 1).", ge=0, unit="")
    centres_nm: Bands = key("Centres of the bands converted to [nm].", write="{red, nir} in nm")
    widths_nm: Bands = key("Widths of the bands converted to [nm].", write="{red, nir} in nm")
    source: Text = key("Where it comes from.", write="where the values come from, plain text")


_INFRARED, _SHORTWAVE = ("brightness_temperature",), ("shortwave_down", "shortwave_up")
_BANDS = ("red_down", "red_up", "nir_down", "nir_up")
# what only some heads have: told elsewhere, since nothing would come of it
ONLY_OF: dict[str, tuple[str, ...]] = {
    "emissivity_setting": _INFRARED, "reflected_setting_degC": _INFRARED,
    "view_angle_deg": _INFRARED, "band_response": _INFRARED, "class_terms": _SHORTWAVE,
    "spectrally_flat": _SHORTWAVE, "band_ratio": _BANDS, "band_conversion": _BANDS}


def _shape(data: object) -> str:
    return "<explicit>" if isinstance(data, dict | ClassTermsStated) else "<class>"


class Head(Strict):
    """What may stand in the entry, for all its columns, or in one column, for that one."""

    calibration: Calibration | None = key(
        "Calibration of the channel.", default=None, write="{id, date, valid_days}")
    band_um: Pair | None = key("Thermal band [um].", default=None,
                               write="[low, high] in um, such as [8, 14]")
    band_response: Annotated[tuple[Pair, ...], Field(strict=False)] | None = key(
        "Response of an infrared head over wavelength, in place of band_um.", default=None,
        write="a list of [um, response] such as [[7.5, 0], [8.5, 1], [14, 0]], wavelengths rising")
    half_angle_deg: float | None = key(
        "Half of the field of view; 90 for a hemisphere.", default=None, gt=0, le=90, unit="deg")
    view_angle_deg: float | None = key(
        "Angle between where an infrared head looks and straight down; absent: straight down.",
        default=None, ge=0, le=60, unit="deg")
    time_constant_s: float | None = key(
        "Time constant (63 %).", default=None, ge=0, le=3600, unit="s")
    t95_s: float | None = key(
        "Time to 95 %, in place of time_constant_s.", default=None, ge=0, le=3600, unit="s")
    head_radius_cm: float | None = key("Radius of the head.", default=None, gt=0, le=100, unit="cm")
    bore_emissivity: Annotated[Uncertain, BareNumber(
        "temperature.bore_emissivity_u", 0.01, 1.0)] | None = key(
        "Emissivity of the bore of an infrared head.", default=None,
        write="a number from 0.01 to 1, or {value, u}")
    class_terms: Annotated[
        Annotated[Literal["A", "B", "C"], Tag("<class>")]
        | Annotated[ClassTermsStated, Tag("<explicit>")], Discriminator(_shape)] | None = key(
        "Class of a shortwave head by ISO 9060, or its limits.", default=None,
        write="A, B or C, or {directional_w_m2, zero_offset_w_m2, gain}")
    spectrally_flat: bool | None = key(
        "Whether a shortwave head responds alike to all wavelengths of sunlight.", default=None,
        write="true or false")
    rod_width_cm: float | None = key(
        "Width of the rod that holds the head.", default=None, gt=0, le=50, unit="cm")
    band_ratio: BandRatio | None = key(
        "Certificate of the gains of near infrared to red, at the ground heads.", default=None,
        write="{value, u, source}")
    band_conversion: BandConversion | None = key(
        "Conversion of NDVI to that of other bands, at the ground heads; without one, NDVI of "
        "other bands is not compared.", default=None,
        write="{slope, intercept, u, centres_nm, widths_nm, source}")
    band_centres_nm: Bands | None = key("Centres of the red and near-infrared bands [nm].",
                                        default=None, write="{red, nir} in nm")
    band_widths_nm: Bands | None = key("Widths of the red and near-infrared bands [nm].",
                                       default=None, write="{red, nir} in nm")

    def faults(self) -> Iterator[Fault]:
        """time_constant_s or t95_s; a band from low to high."""
        if self.time_constant_s is not None and self.t95_s is not None:
            yield ("t95_s",), f"got {self.t95_s:g} beside time_constant_s; write one of the two"
        if self.band_um and not 0.1 <= self.band_um[0] < self.band_um[1] <= 100:
            yield ("band_um",), f"got {list(self.band_um)}; write [low, high] in um, " \
                                "such as [8, 14]"
        if self.band_response is not None:
            at, response = zip(*self.band_response, strict=True) if self.band_response else ((), ())
            if self.band_um or not 2 <= len(at) <= 500 or any(
                    b <= a for a, b in zip(at, at[1:], strict=False)) or not 0.1 <= at[0] \
                    or at[-1] > 100 or min(response) < 0 or not max(response) > 0:
                yield ("band_response",), (
                    f"got {len(at)} points" + (" beside band_um" if self.band_um else "")
                    + "; write 2 to 500 [um, response] in place of band_um, wavelengths rising "
                    "within 0.1 to 100, no response below 0, one above")

    def misplaced(self, kind: str, quantities: Iterable[str]) -> Iterator[Fault]:
        """Yield the faults of what no column of these quantities has."""
        for name, heads in ONLY_OF.items():
            value = getattr(self, name, None)
            if value is not None and set(heads).isdisjoint(quantities):
                got = f"{value:g}" if isinstance(value, float) else "it"
                yield (name,), f"got {got} in {kind} of {', '.join(quantities)}; only a column " \
                               f"of {' or '.join(heads)} has one: leave it out"

    @property
    def tau_s(self) -> float | None:
        """Time constant [s], from t95 where that is given (t95 = tau ln 20); None if unstated."""
        return self.t95_s / math.log(20) if self.t95_s is not None else self.time_constant_s


class Column(Head):
    """One column: value = offset + gain * reading, in the quantity's physical unit."""

    quantity: Quantity = key("What the column holds.", write="one of " + ", ".join(PHYSICAL_UNITS))
    unit: Unit = key("Unit as logged.", write="one of degC, K, W m-2, mV, uV, count, 1, %, hPa, "
                     "kPa, Pa, m s-1 (1 and % in quotes)")
    gain: Annotated[Amount, BareNumber()] | None = key(
        "Physical unit for one of the logged unit.", default=None,
        write="a number, or {value, u}")
    offset: Annotated[Amount, BareNumber()] | None = key(
        "Physical unit; added after the gain.", default=None, write="a number, or {value, u}")
    range: Pair | None = key(
        "Smallest and largest reading that head and logger can give, as logged.", default=None,
        write="[low, high] as logged, two numbers, low below high")
    u_gain: float | None = key(
        "Relative standard uncertainty of the gain.", default=None, ge=0, unit="1")
    u_offset: float | None = key(
        "Standard uncertainty of the offset, physical unit.", default=None, ge=0, unit="")
    emissivity_setting: float | None = key(
        "Emissivity set in the infrared logger.", default=None, gt=0, le=1, unit="")
    reflected_setting_degC: float | None = key(  # noqa: N815 - the unit is written so
        "Reflected temperature set beside an emissivity other than 1; absent: the housing's.",
        default=None, ge=-90, le=100, unit="degC")

    def faults(self) -> Iterator[Fault]:
        """Unit, gain, offset and u must fit the quantity."""
        yield from super().faults()
        yield from given_once("gain", self.gain, "u_gain", self.u_gain)
        yield from given_once("offset", self.offset, "u_offset", self.u_offset)
        units = PHYSICAL_UNITS[self.quantity]
        if self.unit in RAW_UNITS:
            for name in ("gain", "offset"):
                if getattr(self, name) is None:
                    yield (name,), f"missing; a column in {self.unit} needs gain and offset: " \
                                   f"value = offset + gain * reading, in {next(iter(units))}"
        elif self.unit not in units:
            yield ("unit",), f"got {self.unit!r} for {self.quantity}; write one of " \
                             + ", ".join([*units, *RAW_UNITS])
        if self.gain is not None and self.gain.value == 0:
            yield ("gain",), "got 0; write a gain other than 0"
        stated = (self.u_gain, self.u_offset, self.gain and self.gain.u,
                  self.offset and self.offset.u)
        if self.range and not self.range[0] < self.range[1]:
            yield ("range",), f"got {list(self.range)}; write [low, high] as logged, low below high"
        if self.quantity in MAIN and all(u is None for u in stated):
            yield (), f"a column of {self.quantity} must state u_gain or u_offset " \
                      "(0 is allowed, silence is not)"
        yield from self.misplaced("a column", [self.quantity])
