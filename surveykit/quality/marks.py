"""Mark every reading of every logger: one bit a reason, nothing changed, all of it counted."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from surveykit.accounting import BIT, NS, REASONS, Mask
from surveykit.core import BoolArray, FloatArray
from surveykit.intake.capped import windows
from surveykit.intake.fieldsheet import Sheet
from surveykit.intake.loggers import Records
from surveykit.intake.params import Channel, Parameters
from surveykit.intake.passes import Pass
from surveykit.physics.shortwave import shortwave_limits
from surveykit.physics.sun import Sun
from surveykit.quality.checks import inside, out_of_range, physically_impossible, stuck

LIGHT = ("shortwave_down", "shortwave_up", "red_down", "red_up", "nir_down", "nir_up")
MAIN = (*LIGHT, "brightness_temperature", "longwave_down", "longwave_up")
CLEAR_MAXIMUM = 0.99  # quantile of a head's readings that stands for its clear maximum


@dataclass
class Study:
    """What the quality stage looks at, and the checks it has noted."""

    parameters: Parameters
    records: dict[str, Records]
    sheet: Sheet
    passes: tuple[Pass, ...]
    channels: dict[str, dict[str, Channel]] = field(default_factory=dict)
    sun: dict[str, Sun] = field(default_factory=dict)
    checks: list[dict[str, Any]] = field(default_factory=list)

    def note(self, check: str, severity: str, message: str, source: str, *, logger: str = "",
             column: str = "", surface: str = "", pass_: str = "", records: int = 0) -> None:
        """Add a row to the table of checks."""
        self.checks.append({
            "campaign": self.parameters.campaign.campaign, "check": check, "logger": logger,
            "column": column, "surface": surface, "pass": pass_, "severity": severity,
            "records": records, "message": message, "source": source})


def mark(study: Study, logger: str) -> dict[str, Mask]:
    """Return one mask a column: bit i set where REASONS[i] applies."""
    log, sun = study.records[logger], study.sun[logger]
    settings = study.parameters.campaign.settings
    ranges = settings.quality.ranges
    line = np.zeros(log.time_ns.size, dtype=np.uint32)
    for name, marked in log.marks.items():
        line |= np.where(marked, BIT[name], np.uint32(0))
        _count(study, name, logger, "", int(marked.sum()))
    masks = {}
    in_passes = inside(log.time_ns, [(p.start_ns, p.stop_ns) for p in study.passes])
    for column, channel in study.channels[logger].items():
        values, mask = log.channels[column], line.copy()
        faults = {
            "no reading": np.isnan(values) & ~log.unreadable[column],
            "unreadable value": log.unreadable[column],
            "out of range": out_of_range(values, *getattr(ranges, channel.quantity)),
            "physically impossible": physically_impossible(values, channel.quantity, sun),
        }
        if channel.quantity in MAIN:
            n = log.n_timed
            faults["stuck reading"] = np.zeros(values.size, dtype=bool)
            faults["stuck reading"][:n] = stuck(
                values[:n], log.time_ns[:n], min_s=settings.quality.flatline_min_s,
                false_alarms=settings.quality.flatline_false_alarms)
        if channel.quantity in LIGHT:
            capped = inside(log.time_ns, windows(study.sheet, "dark", logger, channel.quantity))
            faults["stuck reading"] &= ~capped & (sun.zenith_deg < 90)
            faults["physically impossible"] &= ~capped
            limits = settings.albedo if channel.quantity[:5] == "short" else settings.ndvi
            faults["capped"] = capped
            faults["sun too low"] = (sun.zenith_deg > limits.zenith_max_deg) & in_passes
            faults["too little light"] = in_passes & ~capped & _dim(values, channel, study, capped)
            _short_darks(study, channel)
        for name, marked in faults.items():
            marked = marked & ((line & BIT["unreadable line"]) == 0)
            mask |= np.where(marked, BIT[name], np.uint32(0))
            if name != "capped":
                _count(study, name, logger, column, int(marked.sum()))
        if channel.quantity == "shortwave_down" and settings.quality.rare_limit_warning:
            _rare(study, logger, column, values, mask, sun)
        masks[column] = mask
    _gaps(study, logger)
    return masks


def _dim(values: FloatArray, channel: Channel, study: Study, capped: BoolArray) -> BoolArray:
    settings = study.parameters.campaign.settings
    if channel.quantity == "shortwave_down":
        floor = settings.albedo.min_down_w_m2
    elif channel.quantity in ("red_down", "nir_down"):
        bright = values[~capped & np.isfinite(values)]
        top = float(np.quantile(bright, CLEAR_MAXIMUM)) if bright.size else 0.0
        floor = settings.ndvi.min_down_share * top
    else:
        return np.zeros(values.shape, dtype=bool)
    with np.errstate(invalid="ignore"):
        return values < floor


def _rare(study: Study, logger: str, column: str, values: FloatArray, mask: Mask,
          sun: Sun) -> None:
    limits = shortwave_limits(sun.cos_zenith, sun.extraterrestrial_w_m2)
    with np.errstate(invalid="ignore"):
        count = int(((values > limits.down_rare) & (mask == 0)).sum())
    if count:
        study.note("extremely rare irradiance", "flag", f"{count} readings are above the extremely "
                   "rare limit; at several records a second the edge of a cloud can do this",
                   "Long & Shi 2008, extremely rare limits (made for one-minute means)",
                   logger=logger, column=column, records=count)


def _short_darks(study: Study, channel: Channel) -> None:
    """Note dark rows of which nothing is left between their uncertain ends."""
    log = study.records[channel.logger]
    for start, stop in windows(study.sheet, "dark", channel.logger, channel.quantity,
                               certain=True):
        if not inside(log.time_ns, [(start, stop)]).any():
            study.note("dark reading", "flag", "no record lies within a dark row once its written "
                       "times give way by their uncertainty: cap longer, or write seconds",
                       "field practice", logger=channel.logger, column=channel.column)


def _gaps(study: Study, logger: str) -> None:
    log, quality = study.records[logger], study.parameters.campaign.settings.quality
    steps_s = np.diff(log.time_ns[:log.n_timed]) / NS
    wide = steps_s > quality.gap_intervals * log.interval_s
    if wide.any():
        study.note("gap", "flag", f"{int(wide.sum())} gaps of more than "
                   f"{quality.gap_intervals:g} intervals, the longest {steps_s.max():.1f} s; "
                   "nothing is interpolated across them", "engineering default", logger=logger,
                   records=int(wide.sum()))


def _count(study: Study, name: str, logger: str, column: str, count: int) -> None:
    if count:
        reason = next(r for r in REASONS if r.name == name)
        study.note(name, "exclude", f"{count} records: {reason.sentence}", reason.source,
                   logger=logger, column=column, records=count)
