"""NDVI of a pass: index of the ratios of sums of red and near-infrared, up over down."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

from surveykit.core import Input
from surveykit.evidence.conditions import Day, Sky
from surveykit.evidence.corrections import Correction, correct, lag_corrections
from surveykit.evidence.intercalibration import over_panel, panel_u, ratio_input, swapped
from surveykit.evidence.parts import (
    BANDS,
    NotEvaluated,
    PassValue,
    calibration_flags,
    fixed,
    gain,
    raw_series,
    series,
    skew,
    surface_scope,
    zero,
)
from surveykit.evidence.views import foreign_ground
from surveykit.intake.params.heads import BandConversion
from surveykit.intake.passes import Pass
from surveykit.physics.vegetation import ndvi, ndvi_of_sums
from surveykit.statistics.series import mean_of_series

OTHER_QUESTION = 0.02  # by which the records' mean index may differ before it is said


def vegetation_index(day: Day, this: Pass, sky: Sky) -> PassValue:
    """Return an NDVI pass; the index of the patch is the ratio of sums, not a mean of ratios.

    A head's level and its own shade act on both bands alike and cancel.
    """
    read = {name: series(day, this, name)[1] for name in BANDS}
    settings = day.parameters.campaign.settings.ndvi
    if not np.isfinite(ndvi_of_sums(*(read[name] for name in BANDS))):
        raise NotEvaluated("red and near-infrared of the pass do not sum to more than zero")
    around = Input("around_ndvi", settings.around_ndvi, settings.around_ndvi_u,
                   f"{day.name}:{this.surface}:around ndvi", "NDVI around the patch, assumed")
    inputs, flags = foreign_ground(day, this, this.channels["red_up"], around)
    inputs = [i for i in inputs if i.name != "footprint_error"]
    for name in BANDS:
        channel = this.channels[name]
        place = channel.logger, channel.column
        dark = day.darks[place]
        mean = float(read[name].mean())
        known = zero(day, channel, f"{name}_zero_error", settings.dark_u * day.largest[place])
        inputs += [fixed(name, mean), known]
        if dark is None:
            flags += ("no dark reading",)
        if name.endswith("_up") and (known.u > mean * settings.max_dark_u or (
                dark is not None and dark.sd > mean / settings.min_dark_ratio)):
            raise NotEvaluated(
                f"{channel.column} reads {mean:.3g}, less than {1 / settings.max_dark_u:g} times "
                f"the uncertainty of its zero or {settings.min_dark_ratio:g} times the scatter of "
                "its dark reading: too little light for an index")
    skews = [i for band in ("red", "nir") for i in skew(day, this, band, f"{band}_")]
    gains, more = _gains(day, this)
    if sky.kind == "mixed":
        more += (f"sky neither clear nor overcast: {sky.clear_index:.0%} of a clear one",)
    raw = {name: raw_series(day, this, name)[1] for name in BANDS}
    converted = _conversion(this)
    made = correct("ndvi", {i.name: i for i in (*inputs, *skews, *gains, *converted)}, [
        Correction("dark readings", {name: float(raw[name].mean()) for name in BANDS},
                   "ndvi.correct_darks", settings.correct_darks),
        *lag_corrections(skews, "ndvi.correct_lag", settings.correct_lag),
        *[Correction("gain ratio", {"red_ratio": 1.0, "nir_ratio": 1.0},
                     "ndvi.correct_gain_ratio")] * any(i.name == "nir_ratio" for i in gains),
        *[Correction("bands converted", {"conversion_slope": 1.0, "conversion_intercept": 0.0},
                     "ndvi.correct_bands", settings.correct_bands)] * bool(converted)],
        f"{day.name}:{this.surface}:ndvi")
    if made.inputs["footprint_share"].value < 1:
        flags += ("surroundings not corrected",)
    flags += (*more, *made.flags, *_mean_of_ratios(read))
    red, nir = (read[f"{band}_up"] / read[f"{band}_down"].mean() / next(
        (i.value for i in gains if i.name == f"{band}_ratio"), 1.0) for band in ("red", "nir"))
    r, n = float(red.mean()), float(nir.mean())
    lean = 2 / (r + n) ** 2 * next((i.value for i in made.inputs.values()
                                    if i.name == "conversion_slope"), 1.0)
    steady = lean * (r * (nir - n * read["nir_down"] / read["nir_down"].mean())
                     - n * (red - r * read["red_down"] / read["red_down"].mean()))
    within = mean_of_series(steady, unit="1", method="ratio of sums")
    return PassValue(float(ndvi_of_sums(*raw.values())), made.steps[-1][1], within.u, within.n_eff,
                     tuple(made.inputs.values()),
                     calibration_flags(day, [this.channels[b] for b in BANDS])
                     + tuple(dict.fromkeys(flags)), made.steps, records=steady)


def bands_of(this: Pass, inputs: Iterable[Input]) -> frozenset[tuple[object, object]]:
    """Return centres and widths of the bands that an NDVI stands for, None where not stated."""
    held, entry = {i.name: i.value for i in inputs}, _stated(this)
    if entry is not None and (held.get("conversion_slope"), held.get("conversion_intercept")) == (
            entry.slope, entry.intercept):
        return frozenset([(entry.centres_nm, entry.widths_nm)])
    return frozenset((c.band_centres_nm, c.band_widths_nm) for c in this.channels.values())


def _stated(this: Pass) -> BandConversion | None:
    return next(filter(None, (c.band_conversion for c in this.channels.values())), None)


def _conversion(this: Pass) -> list[Input]:
    """Return the conversion to other bands that the ground heads state, if they do."""
    entry = _stated(this)
    if entry is None:
        return []
    return [fixed("conversion_slope", entry.slope), fixed("conversion_intercept", entry.intercept),
            Input("conversion_error", 0.0, entry.u, surface_scope("bands", this.surface, entry),
                  f"conversion of NDVI to other bands ({entry.source})")]


def _gains(day: Day, this: Pass) -> tuple[list[Input], tuple[str, ...]]:
    """Return the heads' gain ratios by panel, swap or certificate, or the errors of the gains."""
    settings = day.parameters.campaign.settings
    own = [gain(this.channels[name], f"{name}_gain_error") for name in BANDS]
    none = [fixed(f"{name}_gain_error", 0.0) for name in BANDS]
    pairs = {band: (this.channels[f"{band}_up"], this.channels[f"{band}_down"])
             for band in ("red", "nir")}
    found = {band: over_panel(day, *pair) for band, pair in pairs.items()}
    what, source = "panel rows", "gain ratio over a panel"
    if None in found.values():
        found = {band: swapped(day, *pair, "ndvi") for band, pair in pairs.items()}
        what, source = "swaps", "gain ratio by swapping the heads"
        if None not in found.values() and any(
                up.half_angle_deg != down.half_angle_deg for up, down in pairs.values()):
            return own, ("swaps not used: the heads have different views",)
    ratios = {band: one for band, one in found.items() if one is not None}
    certificate = pairs["nir"][0].band_ratio
    if len(ratios) < 2 and certificate is None:
        return own, ("gain ratio not checked by panel or swap",)
    if not settings.ndvi.correct_gain_ratio:
        return own, ("not corrected, settings.ndvi.correct_gain_ratio is off: gain ratio",)
    if len(ratios) < 2 and certificate is not None:
        return [*none, fixed("red_ratio", 1.0),
                Input("nir_ratio", certificate.value, certificate.u,
                      f"{pairs['nir'][0].gain_scope}:band ratio",
                      f"ratio of the bands' gains ({certificate.source})")], ()
    if any(one.sd > settings.albedo.swap_max_sd for one in ratios.values()):
        return own, (f"{what} not used: their ratios scatter by more than "
                     f"{settings.albedo.swap_max_sd:.0%}",)
    made = [ratio_input(day, f"{band}_ratio", one, pairs[band][0], source)
            for band, one in ratios.items()]
    if "panel" in source:
        made.append(Input("panel_error", 0.0, panel_u(day, *pairs["red"]), f"{day.name}:panel",
                          "reflectance of the panel"))
    few = any(one.few for one in ratios.values())
    return [*none, *made], ("fewer or shorter swaps than recommended",) if few else ()


def _mean_of_ratios(read: dict[str, np.ndarray]) -> tuple[str, ...]:
    """Return a flag where the records' mean index answers another question than the patch's."""
    with np.errstate(divide="ignore", invalid="ignore"):
        each = ndvi(read["red_up"] / read["red_down"], read["nir_up"] / read["nir_down"])
    mean = float(np.nanmean(each)) if np.isfinite(each).any() else float("nan")
    whole = ndvi_of_sums(*(read[name] for name in BANDS))
    if abs(mean - whole) > OTHER_QUESTION:
        return (f"mean of the records' indices {mean:.3f}: bright and green parts mix",)
    return ()
