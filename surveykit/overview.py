"""Small frames for the notebooks: what was read, what was walked, the course of the day."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pandas as pd

from surveykit.evidence.conditions import Day
from surveykit.intake.passes import Pass
from surveykit.intake.records import Records

STEP_NS = 60_000_000_000


def loggers(records: Mapping[str, Records], time_zone: str) -> pd.DataFrame:
    """Return one row a logger: files, records, first and last time of day, interval."""
    rows = []
    for name, log in records.items():
        first, last = pd.to_datetime(log.time_ns[[0, log.n_timed - 1]], utc=True)
        rows.append({
            "Logger": name, "Files": len(log.files), "Records": len(log),
            "First (UTC)": f"{first:%H:%M:%S}", "Last (UTC)": f"{last:%H:%M:%S}",
            "First (site)": f"{first.tz_convert(time_zone):%H:%M:%S}",
            "Last (site)": f"{last.tz_convert(time_zone):%H:%M:%S}",
            "Interval, s": f"{log.interval_s:g}"})
    return pd.DataFrame(rows)


def channels(day: Day) -> pd.DataFrame:
    """Return one row a channel: quantity, unit as logged, typical value in its own unit."""
    rows = []
    for logger, log in day.records.items():
        for channel in day.parameters.channels(logger):
            good = log.channels[channel.column]
            good = good[np.isfinite(good)]
            degc = channel.quantity.endswith("temperature")
            median = float(np.median(good)) - (273.15 if degc else 0.0) if good.size else np.nan
            rows.append({
                "Logger": logger, "Column": channel.column,
                "Quantity": channel.quantity.replace("_", " "), "Logged in": channel.unit,
                "Median": f"{median:.4g}" + (" degC" if degc else "") if good.size else "none"})
    return pd.DataFrame(rows)


def passes(some: tuple[Pass, ...], labels: Mapping[str, str]) -> pd.DataFrame:
    """Return one row a surface: patches, and passes by quantity and kind."""
    rows: dict[str, dict[str, object]] = {}
    patches: dict[str, set[str]] = {}
    columns = dict.fromkeys(" ".join(w for w in (p.quantity, p.kind) if w) for p in some)
    for p in some:
        label = labels.get(p.surface, p.surface)
        patches.setdefault(label, set()).add(p.patch)
        row = rows.setdefault(label, {"Surface": label, "Patches": 0, **dict.fromkeys(columns, 0)})
        row["Patches"] = len(patches[label])
        word = " ".join(w for w in (p.quantity, p.kind) if w)
        row[word] = int(str(row[word])) + 1
    return pd.DataFrame(list(rows.values()))


def day_course(day: Day, some: tuple[Pass, ...]) -> dict[str, pd.DataFrame]:
    """Return frames `sky` and `weather` over the time of the passes, one row a minute.

    `sky` holds time_utc, zenith_deg and, where a shortwave head watched, irradiance_w_m2;
    `weather` holds time_utc and air_temperature_degc, or no row where nothing tells it.
    """
    if not some:
        return {"sky": pd.DataFrame(), "weather": pd.DataFrame()}
    start = min(p.start_ns for p in some) // STEP_NS * STEP_NS
    stop = max(p.stop_ns for p in some)
    grid = np.arange(start, stop + STEP_NS, STEP_NS)
    sky = {"time_utc": pd.to_datetime(grid, utc=True), "zenith_deg": day.sun(grid).zenith_deg}
    for channel in day.channels.get("shortwave_down", []):
        time, value = day.readings(channel, start, stop + STEP_NS, through=("sun too low",))
        sky["irradiance_w_m2"] = _minutes(grid, time, day.without_dark(channel, time, value))
    weather = {"time_utc": sky["time_utc"]}
    for channel in day.channels.get("air_temperature", []):
        time, value = day.readings(channel, start, stop + STEP_NS)
        weather["air_temperature_degc"] = _minutes(grid, time, value) - 273.15
    return {"sky": pd.DataFrame(sky), "weather": pd.DataFrame(weather)}


def _minutes(grid: np.ndarray, time: np.ndarray, value: np.ndarray) -> np.ndarray:
    """Return the mean of the values in each minute; NaN where there is none."""
    place = np.searchsorted(grid, time, side="right") - 1
    count = np.bincount(place, minlength=grid.size)
    sums = np.bincount(place, weights=value, minlength=grid.size)
    return sums / np.where(count, count, np.nan)
