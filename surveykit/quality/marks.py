"""Mark every reading of every logger: one bit a reason, nothing changed, all of it counted."""

from __future__ import annotations

import numpy as np

from surveykit.accounting import BIT, NS, Mask, counted
from surveykit.core import BoolArray, FloatArray
from surveykit.intake.capped import windows
from surveykit.intake.params import Channel
from surveykit.quality.checks import (
    end_of_range,
    out_of_range,
    saturated,
    spikes,
    steps,
    stuck,
    too_much_light,
)
from surveykit.quality.series import inside, within
from surveykit.quality.study import CLEAR_MAXIMUM, HEAT, LIGHT, MAIN, Study


def mark(study: Study, logger: str) -> dict[str, Mask]:
    """Return one mask a column: bit i set where REASONS[i] applies to the reading by itself."""
    log = study.records[logger]
    line = np.zeros(log.time_ns.size, dtype=np.uint32)
    for name, marked in log.marks.items():
        study.found(name, marked, line, logger=logger)
    masks = {}
    for column, channel in study.channels[logger].items():
        masks[column] = _mark(study, channel, line)
    timekeeping(study, logger)
    return masks


def _mark(study: Study, channel: Channel, line: Mask) -> Mask:
    log, sun, quality = study.records[channel.logger], study.sun[channel.logger], study.quality
    values, mask = log.channels[channel.column], line.copy()
    low, high = quality.range_of(channel.quantity)
    n, twofold = log.n_timed, channel.quantity in HEAT
    capped = inside(log.time_ns, [span for kind in ("dark", "cover") for span in windows(
        study.sheet, kind, channel.logger, channel.quantity)]) & (channel.quantity in MAIN)
    dull = capped | ~(sun.zenith_deg < 90) if channel.quantity in LIGHT else capped
    beyond = ("housing " * (channel.quantity == "housing_temperature")) + "out of range"
    faults = {
        "no reading": np.isnan(values) & ~log.unreadable[channel.column],
        "unreadable value": log.unreadable[channel.column],
        beyond: out_of_range(values, low, high),
        "physically impossible": ~capped & too_much_light(
            values, channel.quantity, sun, rare=False),
    }
    if channel.quantity in MAIN:
        whole = np.where((mask == 0) & ~faults[beyond] & ~dull, values, np.nan)
        faults["saturated"] = saturated(whole, quality.saturation_repeats, lower=twofold)
        faults["stuck reading"] = np.zeros(values.size, dtype=bool)
        faults["stuck reading"][:n] = stuck(
            values[:n], log.time_ns[:n], min_s=quality.flatline_min_s,
            false_alarms=quality.flatline_false_alarms,
            max_repeat=quality.flatline_max_repeat) & ~dull[:n]
        faults["capped"] = capped
    if channel.quantity in LIGHT:
        settings = study.parameters.campaign.settings
        limits = settings.albedo if channel.quantity[:5] == "short" else settings.ndvi
        served = inside(log.time_ns, [(p.start_ns, p.stop_ns) for p in study.passes])
        faults["sun too low"] = (sun.zenith_deg > limits.zenith_max_deg) & served
        faults["too little light"] = served & ~capped & _dim(values, channel, study, whole)
        _short_darks(study, channel)
    legible = (line & BIT["unreadable line"]) == 0
    for name, marked in faults.items():
        study.found(name, marked & legible, mask, logger=channel.logger, column=channel.column,
                    told=name != "capped")
    if channel.quantity in MAIN:
        _walked(study, channel, mask)
        ends = channel.range or (low, high)
        study.found("end of range", end_of_range(
            values, *ends, quality.saturation_share, lower=twofold or channel.range is not None)
            & (mask == 0), mask, logger=channel.logger, column=channel.column)
    if quality.rare_limit_warning:
        study.found("extremely rare irradiance",
                    too_much_light(values, channel.quantity, sun, rare=True) & (mask == 0), mask,
                    logger=channel.logger, column=channel.column)
    return mask


