"""Passes: one timed coverage of a patch, its channels, and what is left between its edges."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from surveykit.core import InputError
from surveykit.intake.clocks import REFUSED, Clock
from surveykit.intake.fieldsheet import Sheet
from surveykit.intake.params import Channel, Parameters
from surveykit.intake.placements import find_dwells
from surveykit.intake.records import NS, Records, clock_text
from surveykit.intake.sheet_words import Entry

NAN = float("nan")
WRITTEN = ("surface", "patch", "quantity", "mode", "row", "start_ns", "stop_ns", "height_m",
           "lanes", "reading", "rod_side", "operator_side")  # taken from the row as they stand

__all__ = ["Pass", "check_coverage", "find_dwells", "match_passes"]


@dataclass(frozen=True)
class Pass:
    """One timed coverage of a patch by one quantity.

    Attributes
    ----------
    name : str
        "<patch>-<word>-<n>": contact, standoff, longwave, albedo or ndvi; n counts the passes of
        patch and word in order of time.
    kind : str
        contact, stand-off or longwave of a temperature; "" otherwise.
    row : int
        Row of the field sheet.
    start_ns, stop_ns : int
        As written on the sheet, UTC.
    trim_s : float
        What is taken off each end [s].
    from_ns, to_ns : int
        What remains; `to_ns` <= `from_ns` where nothing does.
    channels : dict of Channel
        By quantity of the channel.
    height_m, width_m, length_m : float
        NaN where the sheet does not say; a disc has no width.
    lanes : int
        0 where the sheet does not say.
    reading : float
        The sheet's reading (number of placements of a contact pass), NaN where there is none.
    notes : tuple of str
        What a reader of the pass should know.
    refusal : str
        Why its records cannot be placed in time, or "".
    rod_side, operator_side : str
        Where rod and operator were, seen from the head: sun, across, away, or "" if not written.
    skew_u_s : float
        Standard uncertainty [s] of its loggers' times against each other, of the two that are
        known least; 0 with one logger.
    """

    name: str
    surface: str
    patch: str
    quantity: str
    kind: str
    mode: str
    row: int
    start_ns: int
    stop_ns: int
    trim_s: float
    from_ns: int
    to_ns: int
    channels: dict[str, Channel]
    height_m: float
    width_m: float
    length_m: float
    lanes: int
    reading: float
    notes: tuple[str, ...] = ()
    refusal: str = ""
    rod_side: str = ""
    operator_side: str = ""
    skew_u_s: float = 0.0

    @property
    def loggers(self) -> tuple[str, ...]:
        """Return the loggers behind the channels, each once."""
        return tuple(dict.fromkeys(channel.logger for channel in self.channels.values()))


def match_passes(sheet: Sheet, parameters: Parameters,
                 clocks: Mapping[str, Clock]) -> tuple[Pass, ...]:
    """Return the passes of the sheet in order of time, each with its channels and edges.

    Each end is trimmed by u(sheet) + u(clock) + n tau: the written time's uncertainty, that of
    the worst of the pass's loggers against the watch at the pass's time (hypot(u(clock), u(watch))
    unless the clock was found from the sheet itself), and `passes.settle_time_constants` times the
    slowest channel's time constant. A pass whose logger's clock is refused stays, and says why.
    """
    watch_u_s = parameters.campaign.watch.offset.u
    rows = [entry for entry in sheet.entries if entry.entry == "pass"]
    sizes = {entry.patch: (entry.width_m, entry.length_m) for entry in rows
             if entry.length_m == entry.length_m}
    count: Counter[tuple[str, str]] = Counter()
    passes = []
    for entry in rows:
        service = sheet.services[entry.row]
        word = (service.kind or entry.quantity).replace("-", "")
        count[entry.patch, word] += 1
        used = [clocks[name] for name in service.loggers]
        refusal = next((why for clock in used if (
            why := clock.refusal_in(entry.start_ns, entry.stop_ns))), "")
        trim_s, notes = _trim(entry, service.channels, parameters, () if refusal else used)
        middle_ns = (entry.start_ns + entry.stop_ns) / 2
        skews = [one.u_between(two, middle_ns, watch_u_s) for one, two in combinations(used, 2)]
        width_m, length_m = sizes.get(entry.patch, (NAN, NAN))
        passes.append(Pass(
            **{name: getattr(entry, name) for name in WRITTEN}, kind=service.kind,
            name=f"{entry.patch}-{word}-{count[entry.patch, word]}", trim_s=trim_s,
            from_ns=entry.start_ns + round(trim_s * NS), to_ns=entry.stop_ns - round(trim_s * NS),
            channels=service.channels, width_m=width_m, length_m=length_m, notes=notes,
            refusal=refusal, skew_u_s=0.0 if refusal else max(skews, default=0.0)))
    return tuple(passes)


def _trim(entry: Entry, channels: Mapping[str, Channel], parameters: Parameters,
          clocks: Sequence[Clock]) -> tuple[float, tuple[str, ...]]:
    settings, watch_u_s = parameters.settings, parameters.campaign.watch.offset.u
    ends = entry.start_ns, entry.stop_ns
    u_clock = max((clock.u_against_watch(end, watch_u_s) for clock in clocks for end in ends),
                  default=0.0)
    slowest = max(channel.time_constant_s for channel in channels.values())
    settle_s = settings.passes.settle_time_constants * slowest
    notes: tuple[str, ...] = ()
    if any(clock.extrapolated(*ends, settings.clocks.extrapolate) for clock in clocks):
        notes = ("clock extrapolated",)
    return entry.edge_u_s + u_clock + settle_s, notes


def check_coverage(passes: tuple[Pass, ...], records: Mapping[str, Records],
                   sheet_path: str) -> None:
    """Refuse loggers whose records miss every one of the passes that they serve.

    Raises
    ------
    InputError
        One sentence a logger; it states what its records and its passes cover.
    """
    faults = []
    for name, log in records.items():
        if log.marks.get(REFUSED, np.zeros(1, np.bool_)).all():
            continue  # its passes say so
        mine = [one for one in passes if name in one.loggers]
        time_ns = log.time_ns[:log.n_timed]
        edges = np.searchsorted(time_ns, [(one.start_ns, one.stop_ns) for one in mine]) \
            if mine else np.zeros((0, 2), dtype=int)
        if mine and (edges[:, 0] == edges[:, 1]).all():
            span = " to ".join(map(clock_text, time_ns[[0, -1]])) if time_ns.size else "no time"
            faults.append(
                f"loggers.{name}: its records ({span} UTC) miss every pass it serves on "
                f"{sheet_path} ({clock_text(min(one.start_ns for one in mine))} to "
                f"{clock_text(max(one.stop_ns for one in mine))} UTC); check its files, time.zone, "
                f"clock and watch")
    if faults:
        raise InputError(*faults)
