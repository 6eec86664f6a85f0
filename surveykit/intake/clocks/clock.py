"""What is known of one logger's clock: offset, drift, uncertainty over the day, evidence."""

from __future__ import annotations

from dataclasses import dataclass
from math import hypot

from surveykit.intake.records import NS
from surveykit.statistics.alignment import Line
from surveykit.statistics.correlation import Lag

REFUSED = "clock refused"


@dataclass(frozen=True)
class Event:
    """One edge of a cover: logger's time, reference's time [ns], distance from the line, u [s].

    `used` says whether the line was accepted.
    """

    cover: int
    edge: str
    log_ns: int
    reference_ns: int
    residual_s: float
    u_s: float


@dataclass(frozen=True)
class Piece:
    """One stretch of records between two resets of the clock.

    `line` gives the seconds to add at seconds of the logger's time since `origin_ns`; `first_ns`
    and `last_ns` bound its records and `known_ns` its events, in the campaign's time. `refusal`
    says why the stretch cannot be placed in time.
    """

    first_ns: int
    last_ns: int
    origin_ns: int
    line: Line
    known_ns: tuple[int, int]
    refusal: str = ""

    def u_s(self, time_ns: float) -> float:
        """Return the standard uncertainty [s] at a time of the campaign."""
        return float(self.line.u((time_ns - self.origin_ns) / NS - self.line.offset_s))

    @property
    def at_ns(self) -> int:
        """The time at which the line's offset holds, in the campaign's time."""
        return self.origin_ns + round((self.line.origin_s + self.line.offset_s) * NS)


@dataclass(frozen=True)
class Clock:
    """How one logger's time was brought to UTC, and how well it is known.

    `offset_s` are the seconds added to the logger's time, `u_s` their standard uncertainty
    against UTC; `status` is "ok", "qualified" or "refused". A clock found from the records has
    `pieces`; with `to_watch` they tie it to the sheet's watch rather than to UTC. `reference` is
    the clock it was aligned with, `events` and `lag` the evidence.
    """

    logger: str
    method: str
    offset_s: float
    u_s: float
    drift_ppm: float
    status: str
    note: str
    pieces: tuple[Piece, ...] = ()
    to_watch: bool = False
    reference: Clock | None = None
    events: tuple[Event, ...] = ()
    lag: Lag | None = None
    refusal: str = ""

    def piece(self, time_ns: float) -> Piece | None:
        """Return the stretch that holds a time of the campaign, or the nearest; None: declared.

        Of two that do, as a refused one may where its times are wrong, the one that is not refused.
        """
        return min(self.pieces, default=None, key=lambda p: (
            max(p.first_ns - time_ns, time_ns - p.last_ns, 0), bool(p.refusal)))

    def u_at(self, time_ns: float) -> float:
        """Return u [s] at a time: against the sheet's watch with `to_watch`, else against UTC."""
        piece = self.piece(time_ns)
        if piece is None:
            return self.u_s
        own = piece.u_s(time_ns)
        return own if self.reference is None else hypot(own, self.reference.u_at(time_ns))

    def u_against_watch(self, time_ns: float, watch_u_s: float) -> float:
        """Return u [s] of the logger's time against the sheet's at a time of the campaign."""
        u_s = self.u_at(time_ns)
        return u_s if self.to_watch else hypot(u_s, watch_u_s)

    def u_between(self, other: Clock, time_ns: float, watch_u_s: float) -> float:
        """Return u [s] of two loggers' times against each other at a time of the campaign."""
        for one, two in ((self, other), (other, self)):
            piece = one.piece(time_ns)
            if one.reference is not None and one.reference.logger == two.logger and piece:
                return piece.u_s(time_ns)
        tied = 0.0 if self.to_watch == other.to_watch else watch_u_s
        return hypot(self.u_at(time_ns), other.u_at(time_ns), tied)

    def refusal_in(self, start_ns: int, stop_ns: int) -> str:
        """Return why no record between two times can be placed, or an empty text."""
        if self.refusal:
            return self.refusal
        pieces = (self.piece(time) for time in (start_ns, stop_ns))
        return next((p.refusal for p in pieces if p is not None and p.refusal), "")

    def extrapolated(self, start_ns: int, stop_ns: int, share: float) -> bool:
        """Return whether a stretch lies outside the events by more than `share` of their span."""
        for time in (start_ns, stop_ns):
            piece = self.piece(time)
            if piece is not None:
                first, last = piece.known_ns
                reach = share * (last - first)
                if not first - reach <= time <= last + reach:
                    return True
        return self.reference is not None and self.reference.extrapolated(start_ns, stop_ns, share)
