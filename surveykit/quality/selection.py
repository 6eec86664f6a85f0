"""Which records each pass may use, and why the rest of its window may not."""

from __future__ import annotations

from collections import Counter

import numpy as np

from surveykit.accounting import (
    BIT,
    CHECKS,
    NOT_A_FAULT,
    NS,
    OFF_PATCH,
    REASONS,
    Mask,
    PassRecords,
    counted,
    percent,
    primary,
)
from surveykit.core import BoolArray, IntArray
from surveykit.intake.passes import Pass, find_dwells
from surveykit.quality.consistency import placed_far_from_air
from surveykit.quality.series import partners, within
from surveykit.quality.study import Masks, Study

FEWEST = 2  # records that have a spread


def choose(study: Study, this: Pass, masks: Masks) -> PassRecords:
    """Return the records of a pass that may be used, and count the rest of its window."""
    main = next(iter(this.channels.values())).logger
    log, sun = study.records[main], study.sun[main]
    window = np.arange(*within(log.time_ns, this.start_ns, this.stop_ns))
    mask = np.zeros(window.size, dtype=np.uint32)
    matched: dict[str, IntArray] = {}
    for channel in this.channels.values():
        if channel.logger == main:
            mask |= masks[main][channel.column][window]
            continue
        if channel.logger not in matched:
            matched[channel.logger] = partners(log, window, study.records[channel.logger])
        at = matched[channel.logger]
        mask |= np.where(at < 0, BIT["no partner"], masks[channel.logger][channel.column][at])
    mask |= study.off_patch(this, log.time_ns[window])
    dwells: list[tuple[int, int]] = []
    if this.kind == "contact":
        mask, dwells = _place(study, this, window, mask)
        settled = np.flatnonzero(mask == 0)
        far = placed_far_from_air(study, masks, this, window[settled])
        mask[settled[far]] |= BIT["far from the air"]
    used = mask == 0
    refusal = _refusal(study, this, window, mask)
    _note(study, this, main, mask, refusal)
    if refusal:
        used[:] = False
        dwells = []
    _missing(study, this)
    lit = window[used] if used.any() else window
    zenith = float(np.mean(sun.zenith_deg[lit])) if lit.size else float("nan")
    where = np.cumsum(used) - 1
    kept = {main: window[used]} | {name: at[used] for name, at in matched.items()}
    return PassRecords(
        main, window[used], {name: kept[name] for name in matched}, int(window.size),
        dict(Counter(REASONS[i].name for i in primary(mask) if i >= 0)), refusal,
        tuple((int(where[a]), int(where[b - 1]) + 1) for a, b in dwells), zenith,
        _flags(study, this, kept))


def _place(study: Study, this: Pass, window: IntArray,
           mask: Mask) -> tuple[Mask, list[tuple[int, int]]]:
    """Find the settled placements among a contact pass's good records and mark the rest.

    A placement is a run of settled records that lasts `temperature.dwell_min_s`; its first
    `passes.settle_time_constants` time constants are not used.
    """
    channel = this.channels["brightness_temperature"]
    log, settings = study.records[channel.logger], study.parameters.campaign.settings
    good = np.flatnonzero(mask == 0)
    time_s = log.time_ns[window][good] / NS
    found = find_dwells(
        time_s, log.channels[channel.column][window][good], settle_s=0.0,
        min_s=settings.temperature.dwell_min_s,
        max_rate_k_s=settings.temperature.dwell_max_rate_k_s)
    settle_s = settings.passes.settle_time_constants * (channel.time_constant_s or 0.0)
    settled = np.zeros(window.size, dtype=bool)
    spans = []
    for part in found:
        rows = good[part][time_s[part] >= time_s[part.start] + settle_s]
        if rows.size >= FEWEST:
            settled[rows] = True
            spans.append((int(rows[0]), int(rows[-1]) + 1))
    mask = mask | np.where(settled | (mask != 0), np.uint32(0), BIT["between placements"])
    return mask.astype(np.uint32), spans


def _faulty(mask: Mask) -> tuple[BoolArray, BoolArray]:
    """Return which records lie on the pass's way, and which of these are at fault.

    Edges and turns are no part of it: however many a pass has, they neither are faults nor hide
    any, so that many short lanes refuse no pass and faults count among the records on the lanes.
    """
    inside = (mask & OFF_PATCH) == 0
    return inside, inside & ((mask & ~NOT_A_FAULT) != 0)


