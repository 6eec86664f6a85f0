"""Small frames for the notebooks: what was read, what was walked, the course of the day."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

import numpy as np
import pandas as pd

from surveykit.accounting import BIT, NOT_A_FAULT, REASONS, primary
from surveykit.intake.params import Parameters
from surveykit.intake.passes import Pass
from surveykit.intake.paths import walk
from surveykit.intake.records import Records

if TYPE_CHECKING:  # `check` shows loggers and channels without what evidence has to import
    from surveykit.evidence.conditions import Day
    from surveykit.evidence.estimates import PassEstimate

UNITS = {"temperature": "degC", "albedo": "1", "ndvi": "1"}
STEP_NS, SHOWN_FROM_NS = 60_000_000_000, 10_000_000_000
SHOWN = {  # how a quantity is shown: unit, and scale and shift from SI
    **dict.fromkeys(("brightness_temperature", "housing_temperature", "air_temperature"),
                    ("degC", 1.0, -273.15)),
    **dict.fromkeys(("shortwave_down", "shortwave_up", "longwave_down", "longwave_up", "red_down",
                     "red_up", "nir_down", "nir_up"), ("W m-2", 1.0, 0.0)),
    "relative_humidity": ("%", 100.0, 0.0), "wind_speed": ("m s-1", 1.0, 0.0),
    "air_pressure": ("hPa", 0.01, 0.0)}
COURSE = {"shortwave_down": "irradiance_w_m2",
          "housing_temperature": "body_temperature_degc", "air_temperature": "air_temperature_degc",
          "wind_speed": "wind_speed_m_s", "relative_humidity": "relative_humidity_percent"}


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
            "Interval, s": float(log.interval_s)})
    return pd.DataFrame(rows)


def channels(parameters: Parameters, records: Mapping[str, Records]) -> pd.DataFrame:
    """Return one row a channel: quantity, unit as logged, typical value in its own unit."""
    rows = []
    for logger, log in records.items():
        for channel in parameters.channels(logger):
            good = log.channels[channel.column]
            good = good[np.isfinite(good)]
            unit, scale, shift = SHOWN[channel.quantity]
            median = float(np.median(good)) * scale + shift if good.size else np.nan
            rows.append({
                "Logger": logger, "Column": channel.column,
                "Quantity": channel.quantity.replace("_", " "), "Logged in": channel.unit,
                "Median": median, "Unit": unit if good.size else "no reading"})
    return pd.DataFrame(rows)


def passes(some: tuple[Pass, ...], labels: Mapping[str, str]) -> pd.DataFrame:
    """Return one row a surface: patches, and passes by quantity and kind."""
    rows: dict[str, Counter[str]] = {}
    patches: dict[str, set[str]] = {}
    for p in some:
        label = labels.get(p.surface, p.surface)
        patches.setdefault(label, set()).add(p.patch)
        rows.setdefault(label, Counter())[f"{p.quantity} {p.kind}".strip()] += 1
    columns = dict.fromkeys(f"{p.quantity} {p.kind}".strip() for p in some)
    return pd.DataFrame([{"Surface": label, "Patches": len(patches[label])}
                         | {word: row[word] for word in columns} for label, row in rows.items()])


def day_course(day: Day, some: tuple[Pass, ...]) -> dict[str, pd.DataFrame]:
    """Return frames `sky` and `weather` over the time of the passes, one row a minute.

    `sky` holds time_utc, zenith_deg and, where a shortwave head watched, irradiance_w_m2;
    `weather` holds time_utc and, where a logger tells them, body_temperature_degc (of the infrared
    head), air_temperature_degc, wind_speed_m_s and relative_humidity_percent.
    """
    if not some:
        return {"sky": pd.DataFrame(), "weather": pd.DataFrame()}
    start = min(p.start_ns for p in some) // STEP_NS * STEP_NS
    stop = max(p.stop_ns for p in some)
    grid = np.arange(start, stop + STEP_NS, STEP_NS)
    sky = {"time_utc": pd.to_datetime(grid, utc=True), "zenith_deg": day.sun(grid).zenith_deg}
    weather = {"time_utc": sky["time_utc"]}
    for quantity, column in COURSE.items():
        _, scale, shift = SHOWN[quantity]
        for channel in day.channels.get(quantity, []):  # the first that tells anything
            time, value = day.readings(channel, start, stop + STEP_NS, through=("sun too low",))
            if time.size:
                if quantity == "shortwave_down":
                    sky[column] = _minutes(grid, time, day.without_dark(channel, time, value))
                else:
                    weather[column] = scale * _minutes(grid, time, value) + shift
                break
    return {"sky": pd.DataFrame(sky), "weather": pd.DataFrame(weather)}


def excluded(day: Day, some: tuple[Pass, ...]) -> pd.DataFrame:
    """Return stretches of at least 10 s whose readings were left out for a fault of their own.

    One row a stretch: start_utc, stop_utc, its primary reason with the logger's name.
    """
    rows, whole = [], BIT["capped"] | BIT["repeated record"]  # nothing of the day is lost with them
    for logger, columns in day.quality.masks.items():
        log = day.records[logger]
        for mask in columns.values():
            bits = mask[:log.n_timed]
            why = primary(np.where(bits & whole, 0, bits & ~(NOT_A_FAULT | BIT["no partner"])))
            for reason in np.unique(why[why >= 0]):
                hit = log.time_ns[:log.n_timed][why == reason]
                apart = np.flatnonzero(np.diff(hit) > 2.5e9 * log.interval_s) + 1
                rows += [(run[0], run[-1], f"{logger}: {REASONS[reason].name}")
                         for run in np.split(hit, apart) if run[-1] - run[0] >= SHOWN_FROM_NS]
    frame = pd.DataFrame([*dict.fromkeys(rows)], columns=["start_utc", "stop_utc", "reason"])
    if some:
        frame = frame[(frame["stop_utc"] > min(p.start_ns for p in some))
                      & (frame["start_utc"] < max(p.stop_ns for p in some))]
    return frame.assign(start_utc=pd.to_datetime(frame["start_utc"], utc=True),
                        stop_utc=pd.to_datetime(frame["stop_utc"], utc=True))


def inside_passes(day: Day, estimates: Sequence[PassEstimate]) -> dict[str, pd.DataFrame]:
    """Return frames `cooling` and `walked`, a row a record.

    Contact placements against the fitted law of cooling; readings with their place of passes
    walked in lanes.
    """
    made: dict[str, list[pd.DataFrame]] = {"cooling": [], "walked": []}
    for e in estimates:
        if e.kind == "contact" and any(one.name == "fit_left" for one in e.inputs):
            made["cooling"].append(_cooling(day, e))
        if e.evaluated and e.this.lanes > 1:
            time, value = _readings(day, e.this)
            way = walk(e.this, time, day.parameters)
            if way is not None:
                made["walked"].append(pd.DataFrame({
                    "surface": e.this.surface, "patch": e.this.patch, "pass": e.this.name,
                    "quantity": e.this.quantity, "kind": e.kind, "unit": UNITS[e.this.quantity],
                    "x_m": way.x_m, "y_m": way.y_m, "value": value})[~way.turning])
    return {name: pd.concat(some, ignore_index=True) if some else pd.DataFrame()
            for name, some in made.items()}


def _cooling(day: Day, e: PassEstimate) -> pd.DataFrame:
    """Return the records of a pass's placements under the temperature before the touch."""
    from surveykit.evidence.contact import FEWEST_RECORDS, placement_courses
    from surveykit.evidence.infrared import per_record
    from surveykit.physics.cooling import fit_placements, root_time

    tau = e.this.channels["brightness_temperature"].time_constant_s or 0.0
    inputs = {one.name: one for one in e.inputs}
    kept = [(time, per_record("contact", inputs, read))
            for time, read in placement_courses(day, e.this, tau)
            if (time >= 2 * tau).sum() >= FEWEST_RECORDS and time[-1] >= 5 * tau]
    fit = fit_placements(*zip(*kept, strict=True), time_constant_s=tau, fit_time_constant=False,
                         lagged=True)
    return pd.concat([pd.DataFrame({
        "surface": e.this.surface, "pass": e.this.name, "placement": n, "seconds": time,
        "below_k": before - value, "law_k": fit.rate * root_time(time, tau, True),
        "rate": fit.rate})[time >= 5 * tau]
        for n, ((time, value), before) in enumerate(zip(kept, fit.before_k, strict=True), 1)])


