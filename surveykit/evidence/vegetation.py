"""NDVI of a pass: index of the ratios of sums of red and near-infrared, up over down."""

from __future__ import annotations

import numpy as np

from surveykit.core import Input
from surveykit.evidence.albedo import footprint_share
from surveykit.evidence.conditions import Day, Sky
from surveykit.evidence.parts import (
    HALF_WIDTH,
    NotEvaluated,
    PassValue,
    calibration_flags,
    fixed,
    gain,
    series,
    zero,
)
from surveykit.intake.passes import Pass
from surveykit.physics.vegetation import ndvi, ndvi_of_sums
from surveykit.statistics.series import mean_of_series

BANDS = ("red_up", "red_down", "nir_up", "nir_down")


def vegetation_index(day: Day, this: Pass, sky: Sky) -> PassValue:
    """Return an NDVI pass; the index of the patch is the ratio of sums, not a mean of ratios."""
    read = {name: series(day, this, name)[1] for name in BANDS}
    settings = day.parameters.campaign.settings.ndvi
    value = float(ndvi_of_sums(read["red_up"], read["red_down"], read["nir_up"],
                               read["nir_down"]))
    if not np.isfinite(value):
        raise NotEvaluated("red and near-infrared of the pass do not sum to more than zero")
    inputs: list[Input] = [
        fixed("footprint_share", footprint_share(this, this.channels["red_up"])),
        Input("around_ndvi", settings.around_ndvi, settings.around_ndvi_u,
              f"{day.name}:{this.surface}:around ndvi", "NDVI around the patch, assumed"),
        Input("contamination_error", 0.0, HALF_WIDTH, f"{day.name}:{this.surface}:contamination",
              "foreign ground in the head's view, not corrected", "rectangular"),
    ]
    flags: tuple[str, ...] = ()
    for name in BANDS:
        channel = this.channels[name]
        mean = float(read[name].mean())
        inputs.append(fixed(name, mean))
        inputs.append(gain(channel, f"{name}_gain_error"))
        known = zero(day, channel, f"{name}_zero_error", 0.0)
        inputs.append(known)
        dark = day.darks[channel.logger, channel.column]
        if dark is None:
            flags += ("no dark reading",)
        if name.endswith("_up") and known.u > mean / settings.min_dark_ratio:
            raise NotEvaluated(
                f"{channel.column} reads {mean:.3g}, less than {settings.min_dark_ratio:g} times "
                "the uncertainty of its zero: too little light for an index")
    flags += ("gain ratio not checked by panel or swap", "surroundings not corrected")
    red = read["red_up"] / read["red_down"].mean()
    nir = read["nir_up"] / read["nir_down"].mean()
    r, n = float(red.mean()), float(nir.mean())
    lean = 2 / (r + n) ** 2
    steady = lean * (r * (nir - n * read["nir_down"] / read["nir_down"].mean())
                     - n * (red - r * read["red_down"] / read["red_down"].mean()))
    within = mean_of_series(steady, unit="1", method="ratio of sums")
    raw = _raw(day, this)
    return PassValue(raw, value, within.u, within.n_eff, tuple(inputs),
                     calibration_flags(day, [this.channels[b] for b in BANDS])
                     + tuple(dict.fromkeys(flags)),
                     (("raw", raw), ("dark readings", value)))


def _raw(day: Day, this: Pass) -> float:
    """Return the index before dark readings are taken off."""
    records = day.quality.passes[this.name]
    sums = {}
    for name in BANDS:
        channel = this.channels[name]
        index = (records.index if channel.logger == records.logger
                 else records.partners[channel.logger])
        sums[name] = float(day.records[channel.logger].channels[channel.column][index].sum())
    return float(ndvi(sums["red_up"] / sums["red_down"], sums["nir_up"] / sums["nir_down"]))
