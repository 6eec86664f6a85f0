"""Thermal radiation of a black body: spectral, below a wavelength, and in a band.

Every function broadcasts over arrays; NaN in gives NaN out.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache, cached_property
from math import factorial, pi
from typing import Any

import numpy as np
from numpy.typing import ArrayLike
from scipy import constants
from scipy.interpolate import CubicSpline
from scipy.special import bernoulli

from surveykit.core import FloatArray, Sourced

_SI = "SI defining constants (CODATA 2022), exact"
SIGMA = Sourced(constants.sigma, 0.0, "W m-2 K-4", f"Stefan-Boltzmann constant, {_SI}")
C1L = Sourced(2 * constants.h * constants.c**2 * 1e24, 0.0, "W m-2 sr-1 um4",
              f"first radiation constant for spectral radiance, 2 h c^2, {_SI}")
C2 = Sourced(constants.h * constants.c / constants.k * 1e6, 0.0, "um K",
             f"second radiation constant, h c / k, {_SI}")

_LOWEST_K, _HIGHEST_K, _STEP_K = 150.0, 500.0, 2.5
_FRACTION_TERMS = 40  # e^-40 is below the rounding of a double


def planck_radiance(wavelength_um: ArrayLike, t_k: ArrayLike) -> FloatArray:
    """Return the spectral radiance of a black body.

    Parameters
    ----------
    wavelength_um : array_like
        Wavelength in vacuum [um].
    t_k : array_like
        Temperature [K].

    Returns
    -------
    ndarray
        Spectral radiance [W m-2 sr-1 um-1].

    References
    ----------
    Planck's law, e.g. Siegel & Howell, Thermal Radiation Heat Transfer, chapter 1.

    Examples
    --------
    >>> print(f"{planck_radiance(10.0, 300.0):.6f}")
    9.924033
    """
    wavelength = np.asarray(wavelength_um, dtype=np.float64)
    with np.errstate(over="ignore"):
        return np.asarray(C1L.value / wavelength**5
                          / np.expm1(C2.value / (wavelength * np.asarray(t_k, dtype=np.float64))))


def blackbody_fraction(lambda_t_um_k: ArrayLike) -> FloatArray:
    """Return the share of a black body's emission below a wavelength.

    The exponential series is used for x = c2 / (lambda T) >= 1, the power series (Bernoulli
    numbers) below; both are exact to the rounding of a double.

    Parameters
    ----------
    lambda_t_um_k : array_like
        Wavelength times temperature [um K].

    Returns
    -------
    ndarray
        Fraction [1]; NaN for a negative product.

    References
    ----------
    Chang, S. L. & Rhee, K. T. (1984), Int. Commun. Heat Mass Transfer 11, 451-455.
    Siegel & Howell, Thermal Radiation Heat Transfer, appendix A.

    Examples
    --------
    >>> print(f"{blackbody_fraction(3000.0):.6f}")
    0.273229
    """
    product = np.asarray(lambda_t_um_k, dtype=np.float64)
    with np.errstate(divide="ignore"):
        x = C2.value / product
    large = np.clip(x, 1.0, 700.0)
    series = np.zeros_like(large)
    for n in range(1, _FRACTION_TERMS + 1):
        series += np.exp(-n * large) / n * (((large + 3 / n) * large + 6 / n**2) * large + 6 / n**3)
    small = np.clip(x, 0.0, 1.0)
    power = np.zeros_like(small)
    for k, number in enumerate(bernoulli(20)):
        power += number / factorial(k) / (k + 3) * small**(k + 3)
    fraction = 15 / pi**4 * series
    return np.where(product < 0, np.nan, np.where(x < 1, 1 - 15 / pi**4 * power, fraction))


def band_radiance(low_um: float, high_um: float, t_k: ArrayLike) -> FloatArray:
    """Return a black body's radiance between two wavelengths, from the exact series.

    Parameters
    ----------
    low_um, high_um : float
        Edges of the band [um]; the response is 1 inside and 0 outside.
    t_k : array_like
        Temperature [K].

    Returns
    -------
    ndarray
        Radiance [W m-2 sr-1].

    References
    ----------
    See `blackbody_fraction`.
    """
    t = np.asarray(t_k, dtype=np.float64)
    share = blackbody_fraction(high_um * t) - blackbody_fraction(low_um * t)
    return np.asarray(SIGMA.value / pi * t**4 * share)


@dataclass(frozen=True)
class Band:
    """A wavelength band of flat response and its two conversions.

    Radiance and temperature are read from cubic splines of 1/T against ln L through the exact
    integral at every 2.5 K between 150 and 500 K: within 1e-7 of the radiance (relative) and
    far below 1 mK. `band` returns a shared one.

    Parameters
    ----------
    low_um, high_um : float
        Edges of the band [um].

    Raises
    ------
    ValueError
        If the edges are not 0 < low_um < high_um.

    References
    ----------
    See `blackbody_fraction` for the band integral.

    Examples
    --------
    >>> b = Band(8.0, 14.0)
    >>> print(f"{b.radiance(300.0):.4f}", f"{b.temperature_k(54.933461):.3f}")
    54.9335 300.000
    """

    low_um: float
    high_um: float

    def __post_init__(self) -> None:
        if not 0 < self.low_um < self.high_um:
            raise ValueError(f"a band needs 0 < low_um < high_um, "
                             f"got {self.low_um!r} and {self.high_um!r}")

    @cached_property
    def _table(self) -> tuple[FloatArray, FloatArray]:
        t = np.arange(_LOWEST_K, _HIGHEST_K + _STEP_K / 2, _STEP_K)
        return 1 / t, np.log(band_radiance(self.low_um, self.high_um, t))

    @cached_property
    def _log_radiance(self) -> Any:
        inverse_t, log_radiance = self._table
        return CubicSpline(inverse_t[::-1], log_radiance[::-1], extrapolate=False)

    @cached_property
    def _inverse_t(self) -> Any:
        inverse_t, log_radiance = self._table
        return CubicSpline(log_radiance, inverse_t, extrapolate=False)

    def radiance(self, t_k: ArrayLike) -> FloatArray:
        """Return the black-body radiance [W m-2 sr-1] at `t_k` [K]; NaN where t_k is not above 0.

        Outside 150-500 K the exact integral is evaluated itself.
        """
        t = np.asarray(t_k, dtype=np.float64)
        with np.errstate(divide="ignore"):
            radiance = np.exp(self._log_radiance(1 / t))
        beyond = np.isnan(radiance) & (t > 0)
        if beyond.any():
            exact = band_radiance(self.low_um, self.high_um, np.where(beyond, t, 300.0))
            radiance = np.where(beyond, exact, radiance)
        return np.asarray(radiance)

    def temperature_k(self, radiance: ArrayLike) -> FloatArray:
        """Return the black-body temperature [K] of a radiance [W m-2 sr-1].

        NaN outside 150-500 K, and where the radiance is not positive.
        """
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.asarray(1 / self._inverse_t(np.log(np.asarray(radiance, dtype=np.float64))))


@cache
def band(low_um: float, high_um: float) -> Band:
    """Return the one shared `Band` of these edges [um], so that its tables are made once."""
    return Band(low_um, high_um)
