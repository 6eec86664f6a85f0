"""Position of the sun, irradiance above the atmosphere and under a clear sky.

pvlib does the astronomy. Times are int64 ns since the epoch, UTC; `MISSING_NS` is no time.
"""

from __future__ import annotations

import sys
from functools import cache, lru_cache
from importlib import import_module
from importlib.machinery import PathFinder
from importlib.util import find_spec, module_from_spec
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from surveykit.core import FloatArray, IntArray, Sourced

SOLAR_CONSTANT = Sourced(1361.0, 0.5, "W m-2", "IAU 2015 Resolution B3, nominal total irradiance; "
                         "u: Kopp & Lean (2011), Geophys. Res. Lett. 38, L01706")
MISSING_NS = np.iinfo(np.int64).min
_GRID_NS = 60_000_000_000
_BLOCK = 360  # minutes worked out together
_REFRACTION_AT_HORIZON_DEG = 0.5667
_USUAL_AIR_DEGC = 12.0  # only in the refraction of `sun_track`: 0.02 deg at 70 deg zenith in all


class SunPosition(NamedTuple):
    """Where the sun stands [deg]: zenith without and with refraction, azimuth from north."""

    zenith_deg: FloatArray
    apparent_zenith_deg: FloatArray
    azimuth_deg: FloatArray


class Sun(NamedTuple):
    """The sun at each record: apparent zenith, azimuth from north, and irradiances."""

    zenith_deg: FloatArray
    azimuth_deg: FloatArray
    cos_zenith: FloatArray
    extraterrestrial_w_m2: FloatArray
    clear_sky_w_m2: FloatArray


def sun_position(time_ns: ArrayLike, latitude: float, longitude: float, elevation_m: float,
                 pressure_pa: float, temperature_c: float,
                 delta_t: float | None = None) -> SunPosition:
    """Return the position of the sun.

    Parameters
    ----------
    time_ns : array_like of int64, shape (n,)
        Times, ns since the epoch, UTC.
    latitude, longitude : float
        Degrees north and east; west and south are negative.
    elevation_m : float
        Height above sea level [m].
    pressure_pa, temperature_c : float
        Air pressure [Pa] and temperature [degC], for refraction.
    delta_t : float, optional
        Terrestrial time minus UT1 [s]; by default from a polynomial in the date.

    Returns
    -------
    SunPosition
        Three arrays of shape (n,) [deg].

    Raises
    ------
    ValueError
        If the times are not integers or the site is not on Earth.

    References
    ----------
    Reda, I. & Andreas, A. (2003), NREL/TP-560-34302, as in pvlib.

    Examples
    --------
    >>> noon = np.array(["2003-10-17T19:30:30"], "datetime64[ns]").astype("int64")
    >>> sun = sun_position(noon, 39.742476, -105.1786, 1830.14, 82000.0, 11.0, delta_t=67.0)
    >>> print(f"{sun.apparent_zenith_deg[0]:.5f}", f"{sun.azimuth_deg[0]:.5f}")
    50.11162 194.34024
    """
    times = _times(time_ns)
    if not (-90 <= latitude <= 90 and -180 <= longitude <= 180):
        raise ValueError(f"a site needs latitude within +-90 and longitude within +-180 degrees, "
                         f"got {latitude!r} and {longitude!r}")
    apparent, zenith, _, _, azimuth, _ = _spa().solar_position(
        times / 1e9, latitude, longitude, elevation_m, pressure_pa / 100, temperature_c,
        _delta_t(times) if delta_t is None else delta_t, _REFRACTION_AT_HORIZON_DEG)
    return SunPosition(zenith, apparent, azimuth)


