"""Surface temperature from infrared readings: stand-off, contact and longwave.

Every function broadcasts over arrays; NaN in gives NaN out; emissivities are fractions [1].
"""

from __future__ import annotations

from math import pi

import numpy as np
from numpy.typing import ArrayLike

from surveykit.core import FloatArray
from surveykit.physics.bands import SIGMA, Band


def brightness_without_setting(band: Band, logged_k: ArrayLike, emissivity_setting: ArrayLike,
                               reflected_k: ArrayLike) -> FloatArray:
    """Return the brightness temperature behind a reading logged with an emissivity set.

    L(T_b) = setting L(T_logged) + (1 - setting) L(T_reflected), which undoes the instrument's
    own correction.

    Parameters
    ----------
    band : Band
        Band of the instrument.
    logged_k : array_like
        Temperature as logged [K].
    emissivity_setting : array_like
        Emissivity set in the instrument [1].
    reflected_k : array_like
        Reflected temperature set in the instrument [K].

    Returns
    -------
    ndarray
        Brightness temperature [K].

    References
    ----------
    ASTM E1933 and ISO 18434-1 (from memory): the balance of emitted and reflected radiance.
    """
    setting = np.asarray(emissivity_setting, dtype=np.float64)
    return band.temperature_k(setting * band.radiance(logged_k)
                              + (1 - setting) * band.radiance(reflected_k))


def standoff_temperature_k(band: Band, brightness_k: ArrayLike, emissivity: ArrayLike,
                           background_radiance: ArrayLike) -> FloatArray:
    """Return the temperature of a surface seen from a distance.

    L(T_s) = [L(T_b) - (1 - emissivity) L_background] / emissivity; the path of a few metres of
    air is left out.

    Parameters
    ----------
    band : Band
        Band of the instrument.
    brightness_k : array_like
        Brightness temperature [K], a reading with emissivity 1.
    emissivity : array_like
        Emissivity of the surface in the band [1].
    background_radiance : array_like
        Mean radiance that falls on the surface [W m-2 sr-1], see `background_radiance`.

    Returns
    -------
    ndarray
        Surface temperature [K]; NaN outside 150-500 K.

    References
    ----------
    ASTM E1933 and ISO 18434-1 (from memory): the balance of emitted and reflected radiance.

    Examples
    --------
    >>> print(f"{standoff_temperature_k(Band(8.0, 14.0), 320.15, 0.95, 24.4704) - 273.15:.2f}")
    49.57
    """
    eps = np.asarray(emissivity, dtype=np.float64)
    reflected = (1 - eps) * np.asarray(background_radiance, dtype=np.float64)
    return band.temperature_k((band.radiance(brightness_k) - reflected) / eps)


def contact_temperature_k(band: Band, brightness_k: ArrayLike, emissivity: ArrayLike,
                          body_k: ArrayLike, bore_emissivity: ArrayLike, rim_gap: ArrayLike,
                          sky_radiance: ArrayLike) -> FloatArray:
    """Return the temperature of a surface under an instrument pressed onto it.

    Surface and bore are the two sides of a cavity (parallel-plate limit). The surface leaves
    J = e L(T_s) + (1 - e) G and receives G = (1 - f) [w L(T_body) + (1 - w) J] + f L_sky, with e
    its emissivity, w that of the bore and f the open share of the rim. f = 0 is the closed
    cavity, f = 1 the stand-off balance.

    Parameters
    ----------
    band : Band
        Band of the instrument.
    brightness_k : array_like
        Brightness temperature [K], a reading with emissivity 1.
    emissivity : array_like
        Emissivity of the surface in the band [1].
    body_k : array_like
        Temperature of the bore: the instrument's body [K].
    bore_emissivity : array_like
        Emissivity of the bore [1]; 1 is black.
    rim_gap : array_like
        Share of the surface's view that leaks past the rim to the sky [1]; 0 when pressed flat.
    sky_radiance : array_like
        Radiance that comes in through the gap [W m-2 sr-1]; any number when there is no gap.

    Returns
    -------
    ndarray
        Surface temperature [K]; NaN outside 150-500 K.

    References
    ----------
    Siegel & Howell, Thermal Radiation Heat Transfer: enclosure of two grey diffuse surfaces.

    Examples
    --------
    >>> ts = contact_temperature_k(Band(8.0, 14.0), 331.87, 0.95, 303.15, 0.95, 0.0, 0.0)
    >>> print(f"{ts - 273.15:.1f}")
    60.0
    """
    eps = np.asarray(emissivity, dtype=np.float64)
    bore = np.asarray(bore_emissivity, dtype=np.float64)
    gap = np.asarray(rim_gap, dtype=np.float64)
    leaving = band.radiance(brightness_k) * (1 - (1 - eps) * (1 - gap) * (1 - bore))
    received = ((1 - gap) * bore * band.radiance(body_k)
                + gap * np.asarray(sky_radiance, dtype=np.float64))
    return band.temperature_k((leaving - (1 - eps) * received) / eps)


def longwave_temperature_k(up_w_m2: ArrayLike, down_w_m2: ArrayLike,
                           emissivity: ArrayLike) -> FloatArray:
    """Return the surface temperature from broadband longwave irradiance up and down.

    Parameters
    ----------
    up_w_m2, down_w_m2 : array_like
        Longwave irradiance [W m-2] coming from the surface and from the sky.
    emissivity : array_like
        Broadband emissivity of the surface [1]; not that of the 8-14 um band.

    Returns
    -------
    ndarray
        Surface temperature [K]; NaN where the emitted part is not positive.

    References
    ----------
    Stefan-Boltzmann law with reflected sky: up = e sigma T^4 + (1 - e) down.

    Examples
    --------
    >>> print(f"{longwave_temperature_k(656.11, 400.0, 0.94):.2f}")
    330.00
    """
    eps = np.asarray(emissivity, dtype=np.float64)
    emitted = np.asarray(up_w_m2, dtype=np.float64) - (1 - eps) * np.asarray(down_w_m2, np.float64)
    return np.asarray((np.where(emitted > 0, emitted, np.nan) / (eps * SIGMA.value))**0.25)


def head_cooling_k(absorbed_w_m2: ArrayLike, time_s: ArrayLike,
                   effusivity: ArrayLike) -> FloatArray:
    """Return by how much a sunlit surface cools once a head shades it.

    Parameters
    ----------
    absorbed_w_m2 : array_like
        Absorbed shortwave irradiance that the head cuts off [W m-2].
    time_s : array_like
        Time since the head was put down [s].
    effusivity : array_like
        Thermal effusivity sqrt(k rho c) of the ground [J m-2 K-1 s-1/2].

    Returns
    -------
    ndarray
        Cooling [K], positive when the surface gets colder.

    References
    ----------
    Carslaw & Jaeger, Conduction of Heat in Solids (from memory): semi-infinite solid under a
    step of flux, 2 q sqrt(t / pi) / e.

    Examples
    --------
    >>> print(f"{head_cooling_k(600.0, 5.0, 1300.0):.2f}")
    1.16
    """
    time = np.asarray(time_s, dtype=np.float64)
    return np.asarray(2 * np.asarray(absorbed_w_m2, np.float64) * np.sqrt(time / pi)
                      / np.asarray(effusivity, dtype=np.float64))
