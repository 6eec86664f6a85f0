"""What share of a level head's view its patch fills, at each record of a walked pass."""

from __future__ import annotations

import numpy as np

from surveykit.core import BoolArray, FloatArray, IntArray
from surveykit.intake.params import Channel, Parameters
from surveykit.intake.passes import Pass
from surveykit.intake.paths import walk
from surveykit.physics.footprint import rectangle_share

HEMISPHERE_DEG = 90.0  # half-angle of a head that states none: it sees most of what is around
LOOKS_DOWN = {"albedo": "shortwave_up", "ndvi": "red_up"}


def shares_along(this: Pass, head: Channel, height_m: float, time_ns: IntArray,
                 parameters: Parameters) -> FloatArray | None:
    """Return the share of the view that the patch fills at times [ns UTC] of a walked pass.

    NaN before the walk and after it. None where no path is known, and for a head of limited view:
    a cone stays inside the patch or is taken as over its centre.
    """
    where = walk(this, time_ns, parameters)
    if where is None or (head.half_angle_deg or HEMISPHERE_DEG) < HEMISPHERE_DEG:
        return None
    return rectangle_share(-where.x_m, this.length_m - where.x_m, -where.y_m,
                           this.width_m - where.y_m, height_m)


def sees_foreign_ground(this: Pass, time_ns: IntArray, parameters: Parameters) -> BoolArray:
    """Return at which times of a walked pass the patch fills less than `albedo.min_footprint`."""
    head = this.channels.get(LOOKS_DOWN.get(this.quantity, ""))
    share = shares_along(this, head, this.height_m, time_ns, parameters) if head else None
    if share is None:
        return np.zeros(time_ns.shape, dtype=bool)
    with np.errstate(invalid="ignore"):
        return np.asarray(share < parameters.settings.albedo.min_footprint)
