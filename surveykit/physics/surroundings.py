"""What a surface reflects in the thermal band: sky and walls.

Every function broadcasts over arrays; NaN in gives NaN out; humidity and emissivities are
fractions [1].
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from surveykit.core import FloatArray
from surveykit.physics.bands import Band


def vapour_pressure_hpa(t_k: ArrayLike, relative_humidity: ArrayLike) -> FloatArray:
    """Return the vapour pressure of moist air.

    Parameters
    ----------
    t_k : array_like
        Air temperature [K].
    relative_humidity : array_like
        Relative humidity over water [1].

    Returns
    -------
    ndarray
        Vapour pressure [hPa].

    References
    ----------
    Alduchov, O. A. & Eskridge, R. E. (1996), J. Appl. Meteorol. 35, 601-609 (Magnus form).

    Examples
    --------
    >>> print(f"{vapour_pressure_hpa(303.15, 0.30):.2f}")
    12.71
    """
    t_c = np.asarray(t_k, dtype=np.float64) - 273.15
    saturated = 6.1094 * np.exp(17.625 * t_c / (t_c + 243.04))
    return np.asarray(np.asarray(relative_humidity, dtype=np.float64) * saturated)


def sky_emissivity_window(t_k: ArrayLike, vapour_pressure_hpa: ArrayLike) -> FloatArray:
    """Return the emissivity of a clear sky at the zenith, 8-14 um.

    The coefficient belongs to the unit of the vapour pressure: 2.98e-8 with hPa (2.98e-6 with
    kPa, 2.98e-12 with Pa). Above about 35 hPa the form runs past 1; it is not cut here.

    Parameters
    ----------
    t_k : array_like
        Air temperature near the ground [K].
    vapour_pressure_hpa : array_like
        Vapour pressure near the ground [hPa].

    Returns
    -------
    ndarray
        Emissivity at the zenith [1], relative to a black body at air temperature.

    References
    ----------
    Idso, S. B. (1981), Water Resour. Res. 17, 295-304.

    Examples
    --------
    >>> print(f"{sky_emissivity_window(293.15, 10.0):.4f}")
    0.3229
    """
    e = np.asarray(vapour_pressure_hpa, dtype=np.float64)
    return np.asarray(0.24 + 2.98e-8 * e**2 * np.exp(3000 / np.asarray(t_k, dtype=np.float64)))


def hemispheric_emissivity(zenith_emissivity: ArrayLike) -> FloatArray:
    """Return the emissivity of the whole sky from that at the zenith, 8-14 um.

    Parameters
    ----------
    zenith_emissivity : array_like
        Emissivity at the zenith [1], see `sky_emissivity_window`.

    Returns
    -------
    ndarray
        Emissivity of the hemisphere [1].

    References
    ----------
    Kimball, B. A., Idso, S. B. & Aase, J. K. (1982), Water Resour. Res. 18, 931-936.

    Examples
    --------
    >>> print(f"{hemispheric_emissivity(0.3229):.4f}")
    0.4104
    """
    zenith = np.asarray(zenith_emissivity, dtype=np.float64)
    return np.asarray(zenith * (1.4 - 0.4 * zenith))


def sky_emissivity_full(t_k: ArrayLike, vapour_pressure_hpa: ArrayLike) -> FloatArray:
    """Return the broadband emissivity of a clear sky.

    Not for an instrument of the 8-14 um window, where the sky is far colder.

    Parameters
    ----------
    t_k : array_like
        Air temperature near the ground [K].
    vapour_pressure_hpa : array_like
        Vapour pressure near the ground [hPa].

    Returns
    -------
    ndarray
        Emissivity of the hemisphere [1], relative to a black body at air temperature.

    References
    ----------
    Idso, S. B. (1981), Water Resour. Res. 17, 295-304 (coefficients from memory).

    Examples
    --------
    >>> print(f"{sky_emissivity_full(293.15, 10.0):.4f}")
    0.7992
    """
    e = np.asarray(vapour_pressure_hpa, dtype=np.float64)
    return np.asarray(0.70 + 5.95e-5 * e * np.exp(1500 / np.asarray(t_k, dtype=np.float64)))


def sky_radiance(band: Band, t_k: ArrayLike, relative_humidity: ArrayLike) -> FloatArray:
    """Return the mean radiance of a clear sky in the band, as rough ground reflects it.

    The emissivity is cut at 1. Its model holds for 8-14 um; a somewhat different band takes it
    over as it is.

    Parameters
    ----------
    band : Band
        Band of the instrument.
    t_k : array_like
        Air temperature near the ground [K].
    relative_humidity : array_like
        Relative humidity near the ground [1].

    Returns
    -------
    ndarray
        Radiance [W m-2 sr-1].

    References
    ----------
    Idso (1981) and Kimball, Idso & Aase (1982), see `sky_emissivity_window` and
    `hemispheric_emissivity`.

    Examples
    --------
    >>> print(f"{sky_radiance(Band(8.0, 14.0), 303.15, 0.30):.4f}")
    24.4704
    """
    zenith = sky_emissivity_window(t_k, vapour_pressure_hpa(t_k, relative_humidity))
    return np.asarray(hemispheric_emissivity(np.minimum(zenith, 1.0)) * band.radiance(t_k))


def sky_view_of_horizon(elevation_deg: ArrayLike) -> float:
    """Return the share of a level surface's view that is sky, from the horizon around it.

    Parameters
    ----------
    elevation_deg : array_like, shape (n,)
        Elevation of the horizon in n evenly spaced directions [deg].

    Returns
    -------
    float
        Share, cosine-weighted [1].

    References
    ----------
    Hand integration: up to an elevation e the horizon of one direction takes sin^2 e.

    Examples
    --------
    >>> print(f"{sky_view_of_horizon([30, 30, 0, 0, 0, 0, 30, 30]):.3f}")
    0.875
    """
    return float(1 - np.mean(np.sin(np.radians(np.asarray(elevation_deg, dtype=np.float64))) ** 2))


def background_radiance(band: Band, sky_radiance: ArrayLike, sky_view: ArrayLike,
                        walls_k: ArrayLike, walls_emissivity: ArrayLike) -> FloatArray:
    """Return the mean radiance that falls on a surface from sky and walls together.

    Parameters
    ----------
    band : Band
        Band of the instrument.
    sky_radiance : array_like
        Radiance of the sky [W m-2 sr-1].
    sky_view : array_like
        Share of the surface's view that is sky, cosine-weighted [1]; walls fill the rest.
    walls_k : array_like
        Temperature of the walls [K]; it must be a number even where `sky_view` is 1.
    walls_emissivity : array_like
        Emissivity of the walls in the band [1]; they reflect sky.

    Returns
    -------
    ndarray
        Radiance [W m-2 sr-1].

    References
    ----------
    Siegel & Howell, Thermal Radiation Heat Transfer: sum over view factors.

    Examples
    --------
    >>> b = Band(8.0, 14.0)
    >>> print(f"{background_radiance(b, 24.47, 0.7, 318.15, 1.0):.2f}")
    38.55
    """
    sky = np.asarray(sky_radiance, dtype=np.float64)
    view = np.asarray(sky_view, dtype=np.float64)
    eps = np.asarray(walls_emissivity, dtype=np.float64)
    walls = eps * band.radiance(walls_k) + (1 - eps) * sky
    return np.asarray(view * sky + (1 - view) * walls)
