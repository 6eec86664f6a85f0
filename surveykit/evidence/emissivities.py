"""The emissivity of a surface: stated, or measured on the day."""

from __future__ import annotations

from contextlib import suppress
from functools import partial
from typing import NamedTuple

import numpy as np

from surveykit.core import FloatArray, Input
from surveykit.evidence.backgrounds import surroundings
from surveykit.evidence.brightness import seen_between, seen_in, settled_part, window_of
from surveykit.evidence.conditions import NS, Day, Sky
from surveykit.evidence.models import background
from surveykit.evidence.parts import HALF_WIDTH, NotEvaluated, surface_scope
from surveykit.evidence.vegetation import vegetation_index
from surveykit.intake.params import Channel
from surveykit.intake.params.sections import Emissivity
from surveykit.intake.sheet_words import Entry
from surveykit.physics.bands import Band
from surveykit.physics.emissivity import emissivity_of_pair, emissivity_of_two_backgrounds
from surveykit.physics.propagation import combined_u
from surveykit.physics.vegetation import (
    emissivity_logarithmic,
    emissivity_mixed,
    vegetation_fraction,
)

MOST = 1.03  # of a measured emissivity that is credible
WIDE = 1.96  # half-width of 95 % of a normal distribution
NOT_FOR = "never for synthetic turf, paint, metal, water or wet ground"
OPEN_S = 30.0  # before a lid is put on: shows how fast the ground's temperature moves
Found = tuple[Input, tuple[str, ...]]


class Pair(NamedTuple):
    """One measured emissivity, its u, and the contrast of ground and background [K]."""

    value: float
    u: float
    contrast_k: float


def surface_emissivity(day: Day, surface: str, channel: Channel, sky: Sky) -> Found:
    """Return a surface's emissivity in the head's band, and flags.

    Raises
    ------
    NotEvaluated
        If it is neither stated nor measured well enough.
    """
    entry = day.parameters.campaign.surfaces[surface].emissivity
    if entry is None:
        raise NotEvaluated(f"surfaces.{surface}.emissivity is missing")
    if entry.from_ == "ndvi":
        return _from_ndvi(day, surface, entry)
    if entry.from_ is not None:
        return _measured(day, surface, channel, sky, entry.from_)
    return Input("emissivity", float(entry.value or 0.0), float(entry.u or 0.0),
                 surface_scope("emissivity", surface, entry),
                 f"emissivity of the surface ({entry.source})"), ()


def _measured(day: Day, surface: str, channel: Channel, sky: Sky, how: str) -> Found:
    settings = day.parameters.campaign.settings.temperature
    make, row = (_pair, "reference") if how == "reference_pairs" else (_lid, "lid")
    entries = [e for e in day.sheet.entries if e.entry == row and e.surface == surface
               and e.instrument in ("", channel.logger)]
    found = [p for p in (make(day, e, channel, sky) for e in entries) if p is not None]
    if not found:
        raise NotEvaluated(f"surfaces.{surface}.emissivity is to come from {row} rows, and the "
                           "sheet has none with readings")
    far = [p for p in found if abs(p.contrast_k) >= settings.pair_min_contrast_k]
    if not far:
        best = max(abs(p.contrast_k) for p in found)
        raise NotEvaluated(
            f"emissivity cannot be measured here: ground and background differ by {best:.0f} K, "
            f"less than {settings.pair_min_contrast_k:g} (so close it hardly matters: state one)")
    values, own = np.array([p.value for p in far]), np.array([p.u for p in far])
    # the thermometer and the background are common to the pairs: their u does not average out
    u = float(np.hypot(own.mean(), values.std(ddof=1) / np.sqrt(values.size)
                       if values.size > 1 else 0.0))
    value = float(values.mean())
    if u * WIDE > settings.pair_max_half_width:
        raise NotEvaluated(
            f"emissivity is known to {u * WIDE:.2f} only from {len(far)} readings at "
            f"{np.mean([p.contrast_k for p in far]):.0f} K contrast, more than "
            f"{settings.pair_max_half_width:g}")
    if not settings.min_emissivity <= value <= MOST:
        raise NotEvaluated(f"the measured emissivity is {value:.2f}, outside what is supported")
    return Input("emissivity", min(value, 1.0), u, f"{day.name}:emissivity:{surface}:{how}",
                 f"emissivity measured on the day ({how.replace('_', ' ')}, {len(far)} readings, "
                 f"contrast {np.mean([abs(p.contrast_k) for p in far]):.0f} K)"), (
                     f"emissivity measured: {value:.3f}, half-width {u * WIDE:.3f}",)


def _around(day: Day, row: Entry, sky: Sky, channel: Channel) -> tuple[Band, float, float]:
    """Return the head's band, and what falls on the ground in it [W m-2 sr-1] with its u."""
    window = window_of(channel)
    inputs = surroundings(day, row, sky, channel)[0].values()
    values, us = [i.value for i in inputs], [i.u for i in inputs]

    def falls(*some: float) -> FloatArray:
        return background(dict(zip((i.name for i in inputs), some, strict=True)), window)

    return window, float(falls(*values)), combined_u(falls, values, us)