def sun_track(time_ns: ArrayLike, latitude: float, longitude: float,
              elevation_m: float) -> Sun:
    """Return the sun's position and the irradiances it gives, for every record.

    Where records are closer than a minute, the sun's direction and the irradiances are worked out
    each minute and interpolated: within 2e-4 degrees of the direct result (.3 degrees in the
    minute of sunrise and sunset, where the refraction of the model jumps), far faster.
    The clear sky is the simplified Solis model with little aerosol (optical depth .1 at 700 nm),
    1 cm of water and the pressure of the height: a reference for ratios, not a measurement.

    Parameters
    ----------
    time_ns : array_like of int64, shape (n,)
        Times, ns since the epoch, UTC; `MISSING_NS` where there is none.
    latitude, longitude : float
        Degrees north and east; west and south are negative.
    elevation_m : float
        Height above sea level [m].

    Returns
    -------
    Sun
        Five arrays of shape (n,): angles [deg], cosine [1], irradiances [W m-2] (normal to the
        beam above the atmosphere; horizontal under a clear sky). NaN where the time is missing.

    Raises
    ------
    ValueError
        If the times are not integers or the site is not on Earth.

    References
    ----------
    Reda & Andreas (2003), see `sun_position`; Ineichen, P. (2008), Sol. Energy 82, 758-762.

    Examples
    --------
    >>> noon = np.array(["2024-06-20T12:00:00"], "datetime64[ns]").astype("int64")
    >>> track = sun_track(noon, 48.0, 0.0, 100.0)
    >>> print(f"{track.zenith_deg[0]:.2f}", f"{track.extraterrestrial_w_m2[0]:.0f}")
    24.56 1318
    """
    times = _times(time_ns)
    known = times != MISSING_NS
    columns = np.full((5, times.size), np.nan)
    if known.any():
        wanted = times[known]
        first = int(wanted.min() // _GRID_NS)
        steps = int(wanted.max() // _GRID_NS - first) + 2
        if steps < wanted.size:
            blocks = range(first // _BLOCK, (first + steps - 1) // _BLOCK + 1)
            grid = np.concatenate([_block(number, latitude, longitude, elevation_m)
                                   for number in blocks], axis=1)
            minutes = (wanted - blocks.start * _BLOCK * _GRID_NS) / _GRID_NS
            columns[:, known] = [np.interp(minutes, np.arange(grid.shape[1]), column)
                                 for column in grid]
        else:
            columns[:, known] = _columns(wanted, latitude, longitude, elevation_m)
    east, north, upward, extraterrestrial, clear_sky = columns
    zenith = np.arctan2(np.hypot(east, north), upward)
    return Sun(np.degrees(zenith), np.degrees(np.arctan2(east, north)) % 360, np.cos(zenith),
                    extraterrestrial, clear_sky)


@lru_cache(maxsize=64)
def _block(number: int, latitude: float, longitude: float, elevation_m: float) -> FloatArray:
    """Return the columns at every minute of a quarter of a day, kept for the passes in it."""
    minutes = number * _BLOCK + np.arange(_BLOCK)
    return np.array(_columns(minutes * _GRID_NS, latitude, longitude, elevation_m))


def _columns(times: IntArray, latitude: float, longitude: float,
             elevation_m: float) -> list[FloatArray]:
    """Return direction (east, north, up) and the two irradiances: all smooth in time."""
    from pvlib import atmosphere, clearsky  # late: they bring half of scipy

    pressure_pa = float(atmosphere.alt2pres(elevation_m))
    position = sun_position(times, latitude, longitude, elevation_m, pressure_pa, _USUAL_AIR_DEGC)
    zenith, azimuth = np.radians(position.apparent_zenith_deg), np.radians(position.azimuth_deg)
    distance_au = _spa().earthsun_distance(times / 1e9, _delta_t(times), 1)
    extraterrestrial = SOLAR_CONSTANT.value / distance_au**2
    clear = clearsky.simplified_solis(90 - position.apparent_zenith_deg, pressure=pressure_pa,
                                      dni_extra=extraterrestrial)
    return [np.sin(zenith) * np.sin(azimuth), np.sin(zenith) * np.cos(azimuth), np.cos(zenith),
            extraterrestrial, clear["ghi"]]


def clear_sky_shape(cos_zenith: ArrayLike) -> FloatArray:
    """Return the irradiance of a clear sky [W m-2] from the sun's height alone; 0 at night.

    For the shape of a day, not its level: see `sun_track` for a reference.

    References
    ----------
    Haurwitz, B. (1945), J. Meteorol. 2, 154-166, as in pvlib.
    """
    height = np.asarray(cos_zenith, dtype=np.float64)
    up = np.maximum(height, 1e-3)
    return np.where(height > 0, 1098.0 * up * np.exp(-0.059 / up), 0.0)


@cache
def _spa() -> Any:
    """Return pvlib's solar position algorithm without its package, half a second of imports."""
    package = find_spec("pvlib")
    found = package and PathFinder.find_spec("spa", package.submodule_search_locations)
    if not found or found.loader is None or "pvlib" in sys.modules:
        return import_module("pvlib.spa")
    module = module_from_spec(found)
    found.loader.exec_module(module)
    return module


def _delta_t(times: IntArray) -> FloatArray:
    months = times.astype("datetime64[ns]").astype("datetime64[M]").astype(np.int64)
    return np.asarray(_spa().calculate_deltat(1970 + months // 12, 1 + months % 12))


def _times(time_ns: ArrayLike) -> IntArray:
    times = np.atleast_1d(np.asarray(time_ns))
    if times.dtype.kind != "i":
        raise ValueError(f"times must be integer ns since the epoch, UTC, got {times.dtype}")
    return times.astype(np.int64)
