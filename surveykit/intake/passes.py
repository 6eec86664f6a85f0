"""Passes: one timed coverage of a patch, its channels, and what is left between its edges."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass
from math import hypot

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view

from surveykit.core import FloatArray, InputError
from surveykit.intake.clocks import Clock
from surveykit.intake.fieldsheet import Sheet
from surveykit.intake.params import Channel, Parameters
from surveykit.intake.records import Records
from surveykit.intake.serving import offers, serve
from surveykit.intake.sheet_words import Entry

NS = 1_000_000_000
NAN = float("nan")
MAX_WINDOW = 15


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

    @property
    def loggers(self) -> tuple[str, ...]:
        """Return the loggers behind the channels, each once."""
        return tuple(dict.fromkeys(channel.logger for channel in self.channels.values()))


def match_passes(sheet: Sheet, parameters: Parameters,
                 clocks: Mapping[str, Clock]) -> tuple[Pass, ...]:
    """Return the passes of the sheet in order of time, each with its channels and edges.

    Each end is trimmed by u(sheet) + hypot(u(clock), u(watch)) + n tau: the written time's
    uncertainty, the worst of the pass's loggers against the watch, and
    `passes.settle_time_constants` times the slowest channel's time constant.

    Raises
    ------
    InputError
        If no channel, or more than one, could serve a pass.
    """
    offered = offers(parameters)
    rows = sorted((entry for entry in sheet.entries if entry.entry == "pass"),
                  key=lambda entry: (entry.start_ns, entry.row))
    sizes = {entry.patch: (entry.width_m, entry.length_m) for entry in rows
             if entry.length_m == entry.length_m}
    count: Counter[tuple[str, str]] = Counter()
    passes, faults = [], []
    for entry in rows:
        try:
            service = serve(offered, entry.quantity, entry.mode, entry.instrument)
        except ValueError as error:
            faults.append(f"{sheet.path} row {entry.row}: {error}")
            continue
        word = (service.kind or entry.quantity).replace("-", "")
        count[entry.patch, word] += 1
        trim_s, notes = _trim(entry, service.channels, parameters, clocks)
        width_m, length_m = sizes.get(entry.patch, (NAN, NAN))
        passes.append(Pass(
            name=f"{entry.patch}-{word}-{count[entry.patch, word]}", surface=entry.surface,
            patch=entry.patch, quantity=entry.quantity, kind=service.kind, mode=entry.mode,
            row=entry.row, start_ns=entry.start_ns, stop_ns=entry.stop_ns, trim_s=trim_s,
            from_ns=entry.start_ns + round(trim_s * NS), to_ns=entry.stop_ns - round(trim_s * NS),
            channels=service.channels, height_m=entry.height_m, width_m=width_m,
            length_m=length_m, lanes=entry.lanes, reading=entry.reading, notes=notes))
    if faults:
        raise InputError(*faults)
    return tuple(passes)


def _trim(entry: Entry, channels: Mapping[str, Channel], parameters: Parameters,
          clocks: Mapping[str, Clock]) -> tuple[float, tuple[str, ...]]:
    u_clock = max(clocks[channel.logger].u_s for channel in channels.values())
    unstated = [channel.column for channel in channels.values() if channel.time_constant_s is None]
    slowest = max(channel.time_constant_s or 0.0 for channel in channels.values())
    settle_s = parameters.settings.passes.settle_time_constants * slowest
    notes = (f"time constant of {', '.join(unstated)} is not stated: no time to settle is taken "
             "off",) if unstated else ()
    return entry.edge_u_s + hypot(u_clock, parameters.campaign.watch.offset.u) + settle_s, notes


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
        mine = [one for one in passes if name in one.loggers]
        time_ns = log.time_ns[:log.n_timed]
        edges = np.searchsorted(time_ns, [(one.start_ns, one.stop_ns) for one in mine]) \
            if mine else np.zeros((0, 2), dtype=int)
        if mine and (edges[:, 0] == edges[:, 1]).all():
            span = f"{_clock(time_ns[0])} to {_clock(time_ns[-1])}" if time_ns.size else "no time"
            faults.append(
                f"loggers.{name}: its records ({span} UTC) miss every pass it serves on "
                f"{sheet_path} ({_clock(min(one.start_ns for one in mine))} to "
                f"{_clock(max(one.stop_ns for one in mine))} UTC); check its files, time.zone, "
                f"clock and watch")
    if faults:
        raise InputError(*faults)


def _clock(time_ns: int) -> str:
    return str(np.datetime64(int(time_ns), "ns").astype("datetime64[s]")).replace("T", " ")


def find_dwells(time_s: FloatArray, temperature_k: FloatArray, *, settle_s: float, min_s: float,
                max_rate_k_s: float) -> list[slice]:
    """Return the settled placements of a contact pass.

    A record is settled where the local rate of change is at most `max_rate_k_s`: the median of the
    slopes between all pairs (Theil-Sen) of the records around it, as many as cover a third of
    `min_s`, at least 3. Runs of settled records, without a gap longer than that stretch, lose
    their first `settle_s`; what is left counts if it lasts `min_s`.

    Parameters
    ----------
    time_s : ndarray, shape (n,)
        Times [s], ascending.
    temperature_k : ndarray, shape (n,)
        Readings [K]; a NaN ends a run.
    settle_s : float
        Taken off the beginning of each run [s].
    min_s : float
        Shortest placement [s].
    max_rate_k_s : float
        Fastest settled change [K s-1].

    Returns
    -------
    list of slice
        Into the arrays, in order of time.

    References
    ----------
    P. K. Sen, Estimates of the regression coefficient based on Kendall's tau, J. Am. Stat. Assoc.
    63 (1968) 1379-1389 (from memory).

    Examples
    --------
    >>> import numpy as np
    >>> t = np.arange(0.0, 20.0, 0.5)
    >>> find_dwells(t, np.where(t < 10, 300 + 5 * t, 350.0), settle_s=1, min_s=3, max_rate_k_s=0.5)
    [slice(23, 40, None)]
    """
    time_s, temperature_k = np.asarray(time_s, float), np.asarray(temperature_k, float)
    if time_s.size < 3:
        return []
    steps = np.diff(time_s)
    step_s = float(np.median(steps))
    half = int(np.clip(round(min_s / 3 / step_s / 2) if step_s > 0 else 1, 1, MAX_WINDOW // 2))
    width = 2 * half + 1
    if time_s.size < width:
        half, width = 1, 3
    rate = _local_rate(time_s, temperature_k, width)
    rate = np.pad(rate, half, mode="edge")
    settled = (np.abs(rate) <= max_rate_k_s) & np.isfinite(temperature_k)
    breaks = np.flatnonzero((settled[1:] != settled[:-1]) | (steps > width * step_s)) + 1
    dwells = []
    for first, last in zip([0, *breaks], [*breaks, time_s.size], strict=True):
        first, last = int(first), int(last)
        if not settled[first]:
            continue
        begin = first + int(np.searchsorted(time_s[first:last], time_s[first] + settle_s))
        if begin < last and time_s[last - 1] - time_s[begin] >= min_s:
            dwells.append(slice(begin, last))
    return dwells


def _local_rate(time_s: FloatArray, temperature_k: FloatArray, width: int) -> FloatArray:
    times = sliding_window_view(time_s, width)
    values = sliding_window_view(temperature_k, width)
    late, early = np.tril_indices(width, -1)
    with np.errstate(divide="ignore", invalid="ignore"):
        slopes = (values[:, late] - values[:, early]) / (times[:, late] - times[:, early])
    rate = np.full(len(slopes), np.nan)
    whole = np.isfinite(slopes).all(axis=1)
    rate[whole] = np.median(slopes[whole], axis=1)
    return rate
