"""Shortwave: albedo, its dependence on the sun's height, limits and instrument terms."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from surveykit.core import FloatArray


class ShortwaveLimits(NamedTuple):
    """Limits of shortwave irradiance [W m-2]; "rare" ones warn, "possible" ones exclude."""

    down_min_possible: FloatArray
    down_possible: FloatArray
    down_rare_min: FloatArray
    down_rare: FloatArray
    up_possible: FloatArray
    up_rare: FloatArray


def ratio_of_sums(up: ArrayLike, down: ArrayLike) -> float:
    """Return what is reflected over what comes in, summed before dividing.

    Records that lack one of the two are left out of both sums, so that noise and slow change
    weigh as they should; a mean of record ratios does not do that.

    Parameters
    ----------
    up, down : array_like, shape (n,)
        Reflected and incoming irradiance of the same records, in one unit; NaN is missing.

    Returns
    -------
    float
        Ratio [1], not cut at 1; NaN if the incoming sum is not positive or no record is whole.

    Raises
    ------
    ValueError
        If `up` and `down` differ in shape.

    Examples
    --------
    >>> ratio_of_sums([20.0, 60.0, np.nan], [100.0, 300.0, 500.0])
    0.2
    """
    reflected, incoming = np.asarray(up, dtype=np.float64), np.asarray(down, dtype=np.float64)
    if reflected.shape != incoming.shape:
        raise ValueError(f"up and down must be records of one series, "
                         f"got shapes {reflected.shape} and {incoming.shape}")
    whole = ~(np.isnan(reflected) | np.isnan(incoming))
    total = incoming[whole].sum()
    return float(reflected[whole].sum() / total) if total > 0 else float("nan")


def shortwave_limits(cos_zenith: ArrayLike, extraterrestrial_w_m2: ArrayLike) -> ShortwaveLimits:
    """Return the limits that shortwave irradiance cannot or rarely passes.

    They were made for one-minute means: at shorter intervals broken cloud exceeds the rare
    limits rightly.

    Parameters
    ----------
    cos_zenith : array_like
        Cosine of the sun's zenith angle [1]; below the horizon it counts as 0.
    extraterrestrial_w_m2 : array_like
        Irradiance normal to the beam above the atmosphere on the day [W m-2].

    Returns
    -------
    ShortwaveLimits
        Six limits [W m-2] of the broadcast shape.

    References
    ----------
    Long, C. N. & Dutton, E. G. (2002), BSRN Global Network recommended QC tests, V2.0;
    Long, C. N. & Shi, Y. (2008), Open Atmos. Sci. J. 2, 23-37 (upward limits from memory).

    Examples
    --------
    >>> print(f"{shortwave_limits(0.5, 1361.0).down_possible:.3f}")
    988.614
    """
    mu = np.maximum(np.asarray(cos_zenith, dtype=np.float64), 0.0)
    scaled = np.asarray(extraterrestrial_w_m2, dtype=np.float64) * mu**1.2
    return ShortwaveLimits(
        down_min_possible=np.full_like(scaled, -4.0),
        down_possible=np.asarray(1.5 * scaled + 100),
        down_rare_min=np.full_like(scaled, -2.0),
        down_rare=np.asarray(1.2 * scaled + 50),
        up_possible=np.asarray(1.2 * scaled + 50),
        up_rare=np.asarray(scaled + 50),
    )


def zenith_factor(zenith_deg: ArrayLike, d: ArrayLike) -> FloatArray:
    """Return albedo at a zenith angle relative to albedo at 60 degrees.

    Parameters
    ----------
    zenith_deg : array_like
        Zenith angle of the sun [deg].
    d : array_like
        Strength of the dependence [1]: .1 weak, .4 grass and crops.

    Returns
    -------
    ndarray
        (1 + d) / (1 + 2 d cos z) [1]; 1 at 60 degrees whatever d.

    References
    ----------
    Dickinson, R. E. (1983), Adv. Geophys. 25, 305-353; Briegleb, B. P. et al. (1986),
    J. Clim. Appl. Meteorol. 25, 214-226.

    Examples
    --------
    >>> print(f"{zenith_factor(60.0, 0.4) / zenith_factor(30.0, 0.4):.3f}")
    1.209
    """
    strength = np.asarray(d, dtype=np.float64)
    return np.asarray((1 + strength)
                      / (1 + 2 * strength * np.cos(np.radians(np.asarray(zenith_deg, np.float64)))))


def daily_factor(zenith_deg: ArrayLike, irradiance_w_m2: ArrayLike, at_zenith_deg: float,
                 d: ArrayLike) -> FloatArray:
    """Return the energy-weighted albedo of a day over the albedo at one zenith angle.

    Parameters
    ----------
    zenith_deg, irradiance_w_m2 : array_like, shape (n,)
        The day's course at even steps; times with the sun below the horizon do not count.
    at_zenith_deg : float
        Zenith angle of the known albedo [deg].
    d : array_like, shape (m,) or ()
        Strength of the dependence [1], see `zenith_factor`.

    Returns
    -------
    ndarray, shape (m,) or ()
        Ratio [1].

    References
    ----------
    See `zenith_factor`; weights: irradiance on the horizontal.

    Examples
    --------
    >>> print(f"{daily_factor([60.0, 30.0, 60.0], [400.0, 900.0, 400.0], 30.0, 0.4):.3f}")
    1.098
    """
    zenith = np.asarray(zenith_deg, dtype=np.float64)
    weight = np.where(zenith < 90, np.asarray(irradiance_w_m2, dtype=np.float64), 0.0)
    strength = np.asarray(d, dtype=np.float64)
    whole = sum((share * zenith_factor(angle, strength)  # one time at once: d may be many draws
                 for angle, share in zip(zenith, weight / weight.sum(), strict=True) if share > 0),
                np.zeros(strength.shape))
    return np.asarray(whole / zenith_factor(at_zenith_deg, strength))


def levelling_error(zenith_deg: ArrayLike, tilt_deg: ArrayLike,
                    azimuth_difference_deg: ArrayLike, beam_fraction: ArrayLike) -> FloatArray:
    """Return the relative error of incoming irradiance measured by a tilted head.

    Parameters
    ----------
    zenith_deg : array_like
        Zenith angle of the sun [deg], below 90.
    tilt_deg : array_like
        Tilt of the head [deg].
    azimuth_difference_deg : array_like
        Direction of the tilt minus the sun's azimuth [deg]; 0 leans towards the sun.
    beam_fraction : array_like
        Share of the incoming irradiance that is beam [1].

    Returns
    -------
    ndarray
        Relative error [1]; positive reads too much.

    References
    ----------
    Cosine of the angle of incidence on a tilted plane, Duffie & Beckman, Solar Engineering of
    Thermal Processes, section 1.6; the diffuse part is taken as unchanged.

    Examples
    --------
    >>> print(f"{levelling_error(45.0, 2.0, 0.0, 0.85):.3f}")
    0.029
    """
    zenith, tilt, turn = (np.radians(np.asarray(angle, dtype=np.float64))
                          for angle in (zenith_deg, tilt_deg, azimuth_difference_deg))
    beam = np.cos(tilt) + np.sin(tilt) * np.tan(zenith) * np.cos(turn) - 1
    return np.asarray(np.asarray(beam_fraction, dtype=np.float64) * beam)


def directional_u(zenith_deg: ArrayLike, limit_w_m2: ArrayLike) -> FloatArray:
    """Return the relative standard uncertainty of beam irradiance from a head's cosine response.

    The class limit bounds the error for a beam of 1000 W m-2 at any angle; as a bound it is a
    rectangular half-width and is divided by sqrt 3.

    Parameters
    ----------
    zenith_deg : array_like
        Zenith angle of the sun [deg], below 90.
    limit_w_m2 : array_like
        Directional limit of the head's class [W m-2 at a beam of 1000 W m-2].

    Returns
    -------
    ndarray
        Standard uncertainty relative to the horizontal beam [1].

    References
    ----------
    ISO 9060:2018 (limits from memory); JCGM 100:2008, 4.3.7 for the rectangular distribution.

    Examples
    --------
    >>> print(f"{directional_u(45.0, 30.0) * 3**0.5:.3f}")
    0.042
    """
    horizontal = 1000 * np.cos(np.radians(np.asarray(zenith_deg, dtype=np.float64)))
    return np.asarray(np.asarray(limit_w_m2, dtype=np.float64) / horizontal / np.sqrt(3))


def patch_albedo(measured: ArrayLike, around: ArrayLike, footprint: ArrayLike,
                 shade: ArrayLike) -> FloatArray:
    """Return the albedo of a patch from a reading that also saw surroundings and its own shadow.

    measured = (footprint - shade) patch + (1 - footprint) around, solved for the patch.

    Parameters
    ----------
    measured : array_like
        Ratio of reflected to incoming irradiance [1].
    around : array_like
        Albedo of the surroundings [1].
    footprint : array_like
        Share of the head's view filled by the patch [1].
    shade : array_like
        Share of the reflected signal lost to the head's own shadow [1].

    Returns
    -------
    ndarray
        Albedo [1]; NaN where footprint - shade is not positive.

    References
    ----------
    Sailor, D. J., Resh, K. & Segura, D. (2006), Sol. Energy 80, 1-12: view factors of sunlit,
    shaded and foreign ground.

    Examples
    --------
    >>> print(f"{patch_albedo(0.28265, 0.10, 0.9455, 0.0215):.4f}")
    0.3000
    """
    seen = np.asarray(footprint, dtype=np.float64)
    lit = seen - np.asarray(shade, dtype=np.float64)
    foreign = (1 - seen) * np.asarray(around, dtype=np.float64)
    return np.asarray((np.asarray(measured, np.float64) - foreign) / np.where(lit > 0, lit, np.nan))
