"""Energy at the surface: longwave up, net radiation, and the solar reflectance index."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from surveykit.core import FloatArray, Sourced
from surveykit.physics.bands import SIGMA

E1980 = "ASTM E1980, standard solar and ambient conditions"
SRI_IRRADIANCE = Sourced(1000.0, 0.0, "W m-2", E1980)
SRI_AIR = Sourced(310.0, 0.0, "K", E1980)
SRI_SKY = Sourced(300.0, 0.0, "K", E1980)
SRI_BLACK = (0.05, 0.90)  # reflectance and emissivity of the black reference (E1980, from memory)
SRI_WHITE = (0.80, 0.90)  # and of the white one
HOTTEST_K, STEPS = 600.0, 20  # where the search for a temperature begins, and Newton's steps
SRI_CONVECTION = {"low": 5.0, "medium": 12.0, "high": 30.0}  # W m-2 K-1, by wind (E1980)


class ReflectanceIndex(NamedTuple):
    """SRI by the balance and by the regression equation, and the surface's temperature [K]."""

    balance: FloatArray
    regression: FloatArray
    surface_k: FloatArray


def longwave_up(surface_k: ArrayLike, down_w_m2: ArrayLike, emissivity: ArrayLike) -> FloatArray:
    """Return the longwave irradiance that leaves a surface.

    Parameters
    ----------
    surface_k : array_like
        Surface temperature [K].
    down_w_m2 : array_like
        Longwave irradiance from the sky [W m-2].
    emissivity : array_like
        Broadband emissivity [1]; not that of the 8-14 um band.

    Returns
    -------
    ndarray
        Irradiance [W m-2].

    References
    ----------
    Stefan-Boltzmann law with reflected sky: e sigma T^4 + (1 - e) down.

    Examples
    --------
    >>> print(f"{longwave_up(330.0, 400.0, 0.94):.2f}")
    656.11
    """
    eps = np.asarray(emissivity, dtype=np.float64)
    return np.asarray(eps * SIGMA.value * np.asarray(surface_k, dtype=np.float64)**4
                      + (1 - eps) * np.asarray(down_w_m2, dtype=np.float64))


def net_radiation(albedo: ArrayLike, shortwave_down_w_m2: ArrayLike,
                  longwave_down_w_m2: ArrayLike, longwave_up_w_m2: ArrayLike) -> FloatArray:
    """Return the net radiation of a surface.

    Parameters
    ----------
    albedo : array_like
        Albedo [1].
    shortwave_down_w_m2, longwave_down_w_m2, longwave_up_w_m2 : array_like
        Irradiances [W m-2].

    Returns
    -------
    ndarray
        (1 - albedo) G + down - up [W m-2], positive towards the surface.

    References
    ----------
    Sum of the four components.

    Examples
    --------
    >>> print(f"{net_radiation(0.1, 850.0, 400.0, 656.11):.2f}")
    508.89
    """
    return np.asarray((1 - np.asarray(albedo, dtype=np.float64))
                      * np.asarray(shortwave_down_w_m2, dtype=np.float64)
                      + np.asarray(longwave_down_w_m2, dtype=np.float64)
                      - np.asarray(longwave_up_w_m2, dtype=np.float64))


def balance_temperature_k(reflectance: ArrayLike, emissivity: ArrayLike,
                          convection: ArrayLike) -> FloatArray:
    """Return the temperature of a surface under the standard conditions of E1980.

    Parameters
    ----------
    reflectance, emissivity : array_like
        Solar reflectance and broadband emissivity [1].
    convection : array_like
        Convection coefficient [W m-2 K-1]: 5, 12 or 30 for low, medium and high wind.

    Returns
    -------
    ndarray
        Temperature [K].

    References
    ----------
    ASTM E1980-11, steady heat balance: (1 - R) I = e sigma (T^4 - Tsky^4) + h (T - Ta), by Newton's
    method from above, where it is convex and each step nears the root.

    Examples
    --------
    >>> print(f"{balance_temperature_k(0.05, 0.90, 12.0):.3f}")
    355.607
    """
    absorbed = (1 - np.asarray(reflectance, dtype=np.float64)) * SRI_IRRADIANCE.value
    emitted = np.asarray(emissivity, dtype=np.float64) * SIGMA.value
    carried = np.asarray(convection, dtype=np.float64)
    t = np.full(np.broadcast(absorbed, emitted, carried).shape, HOTTEST_K)
    for _ in range(STEPS):
        loss = emitted * (t**4 - SRI_SKY.value**4) + carried * (t - SRI_AIR.value)
        t = t - (loss - absorbed) / (4 * emitted * t**3 + carried)
    return t


def solar_reflectance_index(reflectance: ArrayLike, emissivity: ArrayLike,
                            convection: float) -> ReflectanceIndex:
    """Return the solar reflectance index by the heat balance and by the regression equation.

    Parameters
    ----------
    reflectance, emissivity : array_like
        Solar reflectance and broadband emissivity [1].
    convection : float
        Convection coefficient [W m-2 K-1]: 5, 12 or 30.

    Returns
    -------
    ReflectanceIndex
        The equation gives NaN outside its range: absorptance above .1 (and not above .8 with an
        emissivity below .2), emissivity above .1.

    References
    ----------
    ASTM E1980-11, equations 1 to 4; reference surfaces from memory. The equation gives .35 and
    99.4 for the standard's own references: the balance is the definition.

    Examples
    --------
    >>> found = solar_reflectance_index(0.30, 0.90, 12.0)
    >>> print(f"{found.balance:.2f} {found.regression:.2f}")
    31.87 32.14
    """
    surface, black, white = (balance_temperature_k(r, e, convection) for r, e in (
        (reflectance, emissivity), SRI_BLACK, SRI_WHITE))
    absorbed, eps = 1 - np.asarray(reflectance, np.float64), np.asarray(emissivity, np.float64)
    chi = (absorbed - 0.029 * eps) * (8.797 + convection) / (9.5205 * eps + convection)
    held = (absorbed > 0.1) & (eps > 0.1) & ~((absorbed > 0.8) & (eps < 0.2))
    regression = np.where(held, 123.97 - 141.35 * chi + 9.655 * chi**2, np.nan)
    return ReflectanceIndex(100 * (black - surface) / (black - white), regression, surface)
