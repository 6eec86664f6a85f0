"""Reflectance factors, vegetation indices and what follows from them."""

from __future__ import annotations

from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from surveykit.core import FloatArray
from surveykit.physics.shortwave import ratio_of_sums


def reflectance_factor(up: ArrayLike, down: ArrayLike, head_ratio: ArrayLike) -> FloatArray:
    """Return the reflectance factor of each record in one waveband.

    Parameters
    ----------
    up, down : array_like, shape (n,)
        Reflected and incoming readings of the same records, darks taken off, in one unit.
    head_ratio : array_like
        Response of the head that looks down over that of the head that looks up [1].

    Returns
    -------
    ndarray, shape (n,)
        Reflectance factor [1], hemispherical-conical or bihemispherical as the heads are; NaN
        where nothing comes in.

    References
    ----------
    Schaepman-Strub, G. et al. (2006), Remote Sens. Environ. 103, 27-42.

    Examples
    --------
    >>> print(f"{reflectance_factor(4.2, 100.0, 1.03):.6f}")
    0.040777
    """
    incoming = np.asarray(down, dtype=np.float64)
    return np.asarray(np.asarray(up, dtype=np.float64) / np.where(incoming > 0, incoming, np.nan)
                      / np.asarray(head_ratio, dtype=np.float64))


def ndvi(red: ArrayLike, nir: ArrayLike) -> FloatArray:
    """Return the normalised difference vegetation index.

    Parameters
    ----------
    red, nir : array_like, shape (n,)
        Reflectance factors [1]: ratios of simultaneous up and down readings.

    Returns
    -------
    ndarray, shape (n,)
        NDVI [1]; NaN where red + nir is not positive or an input is NaN.

    References
    ----------
    Tucker, C. J. (1979), Remote Sens. Environ. 8, 127-150.

    Examples
    --------
    >>> ndvi([0.05, 0.0], [0.45, 0.0])
    array([0.8, nan])
    """
    r, n = np.asarray(red, dtype=np.float64), np.asarray(nir, dtype=np.float64)
    total = r + n
    return np.asarray((n - r) / np.where(total > 0, total, np.nan))


def ndvi_of_sums(red_up: ArrayLike, red_down: ArrayLike, nir_up: ArrayLike,
                 nir_down: ArrayLike) -> float:
    """Return the NDVI of a whole patch: reflectances as ratios of sums, then the index.

    It is the index of the patch, not the mean of the records' indices, which has no finite
    variance in weak light.

    Parameters
    ----------
    red_up, red_down, nir_up, nir_down : array_like, shape (n,)
        Reflected and incoming readings of the same records; each pair in one unit. A record that
        lacks any of the four (NaN) is left out.

    Returns
    -------
    float
        NDVI [1]; NaN if no record is whole or nothing comes in.

    Raises
    ------
    ValueError
        If the four differ in shape.

    References
    ----------
    Tucker (1979), see `ndvi`; `shortwave.ratio_of_sums`.

    Examples
    --------
    >>> print(f"{ndvi_of_sums([30, 4], [100, 100], [36, 45], [100, 100]):.3f}")
    0.409
    """
    series = [np.asarray(x, dtype=np.float64) for x in (red_up, red_down, nir_up, nir_down)]
    if len({x.shape for x in series}) > 1:
        raise ValueError(f"the four readings must be records of one series, "
                         f"got shapes {', '.join(str(x.shape) for x in series)}")
    whole = ~np.isnan(series).any(axis=0)
    red_u, red_d, nir_u, nir_d = (x[whole] for x in series)
    return float(ndvi(ratio_of_sums(red_u, red_d), ratio_of_sums(nir_u, nir_d)))