def _pair(day: Day, entry: Entry, channel: Channel, sky: Sky) -> Pair | None:
    """Compare the reading of a spot with a reference thermometer's."""
    seen = seen_in(day, channel, entry)
    if seen is None:
        return None
    window, around, u_around = _around(day, entry, sky, channel)
    known = seen, entry.reading + 273.15, around
    u = combined_u(partial(emissivity_of_pair, window), known,
                   (channel.u_offset, entry.reading_u, u_around))
    return Pair(float(emissivity_of_pair(window, *known)), u,
                known[1] - float(window.temperature_k(around)))


def _lid(day: Day, entry: Entry, channel: Channel, sky: Sky) -> Pair | None:
    """Compare the readings just after a lid was put on with those below the sky just before.

    The ground itself must not move in between: the faster of the rates seen before and below the
    lid, over the time between the two readings, is allowed as a rectangular error.
    """
    settings = day.parameters.campaign.settings.temperature
    start, stop = settled_part(day, channel, entry)
    on = 2 * entry.start_ns - start  # as long before as the head needs after, edges and all
    lidded = seen_between(day, channel, entry, start, stop)
    before = seen_between(day, channel, entry, on - round(OPEN_S * NS), on)
    near = [seen[(time >= at) & (time < at + settings.lid_span_s)] for (time, seen), at in (
        (before, (on - entry.start_ns) / NS - settings.lid_span_s),
        (lidded, (start - entry.start_ns) / NS))]
    if not near[0].size or not near[1].size:
        return None
    open_sky, below = (float(seen.mean()) for seen in near)
    moved = max(abs(_rate(*before)), abs(_rate(*lidded))) * (
        (start - on) / NS + settings.lid_span_s)
    window, around, u_around = _around(day, entry, sky, channel)

    def found(open_k: float, below_k: float, around: float, lid_k: float) -> FloatArray:
        first, second, lid = (window.radiance(t) for t in (open_k, below_k, lid_k))
        return emissivity_of_two_backgrounds(first, second, around, lid)

    u_lid = entry.reading_u if np.isfinite(entry.reading_u) else settings.lid_u_k
    known = open_sky, below, around, entry.reading + 273.15
    us = (settings.lid_reading_u_k, float(np.hypot(settings.lid_reading_u_k, moved * HALF_WIDTH)),
          u_around, u_lid)
    return Pair(float(found(*known)), combined_u(found, known, us),
                known[3] - float(window.temperature_k(around)))


def _rate(time_s: FloatArray, seen_k: FloatArray) -> float:
    """Return the rate of readings [K s-1]; 0 for fewer than three."""
    return float(np.polyfit(time_s, seen_k, 1)[0]) if seen_k.size > 2 else 0.0


def _from_ndvi(day: Day, surface: str, entry: Emissivity) -> Found:
    """Return the emissivity of vegetated ground from the day's NDVI of the surface."""
    limits = day.parameters.campaign.settings.ndvi
    found = []
    for this in day.passes:
        records = day.quality.passes.get(this.name)
        if this.surface == surface and this.quantity == "ndvi" and records is not None \
                and not records.refusal:
            with suppress(NotEvaluated):
                found.append(vegetation_index(day, this, day.sky(this.start_ns,
                                                                 this.stop_ns)).value)
    if not found:
        raise NotEvaluated(f"surfaces.{surface}.emissivity is to come from NDVI, and no pass of "
                           "ndvi on it can be used")
    index = float(np.mean(found))
    form, u = entry.form or "linear", float(entry.u or 0.0)
    if form == "logarithmic":
        value = float(emissivity_logarithmic(index))
        if np.isnan(value):
            raise NotEvaluated(f"NDVI {index:.2f} lies outside .157 to .727, where the emissivity "
                               "logarithmic in NDVI was measured")
        return Input("emissivity", value, u, f"{day.name}:emissivity:{surface}:ndvi",
                     f"emissivity from NDVI {index:.2f} (logarithmic)"), (
                         f"emissivity from NDVI (logarithmic): {NOT_FOR}",)
    ends = limits.bare_ndvi, limits.full_ndvi

    def mixed(low: float, high: float) -> FloatArray:
        share = vegetation_fraction(index, low, high, form)
        return emissivity_mixed(share, float(entry.vegetation or 0.0), float(entry.soil or 0.0))

    u = float(np.hypot(u, combined_u(mixed, ends, [limits.cover_ndvi_u] * 2)))
    flags: tuple[str, ...] = (f"emissivity from NDVI ({form} vegetation fraction): {NOT_FOR}",)
    if not ends[0] <= index <= ends[1]:
        flags += ("NDVI outside the range of the vegetation fraction",)
    return Input("emissivity", float(mixed(*ends)), u,
                 f"{day.name}:emissivity:{surface}:ndvi",
                 f"emissivity from NDVI {index:.2f} ({form} vegetation fraction)"), flags
