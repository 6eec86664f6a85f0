"""What a radiometer itself adds: its class's limits, two heads exchanged, a rod in the sun."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from surveykit.core import FloatArray
from surveykit.physics.footprint import rectangle_share


class ClassTerms(NamedTuple):
    """Limits of a pyranometer class: bounds, not standard uncertainties."""

    response_s: float  # time to 95 % [s]
    zero_offset_a: float  # [W m-2] at 200 W m-2 of net thermal radiation
    zero_offset_b: float  # [W m-2] at 5 K/h
    non_stability: float  # a year [1]
    non_linearity: float  # [1]
    directional_w_m2: float  # at a beam of 1000 W m-2
    spectral: float  # [1]
    temperature: float  # [1]
    tilt: float  # [1] of which a head that looks down takes all


# ISO 9060:2018, table 1 (from memory)
CLASS_TERMS = {
    "A": ClassTerms(10.0, 7.0, 2.0, 0.008, 0.005, 10.0, 0.005, 0.01, 0.005),
    "B": ClassTerms(20.0, 15.0, 4.0, 0.015, 0.01, 20.0, 0.01, 0.02, 0.02),
    "C": ClassTerms(30.0, 30.0, 8.0, 0.03, 0.03, 30.0, 0.05, 0.04, 0.05),
}


class HeadRatio(NamedTuple):
    """Ratio of two heads' responses [1], the reflectance they agree on, and the ratio's u [1]."""

    ratio: FloatArray
    reflectance: FloatArray
    u: FloatArray


def head_ratio_by_swap(normal: ArrayLike, inverted: ArrayLike, u_normal: ArrayLike,
                       u_inverted: ArrayLike) -> HeadRatio:
    """Return the ratio of two heads' responses from one spot read both ways up.

    normal = k a, inverted = a / k: what each way shows reflected over what comes in, k the
    response of the head that normally looks down over that of the other. Gains drop out; offsets,
    directional response and tilt do not.

    Parameters
    ----------
    normal, inverted : array_like
        Reflected over incoming in each position [1].
    u_normal, u_inverted : array_like
        Their standard uncertainties [1].

    Returns
    -------
    HeadRatio
        sqrt(normal / inverted), sqrt(normal inverted), and half the quadratic sum of the relative
        uncertainties times the ratio.

    References
    ----------
    Hand arithmetic; JCGM 100:2008, 5.1.2 for the uncertainty.

    Examples
    --------
    >>> found = head_ratio_by_swap(0.208, 0.19231, 0.002, 0.002)
    >>> print(f"{found.ratio:.3f} {found.reflectance:.4f} {found.u:.4f}")
    1.040 0.2000 0.0074
    """
    first, second = np.asarray(normal, dtype=np.float64), np.asarray(inverted, dtype=np.float64)
    ratio = np.sqrt(first / second)
    relative = np.hypot(np.asarray(u_normal, np.float64) / first,
                        np.asarray(u_inverted, np.float64) / second) / 2
    return HeadRatio(np.asarray(ratio), np.asarray(np.sqrt(first * second)),
                     np.asarray(ratio * relative))


def rod_shade(rod_width_m: ArrayLike, rod_length_m: ArrayLike, height_m: ArrayLike,
              zenith_deg: ArrayLike, rod_to_sun_deg: ArrayLike) -> FloatArray:
    """Return the share of the beam-lit signal that the rod behind a head takes by its shadow.

    The rod lies at the sensor's level and begins at its middle; its shadow is the same strip on
    the ground, displaced by h tan z away from the sun.

    Parameters
    ----------
    rod_width_m, rod_length_m : array_like
        Of the rod [m].
    height_m : array_like
        Of the head above the ground [m], above 0.
    zenith_deg : array_like
        Zenith angle of the sun [deg], below 90.
    rod_to_sun_deg : array_like
        Angle between the rod, seen from the head, and the sun's azimuth [deg]: 0 where the
        operator stands towards the sun, 180 away from it.

    Returns
    -------
    ndarray
        Share [1].

    References
    ----------
    Howell, J. R., A Catalog of Radiation Heat Transfer Configuration Factors, B-4, see
    `footprint.rectangle_share`.

    Examples
    --------
    >>> print(rod_shade(0.015, 1.5, 0.12, 40.0, [0.0, 90.0, 180.0]).round(3))
    [0.055 0.014 0.008]
    """
    turn = np.radians(np.asarray(rod_to_sun_deg, dtype=np.float64))
    height = np.asarray(height_m, dtype=np.float64)
    shift = height * np.tan(np.radians(np.asarray(zenith_deg, dtype=np.float64)))
    along, across = -shift * np.cos(turn), -shift * np.sin(turn)
    half = np.asarray(rod_width_m, dtype=np.float64) / 2
    return rectangle_share(along, along + np.asarray(rod_length_m, dtype=np.float64),
                           across - half, across + half, height)
