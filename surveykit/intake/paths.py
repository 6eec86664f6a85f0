"""Where on its patch a walked pass was at each record: lanes along the length, each returning."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from surveykit.core import BoolArray, FloatArray, IntArray
from surveykit.intake.params import Parameters
from surveykit.intake.passes import Pass

NS = 1_000_000_000


class Path(NamedTuple):
    """Position of each record on the patch [m] from the corner where the walk began.

    `x_m` runs along the lanes, `y_m` across them; `u_x_m` is the standard uncertainty of x;
    `turning` marks records in a turn, which do not count on a map.
    """

    x_m: FloatArray
    y_m: FloatArray
    u_x_m: FloatArray
    turning: BoolArray


def serpentine(time_s: FloatArray, *, duration_s: float, length_m: float, width_m: float,
               lanes: int, lag_s: float, turn_s: float, u_time_s: float, pace_u: float) -> Path:
    """Return where a walk along returning lanes was at each time.

    Lanes take equal times at a constant pace. The head shows the ground of `lag_s` earlier, so a
    reading belongs that much behind: forward and returning lanes are shifted the opposite way.

    Parameters
    ----------
    time_s : ndarray, shape (n,)
        Seconds since the walk began.
    duration_s : float
        How long it took.
    length_m, width_m : float
        Of the patch; lanes run along the length.
    lanes : int
        Number of lanes, at least 1.
    lag_s : float
        Time constant of the head.
    turn_s : float
        That a turn from lane to lane lasts on either side of its middle.
    u_time_s, pace_u : float
        Standard uncertainty of the written times [s] and of the pace [1].

    Returns
    -------
    Path
        NaN before the walk and after it.

    Raises
    ------
    ValueError
        If there is no lane or no time.

    Examples
    --------
    Two lanes of 10 m in 40 s: out and back, half a metre per second.

    >>> walk = serpentine(np.array([5.0, 15.0, 25.0, 35.0]), duration_s=40, length_m=10, width_m=4,
    ...                   lanes=2, lag_s=0, turn_s=1, u_time_s=0, pace_u=0)
    >>> walk.x_m, walk.y_m
    (array([2.5, 7.5, 7.5, 2.5]), array([1., 1., 3., 3.]))
    """
    if lanes < 1 or not duration_s > 0:
        raise ValueError(f"a walk needs a lane and a time, got {lanes!r} lanes in {duration_s!r} s")
    time_s = np.asarray(time_s, dtype=np.float64)
    lane_s = duration_s / lanes
    seen_s = time_s - lag_s
    outside = (time_s < 0) | (time_s > duration_s)
    lane = np.clip(np.floor(seen_s / lane_s), 0, lanes - 1)
    share = np.clip(seen_s / lane_s - lane, 0.0, 1.0)
    along = np.where(lane % 2 == 0, share, 1 - share)
    x_m = np.where(outside, np.nan, length_m * along)
    y_m = np.where(outside, np.nan, (lane + 0.5) * width_m / lanes)
    speed = length_m / lane_s
    u_x_m = np.sqrt((u_time_s * speed) ** 2 + (pace_u * x_m) ** 2)
    return Path(x_m, y_m, u_x_m, outside | in_turn(time_s, lane_s, lanes, turn_s))


def in_turn(time_s: FloatArray, lane_s: float, lanes: int, turn_s: float) -> BoolArray:
    """Return which times [s since the walk began] lie within `turn_s` of a turn between lanes.

    Beginning and end of the walk are no turns: they are the pass's edges.
    """
    if lanes < 2:
        return np.zeros(np.shape(time_s), dtype=bool)
    turn = lane_s * np.clip(np.round(time_s / lane_s), 1, lanes - 1)
    return np.asarray(np.abs(time_s - turn) <= turn_s)


def turns(this: Pass, time_ns: IntArray, parameters: Parameters) -> BoolArray:
    """Return which times [ns UTC] lie in a turn of a walked pass; none where no lanes are written.

    A turn is as far from its computed time as the written times are from the true ones.
    """
    if this.kind == "contact":
        return np.zeros(time_ns.shape, dtype=bool)
    lane_s = (this.stop_ns - this.start_ns) / NS / max(this.lanes, 1)
    return in_turn((time_ns - this.start_ns) / NS, lane_s, this.lanes, _turn_s(this, parameters))


def walk(this: Pass, time_ns: IntArray, parameters: Parameters) -> Path | None:
    """Return where a pass was at the times [ns UTC] of its records, between its written edges.

    None where the sheet does not state lanes, width and length, or for a contact pass.
    """
    known = np.isfinite(this.length_m) and np.isfinite(this.width_m)
    if this.kind == "contact" or this.lanes < 1 or not known:
        return None
    settings = parameters.settings.passes
    return serpentine(
        (np.asarray(time_ns) - this.start_ns) / NS, duration_s=(this.stop_ns - this.start_ns) / NS,
        length_m=this.length_m, width_m=this.width_m, lanes=this.lanes,
        lag_s=_slowest_s(this), turn_s=_turn_s(this, parameters), u_time_s=this.trim_s
        - settings.settle_time_constants * _slowest_s(this), pace_u=settings.pace_u)


def _slowest_s(this: Pass) -> float:
    return max(channel.time_constant_s for channel in this.channels.values())


def _turn_s(this: Pass, parameters: Parameters) -> float:
    return parameters.settings.passes.turn_s + 3 * _slowest_s(this)
