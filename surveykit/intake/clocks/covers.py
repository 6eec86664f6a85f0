"""Events: the sheet's cover rows found in a logger's records, and the line through them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import hypot, log

import numpy as np

from surveykit.core import FloatArray, IntArray
from surveykit.intake.clocks.signals import COVERED, LIGHT, first_of, readings
from surveykit.intake.params import Channel, Settings
from surveykit.intake.params.settings import ClockSettings
from surveykit.intake.records import NS, Records
from surveykit.intake.sheet_words import Entry
from surveykit.statistics.alignment import Cover, Line, find_covers, fit_line, robust_line

Candidate = tuple[int, float, float, Cover]  # number of the row, offset and u [s], what was found
NEAR_TIE = 0.5  # of the clearness of the best offset: another as clear makes it ambiguous


@dataclass(frozen=True)
class Seen:
    """Covers as one logger saw them: by number of the cover, its edges [s since origin_ns].

    `why_not` says why there are none to trust.
    """

    covers: dict[int, Cover]
    why_not: str = ""


@dataclass(frozen=True)
class Fit:
    """A line through edges: times, offsets, residuals and u [s], and why it is refused, if so."""

    line: Line
    time_s: FloatArray
    offset_s: FloatArray
    residual_s: FloatArray
    u_s: FloatArray
    refusal: str


def see(records: Records, channels: Sequence[Channel], part: IntArray, rows: Sequence[Entry],
        settings: Settings, *, offset_s: float, search_s: float, origin_ns: int) -> Seen:
    """Return the cover rows found in the records `part` within `search_s` of `offset_s`.

    All must agree on one offset, within the uncertainty of the written times and the largest
    credible drift. Edges are freed of the head's delay, ln 2 of its time constant.
    """
    channel = first_of(channels, COVERED)
    if channel is None:
        return Seen({}, "it has no channel that a cover changes")
    time_s, values = readings(records, channel, settings, origin_ns, part)
    limits = settings.clocks
    candidates: list[Candidate] = []
    for number, row in enumerate(rows):
        start, stop = ((edge - origin_ns) / NS - offset_s for edge in (row.start_ns, row.stop_ns))
        width = stop - start
        near = slice(*np.searchsorted(time_s, [start - search_s - 3 * width,
                                               stop + search_s + 3 * width]))
        for cover in find_covers(time_s[near], values[near], width,
                                 dark=channel.quantity in LIGHT,
                                 min_contrast=limits.cover_contrast):
            away = ((start - cover.start_s) + (stop - cover.stop_s)) / 2
            written = written_u_s(row, limits, settings.passes.sheet_u_s)
            if abs(away) <= search_s and abs(cover.stop_s - cover.start_s - width) <= max(
                    3 * hypot(written, written), width / 3):
                candidates.append((number, away, written, cover))
    chosen, rival = _agreed(candidates, limits, rows)
    if rival is not None and len(chosen) > 1:
        return Seen({}, f"the covers fit two offsets, {chosen[0][1] + offset_s:+.1f} and "
                        f"{rival + offset_s:+.1f} s; write offset_s nearer, or a shorter search_s")
    off = _left_out(candidates, chosen, rows, time_s, origin_ns, offset_s)
    if off:
        return Seen({}, off)
    delay_s = (channel.time_constant_s or 0.0) * log(2.0)
    return Seen({number: cover._replace(start_s=cover.start_s - delay_s,
                                        stop_s=cover.stop_s - delay_s)
                 for number, _, _, cover in chosen})


def _left_out(candidates: list[Candidate], chosen: list[Candidate], rows: Sequence[Entry],
              time_s: FloatArray, origin_ns: int, offset_s: float) -> str:
    """Return a sentence on a cover that shows, but away from where the others put it."""
    if len(chosen) < 2:
        return ""
    kept = {one[0] for one in chosen}
    away = float(np.median([one[1] for one in chosen]))
    clear = NEAR_TIE * min(one[3].contrast for one in chosen)
    for number, found, _, cover in candidates:
        due_s = (rows[number].start_ns - origin_ns) / NS - offset_s - away
        if number not in kept and cover.contrast >= clear and time_s[0] <= due_s <= time_s[-1]:
            return (f"a cover lies {abs(found - away):.1f} s off the line through the others: a "
                    "cover was missed or mistaken, or the clock was set anew")
    return ""


def _agreed(candidates: list[Candidate], limits: ClockSettings,
            rows: Sequence[Entry]) -> tuple[list[Candidate], float | None]:
    """Return the largest set of covers that agree on an offset, and a rival offset if as good."""
    span_s = (max((r.stop_ns for r in rows), default=0)
              - min((r.start_ns for r in rows), default=0)) / NS
    sets = []
    for _, centre, u_s, _ in candidates:
        reach = limits.max_residual_u * 1.5 * u_s + limits.max_drift_ppm * 1e-6 * span_s
        nearest: dict[int, Candidate] = {}
        for one in candidates:
            if abs(one[1] - centre) <= reach and (
                    one[0] not in nearest or abs(one[1] - centre) < abs(
                        nearest[one[0]][1] - centre)):
                nearest[one[0]] = one
        found = list(nearest.values())
        sets.append((len(found), sum(one[3].contrast for one in found), centre, reach, found))
    if not sets:
        return [], None
    best = max(sets, key=lambda some: some[:2])
    rivals = [some[2] for some in sets if some[0] == best[0] and some[1] >= NEAR_TIE * best[1]
              and abs(some[2] - best[2]) > 2 * best[3]]
    return best[4], rivals[0] if rivals else None


def written_u_s(row: Entry, limits: ClockSettings, sheet_u_s: float) -> float:
    """Return u [s] of a written cover time: called and read to the second, or in minutes only."""
    return limits.cover_u_s if row.edge_u_s <= sheet_u_s else row.edge_u_s


def fit(time_s: FloatArray, offset_s: FloatArray, u_s: FloatArray, limits: ClockSettings, *,
        two_loggers: bool) -> Fit:
    """Return the line through edges and judge it: residuals, drift, offset, robust check.

    `two_loggers` says that both times of an edge are logged, so that the limit in seconds holds
    as well; a written time has its own uncertainty alone to keep to.
    """
    line = fit_line(time_s, offset_s, u_s, max_slope=limits.max_drift_ppm * 1e-6)
    residual = offset_s - line.at(time_s)
    allowed = limits.max_residual_u * u_s
    if two_loggers:
        allowed = np.minimum(allowed, limits.max_residual_s)
    worst = int(np.argmax(np.abs(residual) - allowed))
    drift = line.slope * 1e6
    slope = line.slope if line.slope == 0.0 else None
    apart = np.abs(robust_line(time_s, offset_s, slope) - line.at(time_s))
    refusal = ""
    if abs(residual[worst]) > allowed[worst]:
        refusal = (f"a cover lies {abs(residual[worst]):.1f} s off the line through all, more than "
                   f"{allowed[worst]:.1f} s: a cover was missed, or the clock was set anew")
    elif abs(drift) > limits.max_drift_ppm:
        refusal = (f"its drift of {drift:+.0f} ppm is beyond {limits.max_drift_ppm:g} ppm "
                   "(settings.clocks.max_drift_ppm): a cover was mistaken, or the clock set anew")
    elif abs(line.offset_s) > limits.max_offset_s:
        refusal = too_far(line.offset_s, limits)
    elif (apart > 3 * line.u(time_s) + 1e-6).any() and apart.max() > u_s.max():
        refusal = (f"the line of median slope lies {apart.max():.1f} s from that of least squares: "
                   "the covers do not lie on one line")
    return Fit(line, time_s, offset_s, residual, u_s, refusal)


def too_far(offset_s: float, limits: ClockSettings) -> str:
    """Return the sentence that refuses an offset beyond what is credible."""
    return (f"its offset of {offset_s:+.0f} s is beyond {limits.max_offset_s:g} s "
            "(settings.clocks.max_offset_s): correct the zone, or the date its files carry")
