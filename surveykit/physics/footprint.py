"""What a downward head sees: shares of its view, its own shadow, and the best height.

Shares are cosine-weighted, which makes them view factors [1]. Functions broadcast over arrays.
"""

from __future__ import annotations

from math import log, pi

import numpy as np
from numpy.typing import ArrayLike
from scipy.optimize import minimize_scalar

from surveykit.core import FloatArray


def disc_share(radius_m: ArrayLike, height_m: ArrayLike) -> FloatArray:
    """Return the share of the view filled by a disc centred below the head.

    Parameters
    ----------
    radius_m, height_m : array_like
        Radius of the disc and height of the head above it [m].

    Returns
    -------
    ndarray
        Share [1].

    References
    ----------
    Howell, J. R., A Catalog of Radiation Heat Transfer Configuration Factors, B-12.

    Examples
    --------
    >>> print(f"{disc_share(2.0, 0.5):.3f}")
    0.941
    """
    r2 = np.asarray(radius_m, dtype=np.float64)**2
    return np.asarray(r2 / (r2 + np.asarray(height_m, dtype=np.float64)**2))


def corner_share(a_m: ArrayLike, b_m: ArrayLike, height_m: ArrayLike) -> FloatArray:
    """Return the share of the view filled by a rectangle with one corner below the head.

    Parameters
    ----------
    a_m, b_m : array_like
        Sides of the rectangle [m]; the share takes the sign of their product.
    height_m : array_like
        Height of the head [m], above 0.

    Returns
    -------
    ndarray
        Share [1], negative where one side is.

    References
    ----------
    Howell, J. R., A Catalog of Radiation Heat Transfer Configuration Factors, B-4.

    Examples
    --------
    >>> print(f"{corner_share(1.0, 1.0, 1.0):.8f}")
    0.13853161
    """
    a, b = np.asarray(a_m, dtype=np.float64), np.asarray(b_m, dtype=np.float64)
    h2 = np.asarray(height_m, dtype=np.float64)**2
    slant_a, slant_b = np.sqrt(a**2 + h2), np.sqrt(b**2 + h2)
    return np.asarray((a / slant_a * np.arctan(b / slant_a)
                       + b / slant_b * np.arctan(a / slant_b)) / (2 * pi))


def rectangle_share(x0_m: ArrayLike, x1_m: ArrayLike, y0_m: ArrayLike, y1_m: ArrayLike,
                    height_m: ArrayLike) -> FloatArray:
    """Return the share of the view filled by a rectangle anywhere below the head.

    Parameters
    ----------
    x0_m, x1_m, y0_m, y1_m : array_like
        Edges of the rectangle, with the head above the origin [m]; x0 < x1, y0 < y1.
    height_m : array_like
        Height of the head [m], above 0.

    Returns
    -------
    ndarray
        Share [1].

    References
    ----------
    Signed sum over the corners, see `corner_share`.

    Examples
    --------
    >>> print(f"{rectangle_share(-0.5, 0.5, -0.5, 0.5, 0.5):.4f}")
    0.5541
    """
    return np.asarray(corner_share(x1_m, y1_m, height_m) - corner_share(x0_m, y1_m, height_m)
                      - corner_share(x1_m, y0_m, height_m) + corner_share(x0_m, y0_m, height_m))


def limited_share(radius_m: ArrayLike, height_m: ArrayLike,
                  half_angle_deg: ArrayLike) -> FloatArray:
    """Return the share of a limited cone of view filled by a disc centred below the head.

    Parameters
    ----------
    radius_m, height_m : array_like
        Radius of the disc and height of the head above it [m].
    half_angle_deg : array_like
        Half the full field of view [deg], up to 90.

    Returns
    -------
    ndarray
        Share [1]; 1 where the disc fills the cone.

    References
    ----------
    `disc_share` of the patch over that of the circle seen: cosine weight inside the cone.

    Examples
    --------
    >>> print(f"{limited_share(0.5, 1.0, 45.0):.2f}")
    0.40
    """
    cone = np.sin(np.radians(np.asarray(half_angle_deg, dtype=np.float64)))**2
    return np.asarray(np.minimum(1.0, disc_share(radius_m, height_m) / cone))


def upright_share(width_m: ArrayLike, height_m: ArrayLike, distance_m: ArrayLike) -> FloatArray:
    """Return the share of a level head's view that an upright plate fills, as a person does.

    Parameters
    ----------
    width_m, height_m : array_like
        Of the plate [m]; it stands on the head's level, its middle opposite the head.
    distance_m : array_like
        Of the head from the plate [m], above 0.

    Returns
    -------
    ndarray
        Share [1]: upwards of what rises above the head, downwards of what is below it.

    References
    ----------
    Howell's catalogue (see `disc_share`): element to a rectangle in a perpendicular plane.

    Examples
    --------
    >>> print(upright_share(0.5, [0.85, 0.90], 0.6).round(3))  # sky and ground from .9 m up
    [0.082 0.086]
    """
    half = np.asarray(width_m, dtype=np.float64) / 2
    away = np.asarray(distance_m, dtype=np.float64)
    slant = np.hypot(np.asarray(height_m, dtype=np.float64), away)
    return np.asarray((np.arctan(half / away) - away / slant * np.arctan(half / slant)) / pi)