def _walked(study: Study, channel: Channel, mask: Mask) -> None:
    """Mark spikes, and flag steps of stand-off readings; a contact pass is full of both.

    A spike within the channel's own stated uncertainty is no matter.
    """
    log, quality = study.records[channel.logger], study.quality
    values = log.channels[channel.column]
    floor = np.hypot(channel.u_offset, channel.u_gain * (values - channel.offset.value))
    place = channel.logger, channel.column
    spiked, stepped = np.zeros(values.size, dtype=bool), np.zeros(values.size, dtype=bool)
    for this in study.passes:
        if this.kind == "contact" or this.to_ns <= this.from_ns or not any(
                (c.logger, c.column) == place for c in this.channels.values()):
            continue
        first, last = within(log.time_ns, this.from_ns, this.to_ns)
        rows = first + np.flatnonzero(mask[first:last] == 0)
        spiked[rows] = spikes(values[rows], window=quality.spike_window, mad=quality.spike_mad,
                              noise=quality.spike_noise, floor=floor[rows],
                              resolution=log.resolution[channel.column])
        rows = rows[~spiked[rows]]
        if this.kind == "stand-off":
            stepped[rows] = steps(log.time_ns[rows], values[rows], quality.step_max_k_s,
                                  log.interval_s)
    for name, hit in (("spike", spiked), ("step", stepped)):
        study.found(name, hit, mask, logger=channel.logger, column=channel.column)


def _dim(values: FloatArray, channel: Channel, study: Study, whole: FloatArray) -> BoolArray:
    """Readings under the floor of light; `whole` holds what is fit to tell the day's largest."""
    settings = study.parameters.campaign.settings
    if channel.quantity == "shortwave_down":
        floor = settings.albedo.min_down_w_m2
    elif channel.quantity in ("red_down", "nir_down"):
        bright = whole[np.isfinite(whole)]
        top = float(np.quantile(bright, CLEAR_MAXIMUM)) if bright.size else 0.0
        floor = settings.ndvi.min_down_share * top
    else:
        return np.zeros(values.shape, dtype=bool)
    with np.errstate(invalid="ignore"):
        return values < floor


def _short_darks(study: Study, channel: Channel) -> None:
    """Note dark rows of which nothing is left between their uncertain ends."""
    log = study.records[channel.logger]
    for start, stop in windows(study.sheet, "dark", channel.logger, channel.quantity,
                               certain=True):
        if not inside(log.time_ns, [(start, stop)]).any():
            study.note("dark reading", "flag", "no record lies within a dark row once its written "
                       "times give way by their uncertainty: cap longer, or write seconds",
                       "field practice", logger=channel.logger, column=channel.column)


def timekeeping(study: Study, logger: str) -> None:
    """Note gaps, an interval that is not the stated one, and uneven intervals."""
    log, quality = study.records[logger], study.quality
    steps_s = np.diff(log.time_ns[:log.n_timed]) / NS
    steps_s = steps_s[steps_s > 0]
    if steps_s.size == 0:
        return
    source, middle_s = "engineering default", float(np.median(steps_s))
    wide = int((steps_s > quality.gap_intervals * log.interval_s).sum())
    if wide:
        study.note("gap", "flag", f"{counted(wide, 'gap')} of more than "
                   f"{quality.gap_intervals:g} intervals, the longest {steps_s.max():.1f} s; "
                   "nothing is interpolated across", source, logger=logger, records=wide)
    off = middle_s / log.interval_s - 1
    if abs(off) > quality.rate_tolerance:
        study.note("rate", "flag", f"a record every {middle_s:.4g} s, {100 * abs(off):.2g} % "
                   f"{'more' if off > 0 else 'less'} than the stated interval_s of "
                   f"{log.interval_s:g} s", source, logger=logger, records=log.n_timed)
    low, high = np.quantile(steps_s, [0.16, 0.84])
    if high - low > 2 * quality.rate_tolerance * middle_s:
        study.note("jitter", "note", f"two in three intervals lie between {low:.4g} s and "
                   f"{high:.4g} s", source, logger=logger)
