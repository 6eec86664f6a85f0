"""Energy at the surface: longwave up, net radiation, and the solar reflectance index."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike
from scipy.optimize import brentq

from surveykit.core import FloatArray, Sourced
from surveykit.physics.bands import SIGMA

E1980 = "ASTM E1980, standard solar and ambient conditions"
SRI_IRRADIANCE = Sourced(1000.0, 0.0, "W m-2", E1980)
SRI_AIR = Sourced(310.0, 0.0, "K", E1980)
SRI_SKY = Sourced(300.0, 0.0, "K", E1980)
SRI_BLACK = (0.05, 0.90)  # reflectance and emissivity of the black reference (E1980, from memory)
SRI_WHITE = (0.80, 0.90)  # and of the white one
SRI_CONVECTION = {"low": 5.0, "medium": 12.0, "high": 30.0}  # W m-2 K-1, by wind (E1980)


class ReflectanceIndex(NamedTuple):
    """SRI by the balance and by the regression equation, and the surface's temperature [K]."""

    balance: float
    regression: float
    surface_k: float


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


def balance_temperature_k(reflectance: float, emissivity: float, convection: float) -> float:
    """Return the temperature of a surface under the standard conditions of E1980.

    Parameters
    ----------
    reflectance, emissivity : float
        Solar reflectance and broadband emissivity [1].
    convection : float
        Convection coefficient [W m-2 K-1]: 5, 12 or 30 for low, medium and high wind.

    Returns
    -------
    float
        Temperature [K].

    References
    ----------
    ASTM E1980-11, steady heat balance: (1 - R) I = e sigma (T^4 - Tsky^4) + h (T - Ta).

    Examples
    --------
    >>> print(f"{balance_temperature_k(0.05, 0.90, 12.0):.3f}")
    355.607
    """
    def gain(t: float) -> float:
        return float((1 - reflectance) * SRI_IRRADIANCE.value
                     - emissivity * SIGMA.value * (t**4 - SRI_SKY.value**4)
                     - convection * (t - SRI_AIR.value))

    return float(brentq(gain, 200.0, 600.0, xtol=1e-10))


def solar_reflectance_index(reflectance: float, emissivity: float,
                            convection: float) -> ReflectanceIndex:
    """Return the solar reflectance index by the heat balance and by the regression equation.

    Parameters
    ----------
    reflectance, emissivity : float
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
    surface, black, white = (balance_temperature_k(*pair, convection)
                             for pair in ((reflectance, emissivity), SRI_BLACK, SRI_WHITE))
    absorbed = 1 - reflectance
    regression = float("nan")
    if absorbed > 0.1 and emissivity > 0.1 and not (absorbed > 0.8 and emissivity < 0.2):
        chi = ((absorbed - 0.029 * emissivity) * (8.797 + convection)
               / (9.5205 * emissivity + convection))
        regression = 123.97 - 141.35 * chi + 9.655 * chi**2
    return ReflectanceIndex(100 * (black - surface) / (black - white), regression, surface)
