"""A clock found from the records: by covers against the sheet or a logger, else by correlation."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from math import hypot

import numpy as np

from surveykit.core import FloatArray, IntArray
from surveykit.intake.clocks.clock import REFUSED, Clock, Event, Piece
from surveykit.intake.clocks.covers import Fit, Seen, fit, see, too_far, written_u_s
from surveykit.intake.clocks.signals import in_common, readings
from surveykit.intake.clocks.stretches import judged_apart, stretches
from surveykit.intake.params import Parameters
from surveykit.intake.params.timekeeping import Clock as Stated
from surveykit.intake.records import NS, Records, clock_text, in_order
from surveykit.intake.sheet_words import Entry
from surveykit.statistics.alignment import Line, edge_u_s
from surveykit.statistics.correlation import Lag, correlate

LEAST_SEARCH_S = 30.0  # of a cover in a logger whose clock is set


@dataclass(frozen=True)
class Timed:
    """A logger whose clock is set: its records in the campaign's time, and the clock."""

    records: Records
    clock: Clock


@dataclass(frozen=True)
class _Found:
    """What one stretch of records gave: its line, the evidence, or why there is none."""

    line: Line
    known_s: tuple[float, float]
    refusal: str = ""
    fit: Fit | None = None
    numbers: tuple[int, ...] = ()
    lag: Lag | None = None


# of a clock that was refused: no certainty, wherever the search began
NOTHING = Line(0.0, 0.0, 0.0, float("inf"), 0.0)


def find_clock(log: Records, stated: Stated, parameters: Parameters, rows: Sequence[Entry],
               reference: Timed | None) -> Timed:
    """Return a logger with its clock found, stretch by stretch between resets.

    Parameters
    ----------
    log : Records
        Times as the logger wrote them.
    stated : surveykit.intake.params.Clock
        The clock's section: where to start and how far to search.
    parameters : Parameters
        The campaign and its kit.
    rows : sequence of Entry
        The sheet's cover rows.
    reference : Timed or None
        The logger to align with; None: the sheet's written times.
    """
    origin_ns = int(log.time_ns[0]) if log.n_timed else 0
    parts = stretches(log, parameters.settings.clocks.jump_s)
    log = judged_apart(log, parts)
    ways = _Search(log, stated, parameters, rows, reference, origin_ns)
    time_ns = log.time_ns.copy()
    refused = np.zeros(len(log), dtype=np.bool_)
    pieces, found = [], []
    for rows_in in _joined(ways, parts.number, parts.back):
        one = ways.find(rows_in)
        line = NOTHING._replace(offset_s=stated.offset_s.value) if one.refusal else one.line
        moved = log.time_ns[rows_in] + np.rint(
            line.at((log.time_ns[rows_in] - origin_ns) / NS) * NS).astype(np.int64)
        time_ns[rows_in] = moved
        refused[rows_in] = bool(one.refusal)
        known = [origin_ns + round((t + float(line.at(t))) * NS) for t in one.known_s]
        pieces.append(Piece(int(moved[0]), int(moved[-1]), origin_ns, line,
                            (known[0], known[1]), one.refusal))
        found.append(one)
    marks = log.marks | ({REFUSED: refused} if refused.any() else {})
    return Timed(in_order(replace(log, time_ns=time_ns, marks=marks), parts.number),
                 _clock(ways, tuple(pieces), found))


