"""What the day was like during a pass: weather, irradiance, sky, dark readings of the heads."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from surveykit.accounting import BIT, NS, Quality
from surveykit.core import FloatArray, Input, IntArray
from surveykit.intake.capped import windows
from surveykit.intake.fieldsheet import Sheet
from surveykit.intake.loggers import Records
from surveykit.intake.params import Channel, Parameters
from surveykit.intake.passes import Pass
from surveykit.intake.sheet_words import Entry
from surveykit.physics.sun import Sun, sun_track
from surveykit.statistics.series import mean_of_series

Span = Pass | Entry  # a stretch of time from start_ns to stop_ns


@dataclass(frozen=True)
class Dark:
    """Dark readings of one channel: times, means, the u of what is subtracted, their scatter."""

    time_ns: FloatArray
    value: FloatArray
    u: float
    sd: float


@dataclass(frozen=True)
class Sky:
    """Irradiance [W m-2], clear index [1] and class of a stretch of time.

    `kind` is clear, diffuse, mixed, or "" where no shortwave head watched the sky.
    """

    irradiance_w_m2: float = float("nan")
    clear_index: float = float("nan")
    kind: str = ""


@dataclass(frozen=True)
class Day:
    """Everything that the estimates of one campaign draw upon."""

    parameters: Parameters
    records: dict[str, Records]
    sheet: Sheet
    quality: Quality
    passes: tuple[Pass, ...] = ()

    @property
    def name(self) -> str:
        """Name of the campaign; the first part of the scope ids that belong to this day."""
        return self.parameters.campaign.campaign

    @cached_property
    def channels(self) -> dict[str, list[Channel]]:
        """Channels of the campaign's loggers by quantity, in the order of the loggers."""
        out: dict[str, list[Channel]] = {}
        for logger in self.records:
            for channel in self.parameters.channels(logger):
                out.setdefault(channel.quantity, []).append(channel)
        return out

    def readings(self, channel: Channel, start_ns: int, stop_ns: int,
                 *, through: tuple[str, ...] = ()) -> tuple[IntArray, FloatArray]:
        """Return time [ns] and good readings [SI] of a channel within a stretch of time.

        Readings marked for the reasons `through` and no other count as good.
        """
        log = self.records[channel.logger]
        first, last = np.searchsorted(log.time_ns[:log.n_timed], [start_ns, stop_ns])
        mask = self.quality.masks[channel.logger][channel.column][first:last]
        for reason in through:
            mask = mask & ~BIT[reason]
        good = mask == 0
        return log.time_ns[first:last][good], log.channels[channel.column][first:last][good]

    def weather(self, quantity: str, this: Span) -> Input | None:
        """Return a weather quantity [SI] during a pass, or None where nothing tells it.

        Logged readings inside the pass are averaged; otherwise the neighbours are interpolated,
        never beyond the first and last by more than `temperature.weather_reach_s`.
        """
        reach = int(self.parameters.campaign.settings.temperature.weather_reach_s * NS)
        middle = (this.start_ns + this.stop_ns) / 2
        for channel in self.channels.get(quantity, []):
            time, value = self.readings(channel, this.start_ns - reach, this.stop_ns + reach)
            during = (time >= this.start_ns) & (time < this.stop_ns)
            if time.size:
                mean = float(value[during].mean() if during.any()
                             else np.interp(middle, time, value))
                scaled = channel.u_gain * (mean - channel.offset.value)
                u = float(np.hypot(channel.u_offset, scaled))
                return Input(quantity, mean, u, channel.offset_scope,
                             f"{quantity.replace('_', ' ')}, logged")
        rows = [e for e in self.sheet.entries if e.entry == "weather" and e.quantity == quantity]
        if not rows:
            return None
        time = np.array([e.start_ns for e in rows], dtype=np.float64)
        if not time[0] - reach <= middle <= time[-1] + reach:
            return None
        read = float(np.interp(middle, time, [e.reading for e in rows]))
        u = max(e.reading_u for e in rows)
        return Input(quantity, read, u, f"{self.name}:hand-read {quantity}",
                     f"{quantity.replace('_', ' ')}, read by hand")

    def dark(self, channel: Channel) -> Dark | None:
        """Return the channel's dark readings (sheet rows `dark`), or None where there is none.

        Their uncertainty holds the scatter within the rows and, as a rectangular distribution,
        the whole course between them.
        """
        times, means, errors, scatter = [], [], [], []
        for start, stop in windows(self.sheet, "dark", channel.logger, channel.quantity,
                                   certain=True):
            time, value = self.readings(
                channel, start, stop,
                through=("capped", "sun too low", "too little light", "out of range"))
            if time.size >= 2:
                times.append(float(time.mean()))
                means.append(float(np.median(value)))
                errors.append(mean_of_series(value, unit=channel.unit, method="dark").u)
                scatter.append(float(value.std()))
        if not times:
            return None
        order = np.argsort(times)
        spread = float(np.ptp(means)) / np.sqrt(12.0)
        return Dark(np.array(times)[order], np.array(means)[order],
                    float(np.hypot(np.mean(errors), spread)), float(np.mean(scatter)))

    def without_dark(self, channel: Channel, time_ns: IntArray,
                     values: FloatArray) -> FloatArray:
        """Return readings with the interpolated dark reading of the head taken off."""
        dark = self.darks[channel.logger, channel.column]
        if dark is None:
            return values
        return values - np.interp(time_ns, dark.time_ns, dark.value)

    @cached_property
    def darks(self) -> dict[tuple[str, str], Dark | None]:
        """Dark readings of every channel, found once."""
        return {(c.logger, c.column): self.dark(c)
                for some in self.channels.values() for c in some}

    @cached_property
    def largest(self) -> dict[tuple[str, str], float]:
        """Largest good reading [SI] of a channel in the day's passes, dark taken off; 0 if none.

        Readings over a panel or with the heads exchanged lie outside passes and do not count.
        """
        out: dict[tuple[str, str], float] = {}
        for this in self.passes:
            for channel in this.channels.values():
                place = channel.logger, channel.column
                time, value = self.readings(channel, this.start_ns, this.stop_ns)
                good = self.without_dark(channel, time, value)
                out[place] = float(good.max(initial=out.get(place, 0.0)))
        return out

    def sun(self, time_ns: IntArray) -> Sun:
        """Return the sun's track at the site."""
        site = self.parameters.campaign.site
        return sun_track(time_ns, site.latitude, site.longitude, site.elevation_m)

    def sky(self, start_ns: int, stop_ns: int) -> Sky:
        """Return irradiance and sky class of a stretch: how much of a clear sky, how steady.

        clear: `quality.clear_index_min` to `clear_index_max` of the modelled sky, steady within
        `quality.steady_max` (half the middle 68 %, so that a hand over the head for a few seconds
        does not make a cloud); diffuse: at most `overcast_index_max`.
        """
        quality = self.parameters.campaign.settings.quality
        for channel in self.channels.get("shortwave_down", []):
            time, value = self.readings(channel, start_ns, stop_ns, through=("sun too low",))
            if time.size < 2:
                continue
            value = self.without_dark(channel, time, value)
            model = self.sun(time).clear_sky_w_m2
            if not model.min() > 0:
                continue
            low, index, high = np.quantile(value / model, [0.16, 0.5, 0.84])
            steady = high - low <= 2 * quality.steady_max * index
            kind = "mixed"
            if quality.clear_index_min <= index <= quality.clear_index_max and steady:
                kind = "clear"
            elif index <= quality.overcast_index_max:
                kind = "diffuse"
            return Sky(float(value.mean()), float(index), kind)
        return Sky()
