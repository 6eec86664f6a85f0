"""All clocks of a campaign: declared ones taken as stated, others found, all of them checked."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from surveykit.intake.clocks.checking import against_each_other, against_the_sun
from surveykit.intake.clocks.clock import REFUSED, Clock, Piece
from surveykit.intake.clocks.covers import too_far
from surveykit.intake.clocks.finding import Timed, find_clock
from surveykit.intake.clocks.stretches import judged_apart, stretches
from surveykit.intake.fieldsheet import Sheet
from surveykit.intake.params import LoggerUse, Parameters, Settings
from surveykit.intake.records import NO_TIME_NS, NS, Records, clock_text
from surveykit.statistics.alignment import Line

MOST_RESETS = 20
DISORDER = "its time steps back {} times: the lines of its files are out of order"
SET_BY = "it is set by that of {}, which is refused itself"


def set_clock(records: Records, use: LoggerUse, settings: Settings) -> tuple[Records, Clock]:
    """Return the records in the campaign's time by a declared clock, and what was done to it.

    campaign time = logger time + offset + drift x (logger time - drift_from). A positive offset
    means that the logger's clock was slow.

    Parameters
    ----------
    records : Records
        Times as the logger wrote them, in UTC.
    use : LoggerUse
        The logger's section of the parameter file; without a clock the offset is 0.
    settings : Settings
        `clocks.unchecked_u_s` is the uncertainty [s] of a clock nobody checked.
    """
    if use.clock is None:
        u_s = settings.clocks.unchecked_u_s
        return records, Clock(records.logger, "not checked", 0.0, u_s, 0.0, "qualified",
                              f"nobody compared this clock: offset 0 s, u {u_s:g} s")
    offset, drift_ppm = use.clock.offset, use.clock.drift_ppm
    shift_ns = np.full(len(records), round(offset.value * NS), dtype=np.int64)
    note = "stated in the parameter file"
    if drift_ppm and use.clock.drift_from_ns is not None:
        since = (records.time_ns - use.clock.drift_from_ns).astype(np.float64)
        shift_ns += np.rint(since * drift_ppm * 1e-6).astype(np.int64)
        note += f", drift counted from {use.clock.drift_from}"
    time_ns = np.where(records.time_ns == NO_TIME_NS, NO_TIME_NS, records.time_ns + shift_ns)
    return replace(records, time_ns=time_ns), Clock(
        records.logger, "declared", offset.value, offset.u, drift_ppm, "ok", note)


def set_clocks(logs: Mapping[str, Records], parameters: Parameters, sheet: Sheet | None, *,
               placed: bool = True) -> tuple[dict[str, Records], tuple[Clock, ...]]:
    """Return all records in the campaign's time, and the clocks in the order of the loggers.

    Parameters
    ----------
    logs : mapping
        Records by logger, times as the loggers wrote them.
    parameters : Parameters
        The campaign and its kit.
    sheet : Sheet or None
        The field sheet; without it, clocks that need it are left as they are.
    placed : bool
        Whether site and date are known: without, the sun is not asked.
    """
    uses, rows = parameters.campaign.loggers, []
    if sheet is not None:
        rows = [entry for entry in sheet.entries if entry.entry == "cover"]
    done: dict[str, Timed] = {}

    def settle(name: str, above: tuple[str, ...] = ()) -> Timed:
        if name not in done:
            stated = uses[name].clock
            partner = stated.align_with if stated is not None else None
            if stated is None or not stated.found or sheet is None:
                done[name] = _declared(logs[name], uses[name], parameters.settings)
            elif (backs := sum(stretches(logs[name], float("inf")).back)) > MOST_RESETS:
                done[name] = _refuse(logs[name], DISORDER.format(backs))
            elif partner is None:
                done[name] = find_clock(logs[name], stated, parameters, rows, None)
            elif partner not in logs:
                done[name] = _refuse(logs[name], f"its reference {partner} could not be read")
            elif partner in (name, *above):  # of parameters that are refused for it
                return _refuse(logs[name], f"it is set by that of {partner}, which it sets")
            elif settle(partner, (name, *above)).clock.refusal:
                done[name] = _refuse(logs[name], SET_BY.format(partner))
            else:
                done[name] = find_clock(logs[name], stated, parameters, rows, done[partner])
        return done[name]

    ordered = {name: settle(name) for name in logs if name in uses}
    if sheet is not None:
        wrong = against_each_other(ordered, parameters)
        if placed:
            wrong = against_the_sun(ordered, parameters) | wrong
        for name, one in ordered.items():
            on = one.clock.reference
            while on is not None and name not in wrong:
                if on.logger in wrong:
                    wrong[name] = SET_BY.format(on.logger)
                on = on.reference
            if name in wrong:
                ordered[name] = _taken_out(one, wrong[name])
    return ({name: one.records for name, one in ordered.items()},
            tuple(one.clock for one in ordered.values()))


def _declared(log: Records, use: LoggerUse, settings: Settings) -> Timed:
    """Take a clock as stated; what follows a reset of it is refused."""
    records, clock = set_clock(log, use, settings)
    limits = settings.clocks
    if abs(clock.offset_s) > limits.max_offset_s:
        return _taken_out(Timed(records, clock), too_far(clock.offset_s, limits))
    if abs(clock.drift_ppm) > limits.max_drift_ppm:
        return _taken_out(Timed(records, clock), (
            f"its drift of {clock.drift_ppm:+g} ppm is beyond {limits.max_drift_ppm:g} ppm "
            "(settings.clocks.max_drift_ppm)"))
    parts = stretches(log, float("inf"))
    if len(parts.back) == 1:
        return Timed(records, clock)
    if len(parts.back) > MOST_RESETS:
        return _taken_out(Timed(records, clock), DISORDER.format(len(parts.back) - 1))
    first = int(np.argmax(parts.number == 1))
    why = (f"the clock of {log.logger} steps back to {clock_text(log.time_ns[first])} UTC of its "
           f"own ({log.files[log.file[first]].path}, line {log.line[first]}); its offset holds for "
           "what came before, what follows is left out: where all heads were covered twice after "
           "a reset, write cover_events")
    pieces = []
    for part, refusal in ((parts.number == 0, ""), (parts.number > 0, why)):
        time = records.time_ns[part]
        pieces.append(Piece(int(time[0]), int(time[-1]), int(time[0]),
                            Line(0.0, 0.0, 0.0, clock.u_s**2, 0.0), (int(time[0]), int(time[-1])),
                            refusal))
    records = judged_apart(records, parts)
    return Timed(replace(records, marks=records.marks | {REFUSED: parts.number > 0}), replace(
        clock, status="qualified", pieces=tuple(pieces), note=f"{clock.note}; {why}"))


def _refuse(log: Records, why: str) -> Timed:
    clock = Clock(log.logger, "refused", np.nan, np.nan, np.nan, "ok", "")
    return _taken_out(Timed(log, clock), why)


def _taken_out(one: Timed, why: str) -> Timed:
    """Return a logger whose clock is refused: every record marked, the reason kept."""
    why = f"the clock of {one.clock.logger} is refused: {why}"
    every = np.ones(len(one.records), dtype=np.bool_)
    return Timed(replace(one.records, marks=one.records.marks | {REFUSED: every}),
                 replace(one.clock, status="refused", note=why, refusal=why))
