"""Clocks: from each logger's own time to the campaign's."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from datetime import date
from zoneinfo import ZoneInfo

import numpy as np
import pandas as pd

from surveykit.core import InputError
from surveykit.intake.params import LoggerUse, Parameters, Settings
from surveykit.intake.records import NO_TIME_NS, Records

NS = 1_000_000_000


@dataclass(frozen=True)
class Clock:
    """How one logger's time was brought to UTC, and how well it is known.

    `method` is "declared" or "not checked", `status` "ok" or "qualified"; `offset_s` are the
    seconds added to the logger's time, `u_s` their standard uncertainty.
    """

    logger: str
    method: str
    offset_s: float
    u_s: float
    drift_ppm: float
    status: str
    note: str


def set_clock(records: Records, use: LoggerUse, settings: Settings) -> tuple[Records, Clock]:
    """Return the records in the campaign's time, and what was done to their clock.

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


def check_days(records: Mapping[str, Records], parameters: Parameters) -> None:
    """Refuse loggers none of whose records falls on the campaign's date at the site.

    Raises
    ------
    InputError
        One sentence a logger; it states the days the logger does cover.
    """
    zone, day = parameters.campaign.site.time_zone, parameters.campaign.date
    midnight = pd.Timestamp(day).tz_localize(ZoneInfo(zone), nonexistent="shift_forward",
                                             ambiguous=True)
    ends = [midnight, (midnight + pd.DateOffset(days=1))]
    start_ns, stop_ns = (int(end.as_unit("ns").value) for end in ends)
    faults = []
    for name, log in records.items():
        time_ns = log.time_ns[:log.n_timed]
        if not ((time_ns >= start_ns) & (time_ns < stop_ns)).any():
            covered = pd.DatetimeIndex(time_ns, tz="UTC").tz_convert(ZoneInfo(zone))
            days = sorted({date.isoformat() for date in covered.normalize().unique().date})
            listing = " and ".join(_runs(days)) or "no day (no time is readable)"
            faults.append(f"loggers.{name}: no record falls on {day} ({zone}); its files cover "
                          f"{listing}; check loggers.{name}.files, loggers.{name}.clock and date")
    if faults:
        raise InputError(*faults)


def _runs(days: list[str]) -> list[str]:
    """Join consecutive days: ["2025-07-01 to 2025-07-03", "2025-07-09"]."""
    runs: list[list[str]] = []
    for day in days:
        if runs and (date.fromisoformat(day) - date.fromisoformat(runs[-1][-1])).days == 1:
            runs[-1] = [runs[-1][0], day]
        else:
            runs.append([day])
    return [" to ".join(run) for run in runs]
