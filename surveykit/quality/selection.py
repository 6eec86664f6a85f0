"""Which records each pass may use, and why the rest of its window may not."""

from __future__ import annotations

from collections import Counter

import numpy as np

from surveykit.accounting import BIT, NOT_A_FAULT, NS, REASONS, Mask, PassRecords
from surveykit.core import BoolArray, IntArray
from surveykit.intake.passes import Pass, find_dwells
from surveykit.quality.checks import nearest, primary
from surveykit.quality.marks import Study


def choose(study: Study, this: Pass, masks: dict[str, dict[str, Mask]]) -> PassRecords:
    """Return the records of a pass that may be used, and count the rest of its window."""
    main = next(iter(this.channels.values())).logger
    log, sun = study.records[main], study.sun[main]
    settings = study.parameters.campaign.settings
    window = np.flatnonzero((log.time_ns >= this.start_ns) & (log.time_ns < this.stop_ns))
    mask = np.zeros(window.size, dtype=np.uint32)
    partners: dict[str, IntArray] = {}
    for channel in this.channels.values():
        if channel.logger == main:
            mask |= masks[main][channel.column][window]
            continue
        other = study.records[channel.logger]
        if channel.logger not in partners:
            reach_s = 0.5 * max(log.interval_s, other.interval_s) + 1e-3
            partners[channel.logger] = nearest(log.time_ns[window], other.time_ns, reach_s)
        at = partners[channel.logger]
        mask |= np.where(at < 0, BIT["no partner"], masks[channel.logger][channel.column][at])
    times = log.time_ns[window]
    mask |= np.where((times < this.from_ns) | (times >= this.to_ns), BIT["pass edge"],
                     np.uint32(0)).astype(np.uint32)
    dwells: list[tuple[int, int]] = []
    if this.kind == "contact":
        mask, dwells = _place(study, this, window, mask)
    faults = (mask & ~NOT_A_FAULT) != 0
    inside = (mask & BIT["pass edge"]) == 0
    share = float((faults & inside).sum() / max(inside.sum(), 1))
    names = [REASONS[i].name for i in primary(mask) if i >= 0]
    reasons = dict(Counter(names))
    used = mask == 0
    sun_low = (mask & BIT["sun too low"]) != 0
    refusal = _refusal(study, this, window, share, reasons, int(used.sum()), sun_low & inside)
    severity = "refuse" if refusal else "flag"
    if refusal or share > settings.quality.excluded_flag:
        study.note("records of a pass", severity, refusal or f"{share:.0%} of the pass's records "
                   "are excluded", "engineering default", logger=main, surface=this.surface,
                   pass_=this.name, records=int((faults & inside).sum()))
    zenith = float(np.mean(sun.zenith_deg[window])) if window.size else float("nan")
    keep = window[used] if not refusal else window[:0]
    where = np.cumsum(used) - 1
    return PassRecords(
        main, keep, {k: v[used] if not refusal else v[:0] for k, v in partners.items()},
        int(window.size), reasons, refusal,
        tuple((int(where[a]), int(where[b - 1]) + 1) for a, b in dwells) if not refusal else (),
        zenith)


def _place(study: Study, this: Pass, window: IntArray,
           mask: Mask) -> tuple[Mask, list[tuple[int, int]]]:
    """Find the settled placements among a contact pass's good records and mark the rest."""
    channel = this.channels["brightness_temperature"]
    log, settings = study.records[channel.logger], study.parameters.campaign.settings
    good = np.flatnonzero(mask == 0)
    found = find_dwells(
        log.time_ns[window][good] / NS, log.channels[channel.column][window][good],
        settle_s=settings.passes.settle_time_constants * (channel.time_constant_s or 0.0),
        min_s=settings.temperature.dwell_min_s,
        max_rate_k_s=settings.temperature.dwell_max_rate_k_s)
    settled = np.zeros(window.size, dtype=bool)
    spans = []
    for part in found:
        rows = good[part]
        settled[rows] = True
        spans.append((int(rows[0]), int(rows[-1]) + 1))
    mask = mask | np.where(settled | (mask != 0), np.uint32(0), BIT["between placements"])
    return mask.astype(np.uint32), spans


def _refusal(study: Study, this: Pass, window: IntArray, share: float, reasons: dict[str, int],
             n_used: int, sun_low: BoolArray) -> str:
    """Return why the pass cannot be evaluated, or an empty text."""
    if window.size == 0:
        return "no record of its logger falls into the pass"
    if share > study.parameters.campaign.settings.quality.excluded_refuse or n_used < 2:
        if sun_low.any():
            return _dark_refusal(study, this, window[sun_low])
        if this.kind == "contact" and "between placements" in reasons:
            return "no settled placement of the head was found"
        if not reasons or (len(reasons) == 1 and "pass edge" in reasons):
            return "nothing is left of the pass between its uncertain edges"
        worst = max(reasons, key=lambda name: (reasons[name], name))
        return f"{share:.0%} of the records are excluded, most as: {worst}"
    return ""


def _dark_refusal(study: Study, this: Pass, rows: IntArray) -> str:
    channel = next((c for q, c in this.channels.items() if q.endswith("_down")), None)
    main = next(iter(this.channels.values())).logger
    zenith = float(np.mean(study.sun[main].zenith_deg[rows]))
    where = "below the horizon" if zenith > 90 else f"only {90 - zenith:.0f} degrees high"
    if channel is not None and channel.quantity == "shortwave_down" and zenith > 90:
        log = study.records[channel.logger]
        at = nearest(study.records[main].time_ns[rows], log.time_ns, log.interval_s)
        down = float(np.mean(log.channels[channel.column][at[at >= 0]]))
        if down > study.parameters.campaign.settings.albedo.min_down_w_m2:
            return (f"computed sun {where} while the pair reads {down:.0f} W m-2: "
                    "check longitude, zone or clock")
        return f"the sun is {where}: an albedo read in the dark is the ratio of two offsets"
    return f"the sun is {where}, lower than the limit of the method"
