"""The clocks of loggers and of the field sheet, as a parameter file states them."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from datetime import datetime
from typing import Annotated

from surveykit.intake.params.amounts import (
    Amount,
    BareNumber,
    FromSettings,
    Uncertain,
    given_once,
    whole,
)
from surveykit.intake.params.base import Fault, Name, Strict, key, since_epoch_ns


class Clock(Strict):
    """A logger's clock against UTC, found out in the field."""

    offset_s: Annotated[Amount, BareNumber(None, -86400.0 * 366, 86400.0 * 366, "s")] = key(
        "Seconds to ADD to the logger's time; positive: its clock was slow.",
        default=0.0, validate_default=True, write="a number of seconds, or {value, u}")
    u_s: float | None = key("Standard uncertainty of offset_s.", default=None, ge=0, unit="s")
    drift_ppm: float = key(
        "Rate of the offset: microseconds to add for each second after drift_from.", default=0.0,
        ge=-10000, le=10000, unit="ppm")
    drift_from: str | None = key(
        "When offset_s held, ISO 8601 with its offset or Z.", default=None,
        write='a time such as "2025-07-24T08:00:00Z", in quotes')
    cover_events: bool = key(
        "Whether the sheet's cover rows set this clock, from offset_s on.", default=False,
        write="true, or leave it out")
    align_with: Name | None = key(
        "The logger whose clock sets this one, by covers that both saw, else by what their "
        "readings share.", default=None, write="the name of another logger of this file")
    search_s: Annotated[float, FromSettings("clocks.search_s")] = key(
        "How far from offset_s to search; absent: settings.clocks.search_s.", default=None,
        validate_default=True, gt=0, le=43200, unit="s")

    def faults(self) -> Iterator[Fault]:
        """The u of the offset once; a drift needs its beginning; one way to set the clock."""
        yield from given_once("offset_s", self.offset_s, "u_s", self.u_s)
        if self.found:
            yield from self._stated_too()
        elif self.offset_s.u is None and self.u_s is None:
            yield ("u_s",), "missing; write the standard uncertainty of offset_s in s"
        elif "search_s" in self.model_fields_set:
            yield ("search_s",), "belongs to align_with or cover_events; leave it out"
        if self.drift_ppm and self.drift_from is None and not self.found:
            yield ("drift_from",), "missing; drift_ppm needs the time when offset_s held, " \
                                   'such as "2025-07-24T08:00:00Z"'
        if self.drift_from is not None and self.drift_from_ns is None:
            yield ("drift_from",), f"got {self.drift_from[:40]!r}; write a time with its offset, " \
                                   'such as "2025-07-24T08:00:00Z", in quotes'

    def _stated_too(self) -> Iterator[Fault]:
        if self.cover_events and self.align_with is not None:
            yield ("align_with",), "got it beside cover_events; write the one or the other"
        if self.drift_ppm:
            yield ("drift_ppm",), "the clock is found from the records, its drift with it; " \
                                  "leave it out"

    @property
    def found(self) -> bool:
        """Whether the clock is to be found from the records; offset_s is then only a start."""
        return self.cover_events or self.align_with is not None

    @property
    def offset(self) -> Uncertain:
        """offset_s with its u [s]."""
        return whole(self.offset_s, self.u_s)

    @property
    def drift_from_ns(self) -> int | None:
        """drift_from in ns since the epoch, UTC; None if it is absent or no time."""
        try:
            moment = datetime.fromisoformat(self.drift_from or "")
        except ValueError:
            return None
        known = moment.tzinfo is not None and 1950 <= moment.year <= 2199
        return since_epoch_ns(moment) if known else None


class Watch(Strict):
    """The clock the field sheet was written by."""

    offset_s: Annotated[Amount, BareNumber(None, -86400.0, 86400.0, "s")] = key(
        "Seconds to ADD to the sheet's times to reach UTC.", default=0.0, validate_default=True,
        write="a number of seconds, or {value, u}")
    u_s: Annotated[float, FromSettings("clocks.unchecked_u_s")] = key(
        "Standard uncertainty of offset_s; absent: settings.clocks.unchecked_u_s.", default=None,
        validate_default=True, ge=0, unit="s")

    def faults(self) -> Iterator[Fault]:
        """The u of the offset once."""
        if "u_s" in self.model_fields_set:
            yield from given_once("offset_s", self.offset_s, "u_s", self.u_s)

    @property
    def checked(self) -> bool:
        """Whether an uncertainty was stated."""
        return self.offset_s.u is not None or "u_s" in self.model_fields_set

    @property
    def offset(self) -> Uncertain:
        """offset_s with its u [s]."""
        return whole(self.offset_s, self.u_s)


def clock_faults(clocks: Mapping[str, Clock | None], known: Sequence[str]) -> Iterator[Fault]:
    """Yield the faults of align_with: no such logger, or clocks that hang on each other."""
    partner = {name: clock.align_with for name, clock in clocks.items()
               if clock is not None and clock.align_with is not None}
    for name, other in partner.items():
        here = ("loggers", name, "clock", "align_with")
        seen = {name}
        while other in partner and other not in seen:
            seen.add(other)
            other = partner[other]
        if partner[name] not in known:
            yield here, f"got {partner[name]!r}, no logger of this file; write the name of another"
        elif other == name:
            yield here, f"got {partner[name]!r}, whose clock hangs on this one; write a logger " \
                        "whose clock is known"
