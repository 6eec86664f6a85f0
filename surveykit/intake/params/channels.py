"""Channels: the columns of the kit with all that holds for them, in SI."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from surveykit.core import FloatArray
from surveykit.intake.params.amounts import Amount, Uncertain
from surveykit.intake.params.heads import (
    BandConversion,
    BandRatio,
    Bands,
    Calibration,
    ClassTermsStated,
    Column,
    Head,
)
from surveykit.intake.params.quantities import DEFAULT_U, PHYSICAL_UNITS
from surveykit.intake.params.settings import Settings

AS_STATED = ("half_angle_deg", "view_angle_deg", "band_centres_nm", "band_widths_nm", "class_terms",
             "spectrally_flat", "band_ratio", "band_conversion")


@dataclass(frozen=True)
class Channel:
    """A column with all that holds for it, in SI: value = offset + gain * reading.

    Gain and offset lead from the logged number straight to SI (K, W m-2, 1, Pa, m s-1); no
    further conversion by `unit` is due. `range` holds the ends of what can be read. `u_gain` is
    relative, `u_offset` in SI; equal scopes share an error. None means that the kit does not say;
    the time constant of a weather or housing channel that states none is 0.
    """

    logger: str
    column: str
    quantity: str
    unit: str
    gain: Uncertain
    offset: Uncertain
    u_gain: float
    u_offset: float
    gain_scope: str
    offset_scope: str
    calibration: Calibration | None
    band_um: tuple[float, float] | None
    half_angle_deg: float | None
    time_constant_s: float
    head_radius_m: float | None
    bore_emissivity: Uncertain
    emissivity_setting: float | None
    band_centres_nm: Bands | None
    band_widths_nm: Bands | None
    reflected_setting_k: float | None = None
    class_terms: str | ClassTermsStated | None = None
    spectrally_flat: bool | None = None
    rod_width_m: float | None = None
    band_ratio: BandRatio | None = None
    band_conversion: BandConversion | None = None
    range: tuple[float, float] | None = None
    band_response: tuple[tuple[float, float], ...] = ()
    view_angle_deg: float | None = None

    def to_si(self, reading: ArrayLike) -> FloatArray:
        """Return the readings in SI, NaN where they are."""
        return self.offset.value + self.gain.value * np.asarray(reading, dtype=np.float64)


def channel(name: str, header: str, column: Column, entry: Head, owner: str,
            settings: Settings) -> Channel:
    """Return one column of the logger `name`; what it does not state itself, its entry states.

    `owner` is whom its errors belong to where it has no calibration.
    """
    def stated(field: str) -> Any:
        own = getattr(column, field)
        return getattr(entry, field) if own is None else own

    units = PHYSICAL_UNITS[column.quantity]
    scale, shift = units.get(column.unit, next(iter(units.values())))
    gain, offset = column.gain or Amount(value=1.0), column.offset or Amount(value=0.0)
    u_gain = column.u_gain if gain.u is None else gain.u / abs(gain.value)
    u_offset = column.u_offset if offset.u is None else offset.u
    if u_gain is None and u_offset is None and column.quantity in DEFAULT_U:
        u_offset = getattr(settings.temperature, DEFAULT_U[column.quantity]) / scale
    u_gain, u_offset = u_gain or 0.0, (u_offset or 0.0) * scale
    gain_si = gain.value * scale
    calibration = stated("calibration")
    owner = calibration.id if calibration else owner
    response = stated("band_response") if column.band_um is None else column.band_response
    radius, rod = stated("head_radius_cm"), stated("rod_width_cm")
    ends: Any = tuple(sorted(shift + scale * offset.value + gain_si * end
                             for end in column.range or ()))
    bore = stated("bore_emissivity") or Uncertain(
        value=settings.temperature.bore_emissivity, u=settings.temperature.bore_emissivity_u)
    return Channel(
        logger=name, column=header, quantity=column.quantity, unit=column.unit,
        gain=Uncertain(value=gain_si, u=abs(gain_si) * u_gain),
        offset=Uncertain(value=shift + scale * offset.value, u=u_offset),
        u_gain=u_gain, u_offset=u_offset,
        gain_scope=f"{owner}:{header}:gain", offset_scope=f"{owner}:{header}:offset",
        calibration=calibration, band_response=response or (),
        band_um=(response[0][0], response[-1][0]) if response else stated("band_um"),
        time_constant_s=stated("tau_s") or 0.0, bore_emissivity=bore,
        head_radius_m=None if radius is None else radius / 100,
        emissivity_setting=column.emissivity_setting,
        reflected_setting_k=None if column.reflected_setting_degC is None
        else column.reflected_setting_degC + 273.15,
        rod_width_m=None if rod is None else rod / 100, range=ends if ends else None,
        **{field: stated(field) for field in AS_STATED})
