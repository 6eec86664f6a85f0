"""What the readings say of a pass's edges and placements; nothing is moved, only flagged."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from math import hypot

import numpy as np

from surveykit.core import IntArray
from surveykit.intake.clocks import Clock
from surveykit.intake.clocks.signals import readings
from surveykit.intake.params import Channel, Parameters
from surveykit.intake.passes import Pass
from surveykit.intake.placements import find_dwells
from surveykit.intake.records import NS, Records, clock_text
from surveykit.intake.sheet_words import Entry
from surveykit.statistics.alignment import change_point

LOOK_S = 60.0  # outside an edge and inside, at most
LEAST_SIDE_S = 3.0
GROUND = ("brightness_temperature", "shortwave_up", "nir_up", "longwave_up")


def look(passes: Sequence[Pass], records: Mapping[str, Records], entries: Sequence[Entry],
         parameters: Parameters, clocks: Mapping[str, Clock], sheet_path: str) -> tuple[Pass, ...]:
    """Return the passes with what their records say of them.

    A pass in which one of its loggers holds no record is refused with the gap. "edge disagrees"
    flags an edge of the readings (the split into two levels that fits best) further from the
    written one than `passes.edge_u` standard uncertainties; the number of placements found in a
    contact pass is held against the sheet's reading.
    """
    out = []
    written_u_s = {entry.row: entry.edge_u_s for entry in entries}
    covers = np.array([(entry.start_ns - reach, entry.stop_ns + reach) for entry in entries
                       for reach in (round(2 * entry.edge_u_s * NS),)
                       if entry.entry in ("cover", "dark")], dtype=np.int64).reshape(-1, 2)
    served: dict[str, list[Pass]] = {}
    for this in passes:
        for name in this.loggers:
            served.setdefault(name, []).append(this)
    for this in passes:
        this = replace(this, refusal=this.refusal or _gap(this, records, sheet_path))
        channel = next((this.channels[q] for q in GROUND if q in this.channels), None)
        notes: tuple[str, ...] = ()
        if channel is None or this.refusal:
            pass
        elif this.kind == "contact":
            notes = _placements(this, channel, records[channel.logger], parameters)
        else:
            notes = _edges(this, channel, served[channel.logger], records[channel.logger], covers,
                           written_u_s[this.row], parameters, clocks[channel.logger])
        out.append(replace(this, notes=this.notes + notes))
    return tuple(out)


def _gap(this: Pass, records: Mapping[str, Records], sheet_path: str) -> str:
    for name in this.loggers:
        time_ns = records[name].time_ns[:records[name].n_timed]
        first, last = map(int, np.searchsorted(time_ns, [this.start_ns, this.stop_ns]))
        if first == last:
            near = " and ".join(f"{words} at {clock_text(time_ns[k])} UTC" for words, k in (
                ("the last before it", first - 1), ("the next", first)) if 0 <= k < time_ns.size)
            return (f"{sheet_path} row {this.row}: {name} holds no record during the pass"
                    + (f"; {near}" if near else ""))
    return ""


def _edges(this: Pass, channel: Channel, others: Sequence[Pass], log: Records, covers: IntArray,
           written_u_s: float, parameters: Parameters, clock: Clock) -> tuple[str, ...]:
    settings = parameters.settings
    half_ns = (this.stop_ns - this.start_ns) // 2
    look_ns, watch_u_s = round(LOOK_S * NS), parameters.campaign.watch.offset.u
    before = max((p.stop_ns for p in others if p.stop_ns <= this.start_ns), default=0)
    after = min((p.start_ns for p in others if p.start_ns >= this.stop_ns), default=2**62)
    notes = []
    for word, edge, low, high in (
            ("start", this.start_ns, max(before, this.start_ns - look_ns),
             this.start_ns + min(half_ns, look_ns)),
            ("stop", this.stop_ns, this.stop_ns - min(half_ns, look_ns),
             min(after, this.stop_ns + look_ns))):
        part = np.arange(*np.searchsorted(log.time_ns[:log.n_timed], [low, high]))
        time_ns = log.time_ns[part][:, None]
        part = part[~((time_ns >= covers[:, 0]) & (time_ns <= covers[:, 1])).any(axis=1)]
        time_s, values = readings(log, channel, settings, edge, part)
        side = max(3, int(np.ceil(LEAST_SIDE_S / log.interval_s))) if log.interval_s > 0 else 3
        found = change_point(values, min_side=side, min_contrast=settings.passes.edge_contrast)
        if found is None:
            continue
        away_s = float(time_s[found - 1] + time_s[found]) / 2
        u_s = hypot(written_u_s, clock.u_against_watch(edge, watch_u_s))
        if abs(away_s) > settings.passes.edge_u * u_s:
            notes.append(f"edge disagrees ({word} {away_s:+.0f} s)")
    return tuple(notes)


def _placements(this: Pass, channel: Channel, log: Records,
                parameters: Parameters) -> tuple[str, ...]:
    """Hold the placements found against the sheet's; an uncertain edge may hide or add some.

    Certain are those of full length between the trimmed edges; possible is half of one as far as
    the written edges are uncertain.
    """
    if not this.reading >= 1:
        return ()
    settings, trim_ns = parameters.settings, round(this.trim_s * NS)

    def count(start_ns: int, stop_ns: int, share: float) -> int:
        part = np.arange(*np.searchsorted(log.time_ns[:log.n_timed], [start_ns, stop_ns]))
        time_s, values = readings(log, channel, settings, this.start_ns, part)
        return len(find_dwells(time_s, values, settle_s=0.0,
                               min_s=share * settings.temperature.dwell_min_s,
                               max_rate_k_s=settings.temperature.dwell_max_rate_k_s))

    certain = count(this.from_ns, this.to_ns, 1.0)
    possible = count(this.start_ns - trim_ns, this.stop_ns + trim_ns, 0.5)
    if certain <= round(this.reading) <= possible:
        return ()
    found = count(this.start_ns, this.stop_ns, 1.0)
    return (f"{found} placements found, {this.reading:.0f} on the sheet",)
