"""What the day's irradiance did: changes that the ground remembers, a sky that is not steady."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from surveykit.accounting import BIT, NS
from surveykit.core import BoolArray, FloatArray, IntArray
from surveykit.intake.capped import PRODUCTS, windows
from surveykit.intake.params import Channel
from surveykit.intake.passes import Pass
from surveykit.physics.sun import MISSING_NS
from surveykit.quality.series import ROUNDING_S, inside, medians, nearest
from surveykit.quality.study import CLEAR_MAXIMUM, Masks, Study

STRETCH_S = 10.0  # medians of it, so that neither a hand nor the sway of a pole is a cloud
FEWEST = 3  # of them judge a stretch
TURNING_S = 15.0  # that it takes to turn a pair of heads over, engineering default


@dataclass(frozen=True)
class Watch:
    """Irradiance [W m-2] as medians of `width_s`, each with the time [ns] at which it ends."""

    time_ns: IntArray
    irradiance_w_m2: FloatArray
    width_s: float

    def at(self, found: BoolArray, time_ns: IntArray) -> BoolArray:
        """Return what was found of the stretch that holds each time; not watched is not found."""
        out = np.zeros(time_ns.shape, dtype=bool)
        if self.time_ns.size:
            timed = time_ns != MISSING_NS
            row = np.searchsorted(self.time_ns, time_ns[timed], side="right")
            row = np.minimum(row, self.time_ns.size - 1)
            ahead = self.time_ns[row] - time_ns[timed]
            out[timed] = found[row] & (ahead > 0) & (ahead <= self.width_s * NS)
        return out

    def covers(self, this: Pass) -> bool:
        """Return whether any stretch touches a pass."""
        ends = [this.start_ns, this.stop_ns + round(self.width_s * NS)]
        return bool(np.ptp(np.searchsorted(self.time_ns, ends)))


def watch(study: Study, masks: Masks) -> Watch | None:
    """Return what watched the sky: a shortwave head, else the red and near-infrared pair.

    Of the pair, each head counts relative to the largest readings of its own day; these stand for
    `quality.full_light_w_m2`. None if no head looked up.
    """
    offered: dict[str, list[Channel]] = {}
    for channel in study.every_channel:
        offered.setdefault(channel.quantity, []).append(channel)
    for channel in offered.get("shortwave_down", []):
        time_ns, values = _open(study, masks, channel)
        if values.size:
            return _watch(study, channel.logger, time_ns, values)
    for red in offered.get("red_down", []):
        for nir in (c for c in offered.get("nir_down", []) if c.logger == red.logger):
            parts = [_open(study, masks, channel) for channel in (red, nir)]
            both, at_red, at_nir = np.intersect1d(
                parts[0][0], parts[1][0], assume_unique=True, return_indices=True)
            if both.size:
                light = study.quality.full_light_w_m2 * (
                    _relative(parts[0][1])[at_red] + _relative(parts[1][1])[at_nir]) / 2
                return _watch(study, red.logger, both, light)
    return None


def changed(sky: Watch, *, within_s: float, max_w_m2: float) -> BoolArray:
    """Return before which ends the irradiance changed by more than `max_w_m2` `within_s`.

    Change is the largest less the smallest median in that time.
    """
    first = np.searchsorted(sky.time_ns, sky.time_ns - round(within_s * NS))
    here = np.arange(sky.time_ns.size)
    return _range(sky.irradiance_w_m2, first, here + 1) > max_w_m2


def unsteady(sky: Watch, *, window_s: float, max_sd: float, max_rate_w_m2_s: float) -> BoolArray:
    """Return around which medians the irradiance scatters or drifts by more than the limits.

    Scatter is the standard deviation over the mean, drift the least-squares slope [W m-2 s-1] of
    the medians within `window_s`, at least three of them; fewer are not judged.
    """
    width_s = max(window_s, FEWEST * sky.width_s)
    half = round(width_s * NS / 2)
    first = np.searchsorted(sky.time_ns, sky.time_ns - half)
    last = np.searchsorted(sky.time_ns, sky.time_ns + half, side="right")
    out = np.zeros(sky.time_ns.shape, dtype=bool)
    for row in np.flatnonzero(last - first >= FEWEST):
        time_s = (sky.time_ns[first[row]:last[row]] - sky.time_ns[row]) / NS
        light = sky.irradiance_w_m2[first[row]:last[row]]
        about = time_s - time_s.mean()
        slope = float(about @ light / (about @ about))
        out[row] = light.std() > max_sd * light.mean() or abs(slope) > max_rate_w_m2_s
    return out


def _open(study: Study, masks: Masks, channel: Channel) -> tuple[IntArray, FloatArray]:
    """Return good readings of a head that looked at the sky: not covered, nor turned over.

    Within `passes.settle_time_constants` time constants of a dark reading a head says little.
    """
    log, settings = study.records[channel.logger], study.parameters.campaign.settings
    n = log.n_timed
    mask = masks[channel.logger][channel.column][:n] & ~BIT["sun too low"]
    values = log.channels[channel.column][:n]
    settle_s = settings.passes.settle_time_constants * (channel.time_constant_s or 0.0)
    capped = inside(log.time_ns[:n], [span for kind in ("dark", "cover") for span in windows(
        study.sheet, kind, channel.logger, channel.quantity)])
    good = (mask == 0) & ~capped & ~inside(log.time_ns[:n], _turned(study, channel))
    floor = (settings.albedo.min_down_w_m2 if channel.quantity == "shortwave_down"
             else settings.ndvi.min_down_share * _top(values[good]))
    with np.errstate(invalid="ignore"):
        dark = log.time_ns[:n][(values < floor) | capped]
    good &= nearest(log.time_ns[:n], dark, settle_s + ROUNDING_S) < 0
    return log.time_ns[:n][good], values[good]


def _turned(study: Study, channel: Channel) -> list[tuple[int, int]]:
    """Return when the pair of a head was turned over, with the time it took to turn it."""
    family = channel.quantity.partition("_")[0]
    loggers = {"", *(c.logger for c in study.every_channel if c.quantity.startswith(family))}
    product = PRODUCTS[family]
    return [(row.start_ns - around, row.stop_ns + around) for row in study.sheet.entries
            if row.entry == "swap" and row.instrument in loggers
            and row.quantity in ("", product) and not row.reading > 0  # inverted
            for around in [round((row.edge_u_s + TURNING_S) * NS)]]


def _watch(study: Study, logger: str, time_ns: IntArray, values: FloatArray) -> Watch:
    """Return medians; of stretches that hold at least half of the records due."""
    interval_s = study.records[logger].interval_s
    width_s = max(STRETCH_S, interval_s) if interval_s > 0 else STRETCH_S
    due = width_s / interval_s if interval_s > 0 else 1.0
    return Watch(*medians(time_ns, values, width_s, max(1, int(np.ceil(due / 2)))), width_s)


def _relative(values: FloatArray) -> FloatArray:
    return values / _top(values)


def _top(values: FloatArray) -> float:
    return float(np.quantile(values, CLEAR_MAXIMUM)) if values.size else 0.0


def _range(values: FloatArray, first: IntArray, stop: IntArray) -> FloatArray:
    """Return largest less smallest of values[first:stop], row by row."""
    if values.size == 0:
        return np.zeros(0)
    ends = np.stack([first, np.minimum(stop, values.size)], axis=1).ravel()
    padded = np.append(values, values[-1])
    return np.asarray(np.maximum.reduceat(padded, ends)[::2]
                      - np.minimum.reduceat(padded, ends)[::2])
