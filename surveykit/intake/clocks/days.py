"""Loggers must hold records of the campaign's date."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import date
from zoneinfo import ZoneInfo

import pandas as pd

from surveykit.core import InputError
from surveykit.intake.params import Parameters
from surveykit.intake.records import Records


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