def _refusal(study: Study, this: Pass, window: IntArray, mask: Mask) -> str:
    """Return why the pass cannot be evaluated, or an empty text."""
    settings = study.parameters.campaign.settings
    if this.refusal:
        return this.refusal
    if window.size == 0:
        return "no record of its logger falls into the pass"
    left_s = max((this.to_ns - this.from_ns) / NS, 0.0)
    if left_s < settings.passes.min_duration_s:
        return (f"{int(left_s)} s of the pass lie between its uncertain edges, less than "
                f"{settings.passes.min_duration_s:g} s")
    inside, faults = _faulty(mask)
    share = float(faults.sum() / max(inside.sum(), 1))
    swapped = inside & ((mask & BIT["more light up than down"]) != 0)
    if swapped.sum() > settings.quality.swapped_share * inside.sum():
        return ("the head said to look down reads more than the one said to look up in "
                f"{percent(swapped.sum() / inside.sum())} of the records: check which column is "
                "shortwave_up and which shortwave_down")
    if share <= settings.quality.excluded_refuse and (mask == 0).sum() >= FEWEST:
        return ""
    dark = inside & ((mask & BIT["sun too low"]) != 0)
    if 2 * dark.sum() > inside.sum():
        return _dark_refusal(study, this, window[dark])
    if share > settings.quality.excluded_refuse:
        reasons = Counter(REASONS[i].name for i in primary(mask & ~NOT_A_FAULT)[faults])
        worst = min(reasons, key=lambda name: (-reasons[name], name))
        return f"{percent(share)} of the records are excluded, most as: {worst}"
    if this.kind == "contact" and (mask & BIT["between placements"]).any():
        return "no settled placement of the head was found"
    if not inside.any() and (mask & BIT["foreign ground in view"]).any():
        return ("nowhere on its lanes does the patch fill enough of the view: hold the head lower, "
                "or survey a larger patch")
    if not inside.any() and (mask & BIT["turn"]).any():
        return (f"its {this.lanes} lanes of {(this.stop_ns - this.start_ns) / NS / this.lanes:.0f} "
                "s are shorter than their turns: walk longer or fewer lanes, or check lanes")
    return f"fewer than {FEWEST} records are left of the pass"


def _dark_refusal(study: Study, this: Pass, rows: IntArray) -> str:
    channel = next((c for q, c in this.channels.items() if q.endswith("_down")), None)
    main = next(iter(this.channels.values())).logger
    zenith = float(np.mean(study.sun[main].zenith_deg[rows]))
    if zenith <= 90:
        return f"the sun is only {90 - zenith:.0f} degrees high, lower than the method's limit"
    if channel is None or channel.quantity != "shortwave_down":
        return "the sun is below the horizon"
    log = study.records[channel.logger]
    at = partners(study.records[main], rows, log)
    read = log.channels[channel.column][at[at >= 0]]
    read = read[np.isfinite(read)]
    if read.size and read.mean() > study.parameters.campaign.settings.albedo.min_down_w_m2:
        return (f"computed sun below the horizon while the pair reads {read.mean():.0f} W m-2: "
                "check longitude, zone or clock")
    return "the sun is below the horizon: an albedo read in the dark is the ratio of two offsets"


def _note(study: Study, this: Pass, logger: str, mask: Mask, refusal: str) -> None:
    """Note a pass that is refused, or of which much is excluded or lies in turns."""
    inside, faults = _faulty(mask)
    share = float(faults.sum() / max(inside.sum(), 1))
    for name, check, where in (
            ("turn", "turns", "lies in its turns and is left out: walk longer or fewer lanes"),
            ("foreign ground in view", "foreign ground in view", "sees too much foreign ground "
             "and is left out: hold the head lower or keep further inside the patch")):
        off = int(np.count_nonzero((mask & OFF_PATCH) == BIT[name]))
        if off > study.quality.excluded_flag * (off + inside.sum()) and not refusal:
            study.note(check, "flag", f"{percent(off / (off + inside.sum()))} of the walk {where}",
                       CHECKS[name].source, logger=logger, surface=this.surface, pass_=this.name,
                       records=off)
    if refusal or share > study.quality.excluded_flag:
        study.note("records of a pass", "refuse" if refusal else "flag",
                   refusal or f"{percent(share)} of the pass's records are excluded",
                   "engineering default", logger=logger, surface=this.surface, pass_=this.name,
                   records=int(faults.sum()))


def _flags(study: Study, this: Pass, kept: dict[str, IntArray]) -> tuple[str, ...]:
    """Note what was flagged among the records `kept` of each logger; return the flags' names."""
    names = []
    for channel in this.channels.values():
        rows = kept[channel.logger]
        for name, hit in study.flagged.get((channel.logger, channel.column), {}).items():
            count = int(np.count_nonzero(hit[rows]))
            if count:
                names.append(name)
                study.note(name, CHECKS[name].action, f"{counted(count, 'record')} of {rows.size}: "
                           f"{CHECKS[name].sentence}", CHECKS[name].source, logger=channel.logger,
                           column=channel.column, surface=this.surface, pass_=this.name,
                           records=count)
    return tuple(dict.fromkeys(names))


def _missing(study: Study, this: Pass) -> None:
    """Note the loggers of a pass that hold fewer records than their interval promises."""
    limit = study.quality.missing_flag
    for name in this.loggers:
        log = study.records[name]
        if not log.interval_s > 0:
            continue
        window = slice(*within(log.time_ns, this.start_ns, this.stop_ns))
        got = int(np.count_nonzero(~log.marks["repeated record"][window]))
        due = int((this.stop_ns - this.start_ns) / NS / log.interval_s)
        if due and 1 - got / due > limit:
            study.note("missing records", "flag", f"{percent(1 - got / due)} of the records "
                       f"expected in the pass, one every {log.interval_s:g} s, are missing",
                       "engineering default", logger=name, surface=this.surface,
                       pass_=this.name, records=due - got)