@dataclass(frozen=True)
class _Search:
    """One logger's search for its clock."""

    log: Records
    stated: Stated
    parameters: Parameters
    rows: Sequence[Entry]
    reference: Timed | None
    origin_ns: int

    def covers(self, part: IntArray) -> Seen:
        return see(self.log, self.parameters.channels(self.log.logger), part, self.rows,
                   self.parameters.settings, offset_s=self.stated.offset_s.value,
                   search_s=self.stated.search_s, origin_ns=self.origin_ns)

    def find(self, part: IntArray) -> _Found:
        """Return the line of one stretch, or why it has none."""
        limits = self.parameters.settings.clocks
        mine = self.covers(part)
        edges = self._edges(mine)
        seen = len(edges[0]) // 2
        if seen >= limits.min_events:
            fitted = fit(edges[1], edges[2], edges[3], limits,
                         two_loggers=self.reference is not None)
            return _Found(fitted.line, (float(edges[1].min()), float(edges[1].max())),
                          fitted.refusal, fitted, tuple(edges[0]))
        why = mine.why_not or self._few(mine, seen)
        if self.reference is None:
            return _Found(NOTHING, (0.0, 0.0), why)
        return self._correlated(part, why)

    def _few(self, mine: Seen, seen: int) -> str:
        need = self.parameters.settings.clocks.min_events
        if not self.rows:
            return f"the field sheet has no cover row, and {need} are needed"
        if self.reference is not None and len(mine.covers) >= need > seen:
            return (f"the covers show in {self.log.logger} only, not in "
                    f"{self.reference.clock.logger}")
        return f"{seen} of {len(self.rows)} covers show in its records, and {need} are needed"

    def _edges(self, mine: Seen) -> tuple[list[int], FloatArray, FloatArray, FloatArray]:
        """Return numbers, times [s], offsets [s] and u [s] of the edges, two a cover."""
        theirs = self._references()
        numbers, out = [], []
        for number in sorted(mine.covers.keys() & theirs.keys()):
            cover = mine.covers[number]
            start, stop, start_u, stop_u, written = theirs[number]
            for at, step, other, other_step in (
                    (cover.start_s, cover.start_step_s, start, start_u),
                    (cover.stop_s, cover.stop_step_s, stop, stop_u)):
                numbers.append(number)
                out.append((at, other - at, hypot(edge_u_s(step, other_step), written)))
        table = np.array(out, dtype=np.float64).reshape(-1, 3)
        return numbers, table[:, 0], table[:, 1], table[:, 2]

    def _references(self) -> dict[int, tuple[float, float, float, float, float]]:
        """Return by cover: its edges [s since origin_ns], steps of the logger, u if written."""
        settings = self.parameters.settings
        if self.reference is None:
            return {n: ((r.start_ns - self.origin_ns) / NS, (r.stop_ns - self.origin_ns) / NS, 0.0,
                        0.0, written_u_s(r, settings.clocks, settings.passes.sheet_u_s))
                    for n, r in enumerate(self.rows)}
        other = self.reference
        reach = max((3 * hypot(other.clock.u_against_watch(
            r.start_ns, self.parameters.campaign.watch.offset.u), r.edge_u_s)
            for r in self.rows), default=0.0)
        theirs = see(other.records, self.parameters.channels(other.clock.logger),
                     np.arange(other.records.n_timed), self.rows, settings, offset_s=0.0,
                     search_s=max(reach, LEAST_SEARCH_S), origin_ns=self.origin_ns)
        return {n: (c.start_s, c.stop_s, c.start_step_s, c.stop_step_s, 0.0)
                for n, c in theirs.covers.items()}

    def _correlated(self, part: IntArray, why: str) -> _Found:
        assert self.reference is not None
        limits = self.parameters.settings.clocks
        other, name = self.reference.records, self.reference.clock.logger
        pair = in_common(self.parameters.channels(self.log.logger), self.parameters.channels(name))
        if pair is None:
            return _Found(NOTHING, (0.0, 0.0), f"{why}, and it shares no signal with {name}")
        time_s, values = readings(self.log, pair[0], self.parameters.settings, self.origin_ns, part)
        other_s, others = readings(other, pair[1], self.parameters.settings, self.origin_ns)
        step_s = max(self.log.interval_s, other.interval_s)
        lag = correlate(other_s, others, time_s, values, search_s=self.stated.search_s,
                        step_s=step_s, centre_s=self.stated.offset_s.value)
        wrong = lag.refusal(min_peak=limits.min_peak, max_second=limits.max_second,
                            max_halves_s=limits.max_halves_s)
        if wrong:
            return _Found(NOTHING, (0.0, 0.0), f"{why}; {wrong}", lag=lag)
        first, last = float(time_s[0]), float(time_s[-1])
        return _Found(lag_line(lag, first, last, limits.max_drift_ppm * 1e-6), (first, last),
                      too_far(lag.lag_s, limits) if abs(lag.lag_s) > limits.max_offset_s else "",
                      lag=lag)


