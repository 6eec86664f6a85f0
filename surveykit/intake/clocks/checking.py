"""Clocks held against what they did not come from: the sun, each other's light, the date."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import date
from itertools import combinations
from math import hypot
from typing import NamedTuple
from zoneinfo import ZoneInfo

import numpy as np
import pandas as pd

from surveykit.core import FloatArray, InputError, IntArray
from surveykit.intake.clocks.finding import Timed
from surveykit.intake.clocks.signals import LIGHT, first_of, in_common, readings
from surveykit.intake.params import Parameters
from surveykit.intake.records import NS, Records
from surveykit.physics.sun import clear_sky_shape, sun_position
from surveykit.statistics.alignment import edge_u_s
from surveykit.statistics.correlation import correlate

MINUTE_NS = 60 * NS
HALF_DAY_MIN = 720
AIR_PA, AIR_DEGC = 101325.0, 12.0  # for the refraction, which moves no clock by a minute
FEWEST_MIN = 45  # minutes of light that say anything of the sun
CLEARLY = 1.5  # by which a shift must fit better than any small one
ODD = 0.3  # of the largest irradiance: a minute further off counts no more than that
LEAST_STEP_S = 1.0  # of the grid on which clocks are checked against each other


class SunShift(NamedTuple):
    """By how many minutes the irradiance fits the clear sky best, and how well.

    `shift_min` is positive where the records' times are late; `misfit` there and `misfit_small`,
    the least within the small shifts, are mean distances as shares of the largest irradiance.
    """

    shift_min: float
    misfit: float
    misfit_small: float

    @property
    def telling(self) -> bool:
        """Whether the best shift fits clearly better than any small one."""
        return self.misfit_small > CLEARLY * self.misfit


def sun_shift(time_ns: IntArray, values: FloatArray, latitude: float, longitude: float,
              elevation_m: float, *, small_min: float) -> SunShift | None:
    """Return the shift of downwelling light against the clear sky, its scale left free.

    Minute medians over the day about the middle one are compared with the clear sky of every
    minute within half a day; a minute under a cap or a cloud counts no more than a limited
    distance. Good to some ten minutes, the haze of the day being unknown: enough for a wrong zone,
    useless as a clock.

    Parameters
    ----------
    time_ns, values : ndarray, shape (n,)
        Times [ns UTC], ascending, and downwelling light in any unit.
    latitude, longitude, elevation_m : float
        The site [deg, m].
    small_min : float
        Shifts up to this many minutes are small.

    Returns
    -------
    SunShift or None
        None where less than 45 minutes of light were recorded.
    """
    if time_ns.size == 0:
        return None
    minute = pd.Series(values).groupby(time_ns // MINUTE_NS).median()
    keys, light = minute.index.to_numpy(np.int64), minute.to_numpy(np.float64)
    inside = np.abs(keys - np.median(keys)) <= HALF_DAY_MIN
    keys, light = keys[inside], light[inside]
    top = float(np.quantile(light, 0.98))
    if top <= 0 or np.count_nonzero(light > 0.05 * top) < FEWEST_MIN:
        return None
    first = keys[0] - HALF_DAY_MIN
    grid = np.arange(first, keys[-1] + HALF_DAY_MIN + 1)
    clear = clear_sky_shape(np.cos(np.radians(_zenith_deg(
        grid * MINUTE_NS, latitude, longitude, elevation_m))))

    def misfit(shift: int) -> float:
        sky = clear[keys - first - shift]
        lit = (sky > 50.0) & (light > 0.05 * top)
        if np.count_nonzero(lit) < FEWEST_MIN / 2:
            return ODD
        scale = float(np.median(light[lit] / sky[lit]))
        apart = np.abs(light - scale * sky) / max(top, scale * float(sky.max()))
        return float(np.minimum(apart, ODD)[(light > 0.05 * top) | (sky > 50.0)].mean())

    coarse = np.arange(-HALF_DAY_MIN, HALF_DAY_MIN + 1, 10)
    near = int(coarse[np.argmin([misfit(int(s)) for s in coarse])])
    fine = np.clip(np.arange(near - 10, near + 11), -HALF_DAY_MIN, HALF_DAY_MIN)
    fits = [misfit(int(s)) for s in fine]
    best = int(np.argmin(fits))
    small = min(misfit(s) for s in range(-int(small_min), int(small_min) + 1, 5))
    return SunShift(float(fine[best]), fits[best], small)


def against_the_sun(loggers: Mapping[str, Timed], parameters: Parameters) -> dict[str, str]:
    """Return by logger why its time cannot be right: its light fits the clear sky elsewhere."""
    site, limit = parameters.campaign.site, parameters.settings.clocks.sun_shift_min
    wrong = {}
    for name, one in loggers.items():
        channel = first_of(parameters.channels(name), [q for q in LIGHT if q.endswith("_down")])
        if channel is None or one.clock.refusal:
            continue
        time_s, values = readings(one.records, channel, parameters.settings, 0)
        time_ns = (time_s * NS).astype(np.int64)
        if _lit_at_night(time_ns, values, parameters):
            continue  # the passes say so, each with what its pair read: longitude, zone or clock
        found = sun_shift(time_ns, values, site.latitude, site.longitude,
                          site.elevation_m, small_min=limit / 2)
        if found is not None and abs(found.shift_min) > limit and found.telling:
            wrong[name] = (
                f"its light follows the clear sky {abs(found.shift_min):.0f} min "
                f"{'too late' if found.shift_min > 0 else 'too early'}: check time.zone, the "
                "clock, and site.longitude (west is negative)")
    return wrong


def _lit_at_night(time_ns: IntArray, values: FloatArray, parameters: Parameters) -> bool:
    """Return whether most of the light falls while the computed sun is below the horizon."""
    if values.size == 0:
        return False
    bright = np.unique(time_ns[values > 0.05 * float(np.quantile(values, 0.98))] // MINUTE_NS)
    site = parameters.campaign.site
    zenith = _zenith_deg(bright * MINUTE_NS, site.latitude, site.longitude, site.elevation_m)
    return bool(np.mean(zenith > 90.0) > 0.5) if bright.size else False


def _zenith_deg(time_ns: IntArray, latitude: float, longitude: float,
                elevation_m: float) -> FloatArray:
    return sun_position(time_ns, latitude, longitude, elevation_m, AIR_PA,
                        AIR_DEGC).apparent_zenith_deg


def against_each_other(loggers: Mapping[str, Timed], parameters: Parameters) -> dict[str, str]:
    """Return by logger why its clock disagrees with another's under the same changing light.

    Where the correlation of two loggers' light is accepted and its lag lies beyond 3 u, the clock
    with less behind it is refused: not checked before declared before found; of equals, both.
    """
    limits, wrong = parameters.settings.clocks, dict[str, str]()
    for (name, one), (other, two) in combinations(loggers.items(), 2):
        if one.clock.refusal or two.clock.refusal or _related(one, two):
            continue
        pair = in_common(parameters.channels(name), parameters.channels(other))
        if pair is None:
            continue
        first, second = (readings(some.records, channel, parameters.settings,
                                  int(one.records.time_ns[0]))
                         for some, channel in zip((one, two), pair, strict=True))
        step_s = max(one.records.interval_s, two.records.interval_s, LEAST_STEP_S)
        lag = correlate(*first, *second, search_s=max(limits.crosscheck_s, 10 * step_s),
                        step_s=step_s)
        if lag.refusal(min_peak=limits.min_peak, max_second=limits.max_second,
                       max_halves_s=max(limits.max_halves_s, step_s)):
            continue
        middle = float(one.records.time_ns[one.records.n_timed // 2])
        allowed = 3 * hypot(one.clock.u_at(middle), two.clock.u_at(middle),
                            edge_u_s(step_s, step_s)) + step_s
        if abs(lag.lag_s) <= allowed:
            continue
        ranks = [_evidence(some) for some in (one, two)]
        for this, that, rank, sign in ((name, other, ranks[0], -1), (other, name, ranks[1], 1)):
            if rank == min(ranks):
                wrong[this] = (
                    f"under the same light its readings come {abs(lag.lag_s):.0f} s "
                    f"{'after' if sign * lag.lag_s < 0 else 'before'} those of {that}, more than "
                    f"the {allowed:.1f} s that the clocks allow; check both offsets, or write "
                    f"align_with: {that}")
    return wrong


def _related(one: Timed, two: Timed) -> bool:
    return any(a.clock.reference is not None and a.clock.reference.logger == b.clock.logger
               for a, b in ((one, two), (two, one)))


def _evidence(one: Timed) -> int:
    return {"not checked": 0, "declared": 1}.get(one.clock.method, 2)


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
