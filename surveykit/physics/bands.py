"""Thermal radiation of a black body: spectral, below a wavelength, and in a band.

Every function broadcasts over arrays; NaN in gives NaN out.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache, cached_property
from math import factorial, pi

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import ArrayLike
from scipy import constants
from scipy.special import bernoulli

from surveykit.core import FloatArray, Sourced

_SI = "SI defining constants (CODATA 2022), exact"
SIGMA = Sourced(constants.sigma, 0.0, "W m-2 K-4", f"Stefan-Boltzmann constant, {_SI}")
C1L = Sourced(2 * constants.h * constants.c**2 * 1e24, 0.0, "W m-2 sr-1 um4",
              f"first radiation constant for spectral radiance, 2 h c^2, {_SI}")
C2 = Sourced(constants.h * constants.c / constants.k * 1e6, 0.0, "um K",
             f"second radiation constant, h c / k, {_SI}")

_LOWEST_K, _HIGHEST_K, _STEP_K = 150.0, 500.0, 2.5
_DEGREE, _BLOCK = 12, 16384  # of the polynomials, and how many values are worked at a time
_NODES = 24  # of each stretch between two points of a tabulated response
_FRACTION_TERMS = 40  # e^-40 is below the rounding of a double
Response = tuple[tuple[float, float], ...]


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


class _Curve:
    """A smooth curve as a polynomial of its scaled abscissa; NaN outside its ends."""

    def __init__(self, coefficients: FloatArray, middle: float, half: float) -> None:
        self.coefficients, self.middle, self.half = coefficients, middle, half

    @classmethod
    def through(cls, x: FloatArray, y: FloatArray) -> _Curve:
        """Return the polynomial of least squares through the points."""
        middle, half = (x[0] + x[-1]) / 2, abs(x[-1] - x[0]) / 2
        fitted = chebyshev.chebfit((x - middle) / half, y, _DEGREE)
        return cls(np.asarray(chebyshev.cheb2poly(fitted), dtype=np.float64), float(middle),
                   float(half))

    def __call__(self, x: FloatArray) -> FloatArray:
        scaled = np.array((x - self.middle) / self.half, dtype=np.float64, ndmin=1)
        out = np.empty_like(scaled)
        flat, into = scaled.reshape(-1), out.reshape(-1)
        flat[np.abs(flat) > 1 + 1e-12] = np.nan
        for start in range(0, flat.size, _BLOCK):  # Horner's rule, a block in the cache at a time
            u = flat[start:start + _BLOCK]
            y = into[start:start + _BLOCK]
            y.fill(self.coefficients[-1])
            for coefficient in self.coefficients[-2::-1]:
                y *= u
                y += coefficient
        return out.reshape(np.shape(x))


@dataclass(frozen=True)
class Band:
    """A wavelength band and its two conversions: flat, or of any tabulated response.

    Radiance and temperature are read from Chebyshev polynomials of ln L against 1/T and of 1/T
    against ln L, fitted to the exact integral at every 2.5 K between 150 and 500 K: within 1e-7 of
    the radiance (relative) and far below 1 mK. `band` returns a shared one.

    Parameters
    ----------
    low_um, high_um : float
        Edges of the band [um].
    response : tuple of (float, float)
        Wavelength [um] and relative response [1], ascending from `low_um` to `high_um`, straight
        between the points and 0 outside them; empty where the response is 1 between the edges.

    Raises
    ------
    ValueError
        If the edges are not 0 < low_um < high_um, or the response does not ascend from one to the
        other or is nowhere positive.

    References
    ----------
    See `blackbody_fraction` for the flat band's integral; Gauss-Legendre quadrature of Planck's
    law between the points of a response; numpy.polynomial.chebyshev for the fit.

    Examples
    --------
    >>> b = Band(8.0, 14.0)
    >>> print(f"{b.radiance(300.0):.4f}", f"{b.temperature_k(54.933461):.3f}")
    54.9335 300.000
    >>> print(f"{Band(8.0, 14.0, ((8.0, 1.0), (14.0, 1.0))).radiance(300.0):.4f}")
    54.9335
    """

    low_um: float
    high_um: float
    response: Response = ()

    def __post_init__(self) -> None:
        if not 0 < self.low_um < self.high_um:
            raise ValueError(f"a band needs 0 < low_um < high_um, "
                             f"got {self.low_um!r} and {self.high_um!r}")
        if self.response:
            points, values = np.array(self.response).T
            if points.size < 2 or not (np.diff(points) > 0).all() or values.min() < 0 \
                    or not values.max() > 0 or (points[0], points[-1]) != (
                        self.low_um, self.high_um):
                raise ValueError("a response needs ascending wavelengths from low_um to high_um, "
                                 "no value below 0 and one above")

    @cached_property
    def _table(self) -> tuple[FloatArray, FloatArray]:
        t = np.arange(_LOWEST_K, _HIGHEST_K + _STEP_K / 2, _STEP_K)
        return 1 / t, np.log(self.exact_radiance(t))

    def exact_radiance(self, t_k: ArrayLike) -> FloatArray:
        """Return the band integral [W m-2 sr-1] itself, without the polynomials."""
        if not self.response:
            return band_radiance(self.low_um, self.high_um, t_k)
        nodes, weights = np.polynomial.legendre.leggauss(_NODES)
        points, values = np.array(self.response).T
        half = np.diff(points) / 2
        at = (points[:-1] + half)[:, None] + half[:, None] * nodes
        weight = half[:, None] * weights * np.interp(at, points, values)
        spectral = planck_radiance(at.ravel(), np.asarray(t_k, dtype=np.float64)[..., None])
        return np.asarray((spectral * weight.ravel()).sum(axis=-1))

    @cached_property
    def _log_radiance(self) -> _Curve:
        return _Curve.through(*self._table)

    @cached_property
    def _inverse_t(self) -> _Curve:
        inverse_t, log_radiance = self._table
        return _Curve.through(log_radiance, inverse_t)

    def radiance(self, t_k: ArrayLike) -> FloatArray:
        """Return the black-body radiance [W m-2 sr-1] at `t_k` [K]; NaN where t_k is not above 0.

        Outside 150-500 K the exact integral is evaluated itself.
        """
        t = np.asarray(t_k, dtype=np.float64)
        with np.errstate(divide="ignore"):
            radiance = np.exp(self._log_radiance(1 / t))
        beyond = np.isnan(radiance) & (t > 0)
        if beyond.any():
            exact = self.exact_radiance(np.where(beyond, t, 300.0))
            radiance = np.where(beyond, exact, radiance)
        return np.asarray(radiance)

    def temperature_k(self, radiance: ArrayLike) -> FloatArray:
        """Return the black-body temperature [K] of a radiance [W m-2 sr-1].

        NaN outside 150-500 K, and where the radiance is not positive.
        """
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.asarray(1 / self._inverse_t(np.log(np.asarray(radiance, dtype=np.float64))))


@cache
def band(low_um: float, high_um: float, response: Response = ()) -> Band:
    """Return the one shared `Band` of these edges [um] and response; its tables are made once."""
    return Band(low_um, high_um, response)
