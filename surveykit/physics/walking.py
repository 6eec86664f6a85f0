"""How to cover a patch: height of a narrow head, lanes, and the speed a slow head allows."""

from __future__ import annotations

from math import ceil, cos, floor, inf, isfinite, log, radians, sin, sqrt, tan
from typing import NamedTuple

RADII_FOR_90 = 3.0  # a disc of three heights' radius fills 90 % of a cosine head's view


class Spot(NamedTuple):
    """The ellipse of ground in a cone's view: full axes and how far ahead its middle lies [m]."""

    length_m: float
    width_m: float
    ahead_m: float


def spot(height_m: float, half_angle_deg: float, view_angle_deg: float = 0.0) -> Spot:
    """Return the ground that a cone looks at, straight down or tilted.

    Parameters
    ----------
    height_m : float
        Height of the head [m].
    half_angle_deg : float
        Half the full field of view [deg].
    view_angle_deg : float, optional
        Angle between the cone's axis and straight down [deg].

    Returns
    -------
    Spot
        Infinite length and width where the cone's upper edge does not meet the ground.

    References
    ----------
    Conic section of a cone with a plane: far and near edge at h tan(view angle +- half angle).

    Examples
    --------
    >>> print("{:.3f} {:.3f} {:.3f}".format(*spot(1.0, 22.0, 30.0)))
    1.139 0.960 0.710
    """
    view, half = radians(view_angle_deg), radians(half_angle_deg)
    if view_angle_deg + half_angle_deg >= 90:
        return Spot(inf, inf, inf)
    far, near = tan(view + half), tan(view - half)
    across = 2 * sin(half) / sqrt(cos(view) ** 2 - sin(half) ** 2)
    return Spot(height_m * (far - near), height_m * across, height_m * (far + near) / 2)


def spot_height_m(patch_m: float, half_angle_deg: float, share: float,
                  view_angle_deg: float = 0.0) -> float:
    """Return the greatest height at which a cone's spot is no longer than a share of a patch.

    Parameters
    ----------
    patch_m : float
        The patch's smaller side or its diameter [m].
    half_angle_deg : float
        Half the full field of view [deg], below 90.
    share : float
        Largest length of the spot as a share of the patch [1].
    view_angle_deg : float, optional
        Angle between where the head looks and straight down [deg].

    Returns
    -------
    float
        Height [m]; 0 where the cone looks above the horizon.

    References
    ----------
    See `spot`: its length grows with the height.

    Examples
    --------
    >>> print(f"{spot_height_m(1.0, 22.0, 1 / 3):.3f}")
    0.413
    """
    return share * patch_m / spot(1.0, half_angle_deg, view_angle_deg).length_m


def footprint_m(height_m: float, half_angle_deg: float, view_angle_deg: float = 0.0) -> float:
    """Return the diameter of the ground that matters to a head: its cone, or 90 % of a half-space.

    Parameters
    ----------
    height_m : float
        Height of the head [m].
    half_angle_deg : float
        Half the full field of view [deg]; a head that sees the whole half-space has 90.
    view_angle_deg : float, optional
        Angle between where the head looks and straight down [deg].

    Returns
    -------
    float
        Diameter [m]: of the cone's circle (the longer one of its ellipse), or of the disc that
        fills 90 % of the view of a level head, whichever is smaller.

    References
    ----------
    View factor of a centred disc, R^2 / (R^2 + h^2) = 0.9 at R = 3 h (Howell, factor B-12).

    Examples
    --------
    >>> print(f"{footprint_m(0.4, 90.0):.2f}", f"{footprint_m(0.05, 62.5):.3f}")
    2.40 0.192
    """
    seen = spot(height_m, half_angle_deg, view_angle_deg).length_m
    return seen if view_angle_deg else min(seen, 2 * RADII_FOR_90 * height_m)


def walking_speed_m_s(footprint: float, time_constant_s: float) -> float:
    """Return the fastest walk at which a first-order head still follows the ground.

    Parameters
    ----------
    footprint : float
        Diameter of the footprint [m].
    time_constant_s : float
        Time constant of the head (63 %) [s].

    Returns
    -------
    float
        Speed [m/s]: one footprint in three time constants; infinite for a head without delay.

    References
    ----------
    First-order response: 95 % after three time constants.

    Examples
    --------
    >>> print(f"{walking_speed_m_s(0.5, 1.0):.2f}")
    0.17
    """
    return footprint / (3 * time_constant_s) if time_constant_s > 0 else float("inf")


def lanes(width_m: float, footprint: float) -> int:
    """Return an even number of lanes no farther apart than a footprint.

    Parameters
    ----------
    width_m : float
        Width of the patch across the lanes [m].
    footprint : float
        Diameter of the footprint [m], above 0.

    Returns
    -------
    int
        Lanes, at least 2: out and back, so that a drift in time cancels.

    Examples
    --------
    >>> lanes(4.0, 2.4), lanes(4.0, 0.9), lanes(0.5, 1.0)
    (2, 6, 2)
    """
    if not (isfinite(width_m) and footprint > 0):
        raise ValueError(f"lanes need a finite width and a footprint above 0, got {width_m!r} "
                         f"and {footprint!r}")
    return 2 * max(1, ceil(ceil(width_m / footprint) / 2))


def edge_margin_m(patch_m: float, footprint: float) -> float:
    """Return how far inside the edge a head must stay so that it sees the patch.

    Parameters
    ----------
    patch_m : float
        The patch's smaller side or its diameter [m].
    footprint : float
        Diameter of the footprint, see `footprint_m` [m].

    Returns
    -------
    float
        Margin [m]: half the footprint, never beyond the patch's middle; in whole centimetres.

    Examples
    --------
    >>> edge_margin_m(4.0, 2.4), edge_margin_m(1.0, 2.4)
    (1.2, 0.5)
    """
    return floor(100 * min(footprint / 2, patch_m / 2) + 0.5) / 100


def settling_time_s(step: float, left: float, time_constant_s: float) -> float:
    """Return how long a first-order head needs until of a step no more than a rest is left.

    Parameters
    ----------
    step, left : float
        Size of the step and of the rest, in one unit, above 0.
    time_constant_s : float
        Time constant of the head (63 %) [s].

    Returns
    -------
    float
        Time [s]; 0 where the step is no larger than the rest.

    References
    ----------
    First-order response: the rest is step exp(-t / time constant).

    Examples
    --------
    >>> print(f"{settling_time_s(30.0, 0.1, 1.0):.1f}")
    5.7
    """
    return time_constant_s * max(0.0, log(step / left))
