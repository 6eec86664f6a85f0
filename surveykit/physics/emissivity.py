"""Emissivity measured in the field: reference pairs, two backgrounds, and a foil's background.

Every function broadcasts over arrays; radiances are those of one band [W m-2 sr-1].
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from surveykit.core import FloatArray
from surveykit.physics.bands import Band


def emissivity_of_pair(band: Band, brightness_k: ArrayLike, surface_k: ArrayLike,
                       background_radiance: ArrayLike) -> FloatArray:
    """Return the emissivity that makes an infrared reading agree with a reference temperature.

    (L(T_b) - L_bg) / (L(T_s) - L_bg). Near T_s = T_bg it cannot be measured.

    Parameters
    ----------
    band : Band
        Band of the instrument.
    brightness_k : array_like
        Brightness temperature [K], a reading with emissivity 1.
    surface_k : array_like
        Temperature of the same spot by a reference thermometer [K].
    background_radiance : array_like
        Mean radiance that falls on the surface [W m-2 sr-1].

    Returns
    -------
    ndarray
        Emissivity [1], not cut at 1; infinite or NaN where surface and background are alike.

    References
    ----------
    ASTM E1933, contact thermometer method (from memory).

    Examples
    --------
    >>> b = Band(8.0, 14.0)
    >>> print(f"{emissivity_of_pair(b, 320.15, 322.717, 24.4704):.3f}")
    0.950
    """
    background = np.asarray(background_radiance, dtype=np.float64)
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray((band.radiance(brightness_k) - background)
                          / (band.radiance(surface_k) - background))


def emissivity_of_two_backgrounds(reading_1: ArrayLike, reading_2: ArrayLike,
                                  background_1: ArrayLike,
                                  background_2: ArrayLike) -> FloatArray:
    """Return the emissivity from readings of one surface below two backgrounds.

    1 - (L1 - L2) / (L_bg1 - L_bg2): the surface's own emission drops out if it did not change in
    between, which takes a lid and a few seconds.

    Parameters
    ----------
    reading_1, reading_2 : array_like
        Radiance of the surface below each background [W m-2 sr-1].
    background_1, background_2 : array_like
        Radiance of the backgrounds [W m-2 sr-1].

    Returns
    -------
    ndarray
        Emissivity [1]; NaN where the backgrounds are alike.

    References
    ----------
    Buettner, K. J. K. & Kern, C. D. (1965), J. Geophys. Res. 70, 1329-1337; Fuchs, M. & Tanner,
    C. B. (1966), Agron. J. 58, 597-601 (both from memory).

    Examples
    --------
    >>> print(f"{emissivity_of_two_backgrounds(74.0, 77.2, 24.0, 88.0):.2f}")
    0.95
    """
    step = np.asarray(background_1, dtype=np.float64) - np.asarray(background_2, dtype=np.float64)
    change = np.asarray(reading_1, dtype=np.float64) - np.asarray(reading_2, dtype=np.float64)
    return np.asarray(1 - change / np.where(step == 0, np.nan, step))


def foil_background(band: Band, foil_k: ArrayLike, foil_body_k: ArrayLike,
                    foil_reflectance: ArrayLike) -> FloatArray:
    """Return the radiance that a diffuse foil beside the target shows to fall on both.

    (L(T_foil) - (1 - rho) L(T_body)) / rho: what the foil emits itself is taken off.

    Parameters
    ----------
    band : Band
        Band of the instrument.
    foil_k : array_like
        Brightness temperature of the foil [K], a reading with emissivity 1.
    foil_body_k : array_like
        Temperature of the foil itself [K].
    foil_reflectance : array_like
        Its reflectance rho [1].

    Returns
    -------
    ndarray
        Radiance [W m-2 sr-1].

    References
    ----------
    ISO 18434-1 and ASTM E1862, reflector method (from memory); with the foil's own emission.

    Examples
    --------
    >>> b = Band(8.0, 14.0)
    >>> seen = b.temperature_k(0.96 * b.radiance(253.15) + 0.04 * b.radiance(313.15))
    >>> print(f"{b.temperature_k(foil_background(b, seen, 313.15, 0.96)):.2f}")
    253.15
    """
    rho = np.asarray(foil_reflectance, dtype=np.float64)
    return np.asarray((band.radiance(foil_k) - (1 - rho) * band.radiance(foil_body_k)) / rho)