def _readings(day: Day, this: Pass) -> tuple[np.ndarray, np.ndarray]:
    """Return time [ns] and reading of each record: brightness [degC], ratio or index [1]."""
    from surveykit.evidence.parts import series

    read = {name: series(day, this, name) for name in this.channels}
    if this.quantity == "temperature":
        time, kelvin = read["brightness_temperature"]
        return time, kelvin - 273.15
    share = {word: read[f"{word}_up"][1] / read[f"{word}_down"][1]
             for word in ("shortwave", "red", "nir") if f"{word}_up" in read}
    time = read["shortwave_up" if "shortwave" in share else "red_up"][0]
    return time, (share["shortwave"] if "shortwave" in share else
                  (share["nir"] - share["red"]) / (share["nir"] + share["red"]))


def conditions(course: Mapping[str, pd.DataFrame]) -> list[str]:
    """Return one sentence on what was measured of the day's weather, from `day_course`."""
    spans = []
    for frame, column, word, unit in (
            ("weather", "air_temperature_degc", "air", "degC"),
            ("weather", "relative_humidity_percent", "relative humidity", "%"),
            ("weather", "wind_speed_m_s", "wind", "m s-1"),
            ("sky", "irradiance_w_m2", "irradiance", "W m-2")):
        known = course[frame][column].dropna() if column in course[frame] else pd.Series()
        if len(known):
            digits = 0 if unit in ("%", "W m-2") else 1
            ends = dict.fromkeys(f"{end:.{digits}f}" for end in (known.min(), known.max()))
            spans.append(f"{word} {' to '.join(ends)} {unit}")
    line = f"Measured, means of a minute: {', '.join(spans)}." if spans else ""
    if "air_temperature_degc" not in course["weather"]:
        line = f"{line} Air temperature was not logged.".strip()
    return [line]


def _minutes(grid: np.ndarray, time: np.ndarray, value: np.ndarray) -> np.ndarray:
    """Return the mean of the values in each minute; NaN where most of its records are missing."""
    place = np.searchsorted(grid, time, side="right") - 1
    count = np.bincount(place, minlength=grid.size)
    sums = np.bincount(place, weights=value, minlength=grid.size)
    enough = 2 * count > np.median(count[count > 0]) if count.any() else count > 0
    return sums / np.where(enough, count, np.nan)