def savi(red: ArrayLike, nir: ArrayLike, soil_factor: ArrayLike) -> FloatArray:
    """Return the soil-adjusted vegetation index.

    Parameters
    ----------
    red, nir : array_like
        Reflectance factors [1]; their absolute size matters here, not only their ratio.
    soil_factor : array_like
        L [1], commonly .5; 0 gives NDVI.

    Returns
    -------
    ndarray
        SAVI [1]; NaN where the denominator is not positive.

    References
    ----------
    Huete, A. R. (1988), Remote Sens. Environ. 25, 295-309.

    Examples
    --------
    >>> print(f"{savi(0.08, 0.5, 0.5):.4f}")
    0.5833
    """
    r, n = np.asarray(red, dtype=np.float64), np.asarray(nir, dtype=np.float64)
    factor = np.asarray(soil_factor, dtype=np.float64)
    total = n + r + factor
    return np.asarray((1 + factor) * (n - r) / np.where(total > 0, total, np.nan))


def vegetation_fraction(ndvi: ArrayLike, soil: ArrayLike, full: ArrayLike,
                        form: Literal["linear", "squared"]) -> FloatArray:
    """Return the share of the ground covered by vegetation.

    Parameters
    ----------
    ndvi : array_like
        NDVI of the surface [1].
    soil, full : array_like
        NDVI of bare ground and of full cover on the same day with the same heads [1].
    form : {"linear", "squared"}
        The two published forms; for NDVI half-way they differ by a factor of two.

    Returns
    -------
    ndarray
        Fraction [1], cut to 0-1; NaN where full is not above soil.

    Raises
    ------
    ValueError
        If `form` is neither word.

    References
    ----------
    Linear: Gutman, G. & Ignatov, A. (1998), Int. J. Remote Sens. 19, 1533-1543.
    Squared: Carlson, T. N. & Ripley, D. A. (1997), Remote Sens. Environ. 62, 241-252.

    Examples
    --------
    >>> print(f"{vegetation_fraction(0.5, 0.2, 0.86, 'squared'):.3f}")
    0.207
    """
    if form not in ("linear", "squared"):
        raise ValueError(f"form must be 'linear' or 'squared', got {form!r}")
    low = np.asarray(soil, dtype=np.float64)
    span = np.asarray(full, dtype=np.float64) - low
    scaled = (np.asarray(ndvi, dtype=np.float64) - low) / np.where(span > 0, span, np.nan)
    return np.asarray(np.clip(scaled, 0.0, 1.0)**(2 if form == "squared" else 1))


def emissivity_logarithmic(ndvi: ArrayLike) -> FloatArray:
    """Return the 8-14 um emissivity of natural ground from its NDVI.

    Never for synthetic turf, painted or wet surfaces: their NDVI says nothing of emissivity.

    Parameters
    ----------
    ndvi : array_like
        NDVI [1].

    Returns
    -------
    ndarray
        1.0094 + 0.047 ln NDVI [1]; NaN outside .157-.727, the range of the measurements.

    References
    ----------
    Van de Griend, A. A. & Owe, M. (1993), Int. J. Remote Sens. 14, 1119-1131 (from memory; some
    public code misprints the constant as 1.094).

    Examples
    --------
    >>> print(f"{emissivity_logarithmic(0.4):.4f}")
    0.9663
    """
    index = np.asarray(ndvi, dtype=np.float64)
    return np.asarray(1.0094 + 0.047 * np.log(np.where((index >= 0.157) & (index <= 0.727),
                                                       index, np.nan)))


def emissivity_mixed(fraction: ArrayLike, vegetation: ArrayLike, soil: ArrayLike) -> FloatArray:
    """Return the emissivity of ground partly covered by vegetation.

    Parameters
    ----------
    fraction : array_like
        Share of the ground covered by vegetation [1].
    vegetation, soil : array_like
        Emissivity of full vegetation and of bare ground [1].

    Returns
    -------
    ndarray
        Emissivity [1], without the term for cavities between plants.

    References
    ----------
    Valor, E. & Caselles, V. (1996), Remote Sens. Environ. 57, 167-184 (from memory);
    Sobrino, J. A. et al. (2008), IEEE Trans. Geosci. Remote Sens. 46, 316-327.

    Examples
    --------
    >>> print(f"{emissivity_mixed(0.455, 0.99, 0.95):.3f}")
    0.968
    """
    share = np.asarray(fraction, dtype=np.float64)
    return np.asarray(np.asarray(vegetation, dtype=np.float64) * share
                      + np.asarray(soil, dtype=np.float64) * (1 - share))
