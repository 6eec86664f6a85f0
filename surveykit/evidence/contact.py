"""Surface temperature of a contact pass: the bore's cavity, the rim, and the cooling under it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from surveykit.core import FloatArray, Input, IntArray
from surveykit.evidence.backgrounds import sky_inputs
from surveykit.evidence.brightness import housing
from surveykit.evidence.conditions import NS, Day, Sky
from surveykit.evidence.corrections import Correction, correct
from surveykit.evidence.infrared import (
    Found,
    emissivity_corrections,
    head_inputs,
    per_record,
    setting_correction,
)
from surveykit.evidence.parts import (
    HALF_WIDTH,
    NotEvaluated,
    PassValue,
    fixed,
    pass_scope,
    series,
)
from surveykit.intake.passes import Pass
from surveykit.physics.cooling import CoolingFit, first_described, fit_placements
from surveykit.physics.thermal import head_cooling_k
from surveykit.statistics.series import mean_of_series

FEW_PLACEMENTS = 3
FEWEST_RECORDS = 5  # of a placement, from two time constants on
SENDS_NOTHING_K = 1.0  # of a body whose radiance is none to speak of
TOUCH_TOLERANCE_K = 0.2  # of the readings about the law of cooling, back to the touch
Spans = tuple[tuple[int, int], ...]


def contact(day: Day, this: Pass, sky: Sky) -> PassValue:
    """Return a contact pass: the mean over its placements of the cavity's balance.

    Where the housing's temperature was not logged the reading is kept as it is, and all that
    emissivity and a bore as warm as the air would do is allowed on either side.
    """
    time, brightness = series(day, this, "brightness_temperature")
    spans = day.quality.passes[this.name].dwells
    if not spans:
        raise NotEvaluated("no settled placement of the head was found in the contact pass")
    inputs, flags = _inputs(day, this, sky, brightness)
    settings = day.parameters.campaign.settings.temperature
    cooled, placed = _expected_cooling_k(day, this, time, spans), None
    if settings.correct_head_cooling and cooled > 0:
        placed, spans = _before_touch(day, this, inputs, spans)
    per = per_record("contact", inputs, brightness)
    found = [mean_of_series(per[a:b], unit="K", method="contact") for a, b in spans]
    means = np.array([one.value for one in found])
    if placed is not None:
        inputs["head_cooling_k"] = fixed("head_cooling_k", placed.mean_k - float(means.mean()))
    cooling, more = _cooling(day, this, cooled, placed)
    inputs, flags = inputs | cooling, flags + more
    raw = float(np.mean([brightness[a:b].mean() for a, b in spans]))
    inputs["brightness_k"] = fixed("brightness_k", raw)
    values = means if placed is None else placed.before_k
    n = values.size
    u = float(values.std(ddof=1) / np.sqrt(n)) if n > 1 else float(per.std(ddof=1))
    if n < FEW_PLACEMENTS:
        flags += ("few placements",)

    def over_placements(some: FloatArray) -> float:
        return float(np.mean([np.broadcast_to(some, per.shape)[a:b].mean() for a, b in spans]))

    made = correct("contact", inputs, _corrections(day, inputs, placed is not None),
                   f"{day.name}:{this.surface}:contact", series={"brightness_k": brightness},
                   reduce=over_placements)
    final = made.steps[-1][1]
    rows = [(int(time[a]), int(time[b - 1]), value, one.u, one.n) for (a, b), one, value in zip(
        spans, found, values + (final - values.mean()), strict=True)]
    return PassValue(raw, final, u, float(n), tuple(made.inputs.values()),
                     flags + made.flags, made.steps, tuple(rows))


def _inputs(day: Day, this: Pass, sky: Sky, brightness: FloatArray) -> Found:
    inputs, flags = head_inputs(day, this, sky, brightness)
    channel = this.channels["brightness_temperature"]
    settings = day.parameters.campaign.settings.temperature
    overhead, more = sky_inputs(day, this, sky, channel)
    body = housing(day, channel, this.from_ns, this.to_ns) or fixed(
        "body_k", overhead["air_k"].value)
    bore, scope = channel.bore_emissivity, f"{day.name}:{this.surface}:rim gap"
    inputs |= overhead | {
        "body_k": replace(body, name="body_k"),
        "bore_emissivity": Input("bore_emissivity", bore.value, bore.u,
                                 f"{channel.gain_scope}:bore", "emissivity of the bore")}
    half = settings.rim_gap_max / 2
    inputs["rim_gap"] = Input("rim_gap", half, half * HALF_WIDTH, scope,
                              "gap under the rim", "rectangular")
    if not settings.correct_rim_gap:
        inputs |= {"rim_gap": fixed("rim_gap", 0.0), "rim_gap_error": Input(
            "rim_gap_error", 0.0, settings.rim_gap_max * HALF_WIDTH, scope,
            "gap under the rim, not corrected", "rectangular")}
        more += ("rim gap not corrected",)
    return inputs, flags + more


def _corrections(day: Day, inputs: dict[str, Input], cooled: bool) -> list[Correction]:
    gap = day.parameters.campaign.settings.temperature.correct_rim_gap
    if inputs["body_k"].scope:
        steps = emissivity_corrections(day, "emissivity", "bore", {"body_k": SENDS_NOTHING_K})
    else:
        gap, steps = False, [Correction(
            "emissivity and bore", {"emissivity": 1.0}, "temperature.correct_bore", False,
            "housing temperature not logged: emissivity and bore not corrected")]
    return [*setting_correction(day, inputs), *steps,
            *[Correction("rim gap", {"rim_gap": 0.0}, "temperature.correct_rim_gap")] * gap,
            *[Correction("cooling under the head", {"head_cooling_k": 0.0},
                         "temperature.correct_head_cooling")] * cooled]


def _expected_cooling_k(day: Day, this: Pass, time: IntArray, spans: Spans) -> float:
    """Return what a typical ground cools until the middle of the longest placement; 0 in shade."""
    settings = day.parameters.campaign.settings
    settle = settings.passes.settle_time_constants
    tau = this.channels["brightness_temperature"].time_constant_s or 0.0
    longest = max(float(time[b - 1] - time[a]) / NS for a, b in spans)
    sun = _sun_w_m2(day, this)
    if sun < settings.temperature.head_cooling_sun_w_m2:
        return 0.0
    return float(head_cooling_k(sun, longest / 2 + settle * tau, settings.temperature.effusivity))


def _sun_w_m2(day: Day, this: Pass) -> float:
    """Return the irradiance during a pass, however weak; that of a clear sky if not watched."""
    for channel in day.channels.get("shortwave_down", []):
        time, value = day.readings(channel, this.start_ns, this.stop_ns,
                                   through=("sun too low", "too little light"))
        if value.size > 2:
            return float(day.without_dark(channel, time, value).mean())
    ends = np.array([this.start_ns, this.stop_ns], dtype=np.int64)
    return float(day.sun(ends).clear_sky_w_m2.mean())


def _before_touch(day: Day, this: Pass, inputs: dict[str, Input],
                  spans: Spans) -> tuple[CoolingFit, Spans]:
    """Fit the placements' course: what stood before the touch, and the placements long enough.

    Raises
    ------
    NotEvaluated
        If no placement is long enough, or the fit is too uncertain.
    """
    settings = day.parameters.campaign.settings.temperature
    tau = this.channels["brightness_temperature"].time_constant_s or 0.0
    kept = [(span, course) for span, course in zip(
        spans, placement_courses(day, this, tau), strict=True)
        if (course[0] >= 2 * tau).sum() >= FEWEST_RECORDS and course[0][-1] >= 5 * tau]
    if not kept:
        raise NotEvaluated(f"no placement has {FEWEST_RECORDS} records and five time constants: "
                           "the cooling under the head cannot be fitted; hold it longer")
    fit = fit_placements([time_s for _, (time_s, _) in kept],
                         [per_record("contact", inputs, read) for _, (_, read) in kept],
                         time_constant_s=tau, fit_time_constant=False, lagged=True)
    if not fit.u_mean_k <= settings.head_cooling_fit_max_u_k:
        raise NotEvaluated(
            f"the fit of the cooling under the head leaves {fit.u_mean_k:.1f} K, more than "
            f"{settings.head_cooling_fit_max_u_k:g}: hold the head longer, or measure from above")
    return fit, tuple(span for span, _ in kept)


def placement_courses(day: Day, this: Pass, tau: float) -> list[tuple[FloatArray, FloatArray]]:
    """Return for each placement the seconds since its touch, and its readings [K].

    The touch is taken half a step before the first record that the law of cooling describes.
    """
    channel, records = this.channels["brightness_temperature"], day.quality.passes[this.name]
    log = day.records[channel.logger]
    mask = day.quality.masks[channel.logger][channel.column]
    out, floor = [], int(np.searchsorted(log.time_ns[:log.n_timed], this.start_ns))
    for first, stop in records.dwells:
        at, end = int(records.index[first]), int(records.index[stop - 1])
        rows = np.arange(floor, end + 1)
        bad = rows[(mask[rows] != 0) & (rows < at)]
        rows = rows[(rows > bad.max(initial=-1)) & (mask[rows] == 0)]
        time_s = (log.time_ns[rows] - log.time_ns[at]) / NS
        read = log.channels[channel.column][rows]
        begin = first_described(time_s, read, int(np.searchsorted(rows, at)),
                                time_constant_s=tau, tolerance_k=TOUCH_TOLERANCE_K)
        half = (time_s[begin] - time_s[begin - 1]) / 2 if begin else 0.0
        out.append((time_s[begin:] - time_s[begin] + half, read[begin:]))
        floor = end + 1
    return out


def _cooling(day: Day, this: Pass, cooled: float, placed: CoolingFit | None) -> Found:
    """Return the inputs of the cooling under the head, fitted or whole, and flags."""
    settings, scope = day.parameters.campaign.settings.temperature, f"{day.name}:{this.surface}"
    if placed is None:
        if cooled > settings.head_cooling_max_k:
            raise NotEvaluated(f"the ground cools by about {cooled:.1f} K under the head, more "
                               f"than {settings.head_cooling_max_k:g} without the fit")
        return {"head_cooling_error": Input(
            "head_cooling_error", 0.0, cooled * HALF_WIDTH, f"{scope}:head cooling",
            "cooling of the ground under the head, not corrected", "rectangular")}, (
                ("head cooling not corrected",) if cooled > 0 else ())
    return {
        "head_cooling_error": Input(
            "head_cooling_error", 0.0, settings.head_cooling_u_k, f"{scope}:head cooling",
            "form of the law of cooling under the head"),
        "fit_left": Input("fit_left", 0.0, placed.u_mean_k, pass_scope(day, this),
                          "fit of the cooling under the head")}, (
        ("the ground warms under the head: the law of cooling does not hold",)
        if placed.rate < -3 * placed.u_rate else ())
