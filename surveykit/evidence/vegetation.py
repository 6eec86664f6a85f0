"""NDVI of a pass: index of the ratios of sums of red and near-infrared, up over down."""

from __future__ import annotations

import numpy as np

from surveykit.core import Input
from surveykit.evidence.conditions import Day, Sky
from surveykit.evidence.parts import (
    NotEvaluated,
    PassValue,
    calibration_flags,
    fixed,
    gain,
    raw_series,
    series,
    zero,
)
from surveykit.evidence.views import foreign_ground
from surveykit.intake.passes import Pass
from surveykit.physics.vegetation import ndvi_of_sums
from surveykit.statistics.series import mean_of_series

BANDS = ("red_up", "red_down", "nir_up", "nir_down")


def vegetation_index(day: Day, this: Pass, sky: Sky) -> PassValue:
    """Return an NDVI pass; the index of the patch is the ratio of sums, not a mean of ratios.

    A head's level and its own shade act on both bands alike and cancel.
    """
    read = {name: series(day, this, name)[1] for name in BANDS}
    settings = day.parameters.campaign.settings.ndvi
    value = ndvi_of_sums(*(read[name] for name in BANDS))
    if not np.isfinite(value):
        raise NotEvaluated("red and near-infrared of the pass do not sum to more than zero")
    around = Input("around_ndvi", settings.around_ndvi, settings.around_ndvi_u,
                   f"{day.name}:{this.surface}:around ndvi", "NDVI around the patch, assumed")
    inputs, flags = foreign_ground(day, this, this.channels["red_up"], around)
    for name in BANDS:
        channel = this.channels[name]
        place = channel.logger, channel.column
        mean = float(read[name].mean())
        known = zero(day, channel, f"{name}_zero_error", settings.dark_u * day.largest[place])
        inputs += [fixed(name, mean), gain(channel, f"{name}_gain_error"), known]
        if day.darks[place] is None:
            flags += ("no dark reading",)
        if name.endswith("_up") and known.u > mean / settings.min_dark_ratio:
            raise NotEvaluated(
                f"{channel.column} reads {mean:.3g}, less than {settings.min_dark_ratio:g} times "
                "the uncertainty of its zero: too little light for an index")
    flags += ("gain ratio not checked by panel or swap", "surroundings not corrected")
    red, nir = (read[f"{band}_up"] / read[f"{band}_down"].mean() for band in ("red", "nir"))
    r, n = float(red.mean()), float(nir.mean())
    lean = 2 / (r + n) ** 2
    steady = lean * (r * (nir - n * read["nir_down"] / read["nir_down"].mean())
                     - n * (red - r * read["red_down"] / read["red_down"].mean()))
    within = mean_of_series(steady, unit="1", method="ratio of sums")
    raw = ndvi_of_sums(*(raw_series(day, this, name)[1] for name in BANDS))
    return PassValue(raw, value, within.u, within.n_eff, tuple(inputs),
                     calibration_flags(day, [this.channels[b] for b in BANDS])
                     + tuple(dict.fromkeys(flags)),
                     (("raw", raw), ("dark readings", value)))