def lag_line(lag: Lag, first_s: float, last_s: float, max_slope: float) -> Line:
    """Return the line of an accepted lag: no drift, its u from what the halves leave open."""
    apart = abs(lag.halves_s[1] - lag.halves_s[0])
    u_s = hypot(edge_u_s(lag.step_s, lag.step_s), apart / 2)
    half_s = max((last_s - first_s) / 2, 1.0)
    u_slope = min(max(apart, u_s * 2**0.5) / half_s, max_slope / 3**0.5)
    return Line((first_s + last_s) / 2, lag.lag_s, 0.0, u_s**2, u_slope**2)


def _joined(ways: _Search, number: IntArray, back: tuple[bool, ...]) -> list[IntArray]:
    """Return the records of each stretch; gaps without a reset join again what one line fits.

    A leap over a gap may be a reset or a lunch: where each side saw a cover and one line goes
    through all of them, it was no reset.
    """
    parts = [np.flatnonzero(number == k) for k in range(len(back))]
    joined = [parts[0]]
    for part, was_back in zip(parts[1:], back[1:], strict=True):
        both = np.sort(np.concatenate([joined[-1], part]))
        if not was_back and ways.covers(part).covers and ways.covers(joined[-1]).covers and \
                not ways.find(both).refusal:
            joined[-1] = both
        else:
            joined.append(part)
    return [part for part in joined if part.size]


def _clock(ways: _Search, pieces: tuple[Piece, ...], found: list[_Found]) -> Clock:
    name = ways.log.logger
    other = ways.reference.clock if ways.reference else None
    good = [(p, f) for p, f in zip(pieces, found, strict=True) if not p.refusal]
    events = tuple(
        Event(number, ("covered", "uncovered")[place % 2],
              ways.origin_ns + round(float(f.fit.time_s[place]) * NS),
              ways.origin_ns + round(float(f.fit.time_s[place] + f.fit.offset_s[place]) * NS),
              float(f.fit.residual_s[place]), float(f.fit.u_s[place]))
        for f in found if f.fit is not None for place, number in enumerate(f.numbers))
    lag = next((f.lag for f in found if f.lag is not None), None)
    by = f"aligned with {other.logger}" if other else "cover events"
    clock = Clock(name, by, float("nan"), float("nan"), float("nan"), "refused", "", pieces,
                  other.to_watch if other else True, other, events, lag)
    if not good:
        why = found[0].refusal if found else "it holds no record with a readable time"
        why = f"the clock of {name} could not be set: {why}"
        return replace(clock, note=why, refusal=why)
    piece, first = good[0]
    if other:
        by += ", by covers" if first.fit else ", by correlation"
    ends = [max(clock.u_at(t) for t in p.known_ns) for p, _ in good]
    u_s = max(ends)
    if clock.to_watch:
        u_s = hypot(u_s, ways.parameters.campaign.watch.offset.u)
    left = [p for p in pieces if p.refusal]
    status = "qualified" if left or (other is not None and other.status != "ok") else "ok"
    return replace(clock, method=by, offset_s=piece.line.offset_s, u_s=u_s,
                   drift_ppm=1e6 * piece.line.slope, status=status, note=_note(good, left, other))


def _note(good: list[tuple[Piece, _Found]], left: list[Piece], other: Clock | None) -> str:
    notes = []
    for piece, one in good:
        at = clock_text(piece.at_ns)[11:]
        if one.fit is not None:
            notes.append(
                f"{len(one.fit.time_s) // 2} covers, largest distance of an edge from the line "
                f"{np.abs(one.fit.residual_s).max():.2f} s; offset at {at} UTC"
                + ("" if one.line.slope else "; they lie too close together to tell a drift"))
        elif one.lag is not None:
            notes.append(f"peak of the correlation {one.lag.peak:.2f}, second "
                         f"{one.lag.second:.2f}; offset at {at} UTC, no drift taken")
    if left:
        notes.append(f"{len(left)} of {len(good) + len(left)} stretches between resets refused: "
                     f"{left[0].refusal}")
    if other is not None and other.status != "ok":
        notes.append(f"the clock of {other.logger} is {other.status}")
    return "; ".join(notes)
