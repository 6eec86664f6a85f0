"""How well a walked pass gives its patch's mean: the ground's pattern and the lanes over it."""

from __future__ import annotations

import numpy as np

from surveykit.core import FloatArray
from surveykit.evidence.conditions import Day
from surveykit.intake.passes import Pass
from surveykit.intake.paths import walk
from surveykit.statistics.spatial import fit_exponential, patch_mean_u, variogram

POINTS, LAGS = 800, 8  # of the map and of the variogram
UNFITTED = "pattern of the ground not fitted"
SPARSE = "lanes too far apart for the ground's pattern"


def patch_mean(day: Day, this: Pass, records: FloatArray) -> tuple[float, tuple[str, ...]]:
    """Return the standard error of a pass's mean as the mean of this patch today, and flags.

    `records` are the model's values of the pass's good records. NaN where the sheet states no
    lanes, or where the pattern cannot be fitted: then the records count as a series in time.
    """
    chosen = day.quality.passes[this.name]
    path = walk(this, day.records[chosen.logger].time_ns[chosen.index], day.parameters)
    if path is None:
        return np.nan, ()
    there = np.flatnonzero(np.isfinite(path.x_m) & ~path.turning)
    rows = there[:: max(1, there.size // POINTS)]
    if rows.size < 2:
        return np.nan, (f"{UNFITTED}: no record between the turns",)
    x_m, y_m = path.x_m[rows], path.y_m[rows]
    smaller = min(this.width_m, this.length_m)
    fit = fit_exponential(
        variogram(x_m, y_m, records[rows], np.linspace(0, smaller / 2, LAGS + 1), detrend=True),
        patch_m=smaller, min_pairs=day.parameters.settings.statistics.variogram_pairs)
    if fit.refusal:
        return np.nan, (f"{UNFITTED}: {fit.refusal}",)
    u = patch_mean_u(x_m, y_m, fit, width_m=this.length_m, length_m=this.width_m)
    return u, (SPARSE,) if this.width_m / this.lanes > 2 * fit.scale_m else ()
