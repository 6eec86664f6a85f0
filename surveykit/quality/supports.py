"""What passes lean on: dry ground, dark readings that hold still, a panel read not long ago."""

from __future__ import annotations

import numpy as np

from surveykit.accounting import NS
from surveykit.core import FloatArray
from surveykit.intake.capped import windows
from surveykit.intake.params import Channel
from surveykit.quality.series import within
from surveykit.quality.study import CLEAR_MAXIMUM, LIGHT, Masks, Study

ENGINEERING = "engineering default"


def support(study: Study, masks: Masks) -> None:
    """Note wet ground, dark readings that drifted, and panel rows too far from a pass."""
    campaign = study.parameters.campaign
    rain_mm, limit_mm = campaign.conditions.rain_48h_mm, campaign.settings.comparison.wet_rain_mm
    if rain_mm is not None and rain_mm > limit_mm:
        study.note("wet ground", "flag", f"{rain_mm:g} mm of rain in 48 h, more than {limit_mm:g}: "
                   "wet ground is darker and cooler, and of another emissivity", ENGINEERING)
    for channel in study.every_channel:
        if channel.quantity in LIGHT:
            _dark_drift(study, channel, masks)
    _panel(study)


def dark_levels(study: Study, channel: Channel) -> tuple[FloatArray, FloatArray]:
    """Return middle [ns UTC] and median reading [SI] of each dark row of a channel, in order."""
    log = study.records[channel.logger]
    values, found = log.channels[channel.column], []
    for start, stop in windows(study.sheet, "dark", channel.logger, channel.quantity,
                               certain=True):
        read = values[slice(*within(log.time_ns, start, stop))]
        read = read[np.isfinite(read)]
        if read.size:
            found.append(((start + stop) / 2, float(np.median(read))))
    level = np.array(sorted(found), dtype=np.float64).reshape(-1, 2)
    return level[:, 0], level[:, 1]


def _dark_drift(study: Study, channel: Channel, masks: Masks) -> None:
    _, dark = dark_levels(study, channel)
    good = study.records[channel.logger].channels[channel.column][
        masks[channel.logger][channel.column] == 0]
    if dark.size < 2 or not good.size:
        return
    top = float(np.quantile(good, CLEAR_MAXIMUM))
    share, limit = float(np.ptp(dark)) / max(top, 1e-9), study.quality.dark_drift_max
    if share > limit:
        study.note("dark drift", "flag", f"its dark reading moved by {np.ptp(dark):.3g} W m-2 "
                   f"between caps, {100 * share:.2g} % of its largest readings: cap more often",
                   ENGINEERING, logger=channel.logger, column=channel.column)


def _panel(study: Study) -> None:
    """Note passes further from the nearest row over the panel than its reading holds."""
    reach_s = study.quality.panel_reach_s
    rows = [e for e in study.sheet.entries if e.entry == "panel"]
    for this in study.passes:
        near = [max(this.start_ns - e.stop_ns, e.start_ns - this.stop_ns) / NS for e in rows
                if e.instrument in ("", *this.loggers)]
        if this.quantity == "ndvi" and near and min(near) > reach_s:
            study.note("panel", "flag", f"the panel was last read {min(near) / 60:.0f} min away, "
                       f"more than {reach_s / 60:g} min: the gain ratio may have moved",
                       ENGINEERING, surface=this.surface, pass_=this.name)