def beam_shade(head_radius_m: ArrayLike, height_m: ArrayLike,
               zenith_deg: ArrayLike) -> FloatArray:
    """Return the share of the view that the head's own shadow of the beam fills.

    The head is an opaque disc at the sensor's level; its shadow is the same disc on the ground,
    displaced by h tan z.

    Parameters
    ----------
    head_radius_m, height_m : array_like
        Radius of the head and its height above the ground [m].
    zenith_deg : array_like
        Zenith angle of the sun [deg].

    Returns
    -------
    ndarray
        Share [1]; NaN at 90 degrees and below the horizon, where there is no beam.

    References
    ----------
    Howell, J. R., A Catalog of Radiation Heat Transfer Configuration Factors, B-13: element to a
    parallel disc off its axis.

    Examples
    --------
    >>> print(f"{beam_shade(0.03, 0.05, 40.0):.3f}")
    0.127
    """
    zenith = np.asarray(zenith_deg, dtype=np.float64)
    h2 = np.asarray(height_m, dtype=np.float64)**2
    s2 = h2 * np.tan(np.radians(np.where((zenith >= 0) & (zenith < 90), zenith, np.nan)))**2
    r2 = np.asarray(head_radius_m, dtype=np.float64)**2
    return np.asarray((1 - (s2 + h2 - r2) / np.sqrt((s2 + h2 + r2)**2 - 4 * s2 * r2)) / 2)


def diffuse_shade(head_radius_m: ArrayLike, height_m: ArrayLike) -> FloatArray:
    """Return the share of reflected skylight that the head hides from the ground it sees.

    Every point of the ground loses the share of an even sky that the disc covers, weighted by the
    sensor's view of the point. With p = x^2 / (x^2 + h^2) the weight is even in p, and the
    integral closes: (q + 2) / (q + 4) - 8 asinh(sqrt(q) / 2) / (sqrt(q) (q + 4)^1.5), q = (r/h)^2.

    Parameters
    ----------
    head_radius_m, height_m : array_like
        Radius of the head and its height above the ground [m], above 0.

    Returns
    -------
    ndarray
        Share [1]; about (r/h)^2 / 3 for a small head.

    References
    ----------
    Integral of factor B-13 of Howell's catalogue (see `beam_shade`) over the ground; closed here,
    checked against quadrature in the tests.

    Examples
    --------
    >>> print(f"{diffuse_shade(0.005, 0.05):.4f}")
    0.0033
    """
    ratio = np.asarray(head_radius_m, dtype=np.float64) / np.asarray(height_m, dtype=np.float64)
    q = ratio**2
    spread = np.where(ratio == 0, 0.5, np.arcsinh(ratio / 2) / np.where(ratio == 0, 1.0, ratio))
    return np.asarray((q + 2) / (q + 4) - 8 * spread / (q + 4)**1.5)


def self_shade(head_radius_m: ArrayLike, height_m: ArrayLike, zenith_deg: ArrayLike,
               beam_fraction: ArrayLike) -> FloatArray:
    """Return the share of the reflected signal lost to the head's own shadow.

    Parameters
    ----------
    head_radius_m, height_m : array_like
        Radius of the head and its height above the ground [m], above 0.
    zenith_deg : array_like
        Zenith angle of the sun [deg], below 90.
    beam_fraction : array_like
        Share of the incoming irradiance that is beam [1].

    Returns
    -------
    ndarray
        Share [1].

    References
    ----------
    `beam_shade` and `diffuse_shade`, weighted by the beam fraction.

    Examples
    --------
    >>> print(f"{self_shade(0.03, 0.05, 45.0, 0.85):.3f}")
    0.098
    """
    beam = np.asarray(beam_fraction, dtype=np.float64)
    return np.asarray(beam * beam_shade(head_radius_m, height_m, zenith_deg)
                      + (1 - beam) * diffuse_shade(head_radius_m, height_m))


def best_height_m(head_radius_m: float, patch_radius_m: float, contrast: float,
                  zenith_deg: float, beam_fraction: float) -> float:
    """Return the height at which self-shade and foreign ground together weigh least.

    Parameters
    ----------
    head_radius_m, patch_radius_m : float
        Radius of the head and of the patch [m].
    contrast : float
        |albedo around - albedo of the patch| / albedo of the patch [1].
    zenith_deg : float
        Zenith angle of the sun [deg], below 90.
    beam_fraction : float
        Share of the incoming irradiance that is beam [1].

    Returns
    -------
    float
        Height [m] of the least `self_shade` + contrast (1 - `disc_share`), between a tenth of
        the head's radius and ten times the patch's.

    References
    ----------
    Brent's method (scipy.optimize.minimize_scalar) in the logarithm of height.

    Examples
    --------
    >>> print(f"{best_height_m(0.03, 0.5, 0.5, 30.0, 0.85):.3f}")
    0.127
    """
    def error(log_height: float) -> float:
        height = float(np.exp(log_height))
        return float(self_shade(head_radius_m, height, zenith_deg, beam_fraction)
                     + contrast * (1 - disc_share(patch_radius_m, height)))

    found = minimize_scalar(error, method="bounded", options={"xatol": 1e-6},
                            bounds=(log(0.1 * head_radius_m), log(10 * patch_radius_m)))
    return float(np.exp(found.x))
