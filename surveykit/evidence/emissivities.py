"""The emissivity of a surface: stated, or measured on the day."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from surveykit.core import Input
from surveykit.evidence.backgrounds import surroundings, window_of
from surveykit.evidence.conditions import NS, Day, Sky
from surveykit.evidence.models import background
from surveykit.evidence.parts import BANDS, NotEvaluated, series, surface_scope
from surveykit.intake.params import Channel
from surveykit.intake.params.sections import Emissivity
from surveykit.intake.sheet_words import Entry
from surveykit.physics.emissivity import (
    emissivity_of_pair,
    emissivity_of_pair_u,
    emissivity_of_two_backgrounds,
)
from surveykit.physics.vegetation import emissivity_mixed, ndvi_of_sums, vegetation_fraction

WIDE = 1.96  # half-width of 95 % of a normal distribution
NOT_FOR = "never for synthetic turf, paint, metal, water or wet ground"
LID_REACH_S = 30.0  # between the readings below a lid and below the sky
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
    if not settings_allow(day, value):
        raise NotEvaluated(f"the measured emissivity is {value:.2f}, outside what is supported")
    return Input("emissivity", min(value, 1.0), u, f"{day.name}:emissivity:{surface}:{how}",
                 f"emissivity measured on the day ({how.replace('_', ' ')}, {len(far)} readings, "
                 f"contrast {np.mean([abs(p.contrast_k) for p in far]):.0f} K)"), (
                     f"emissivity measured: {value:.3f}, half-width {u * WIDE:.3f}",)


def settings_allow(day: Day, emissivity: float) -> bool:
    """Return whether an emissivity is credible and not that of bare metal."""
    return day.parameters.campaign.settings.temperature.min_emissivity <= emissivity <= 1.03


def _pair(day: Day, entry: Entry, channel: Channel, sky: Sky) -> Pair | None:
    """Compare the reading of a spot with a reference thermometer's."""
    seen = _seen(day, channel, entry.start_ns, entry.stop_ns, entry.edge_u_s)
    if seen is None:
        return None
    window = window_of(channel)
    inputs, _ = surroundings(day, entry, sky, channel)
    values = {name: i.value for name, i in inputs.items()}
    around = float(background(values, window))
    moved = [float(background(values | {i.name: i.value + i.u}, window)) - around
             for i in inputs.values() if i.u > 0]
    known = entry.reading + 273.15
    u = emissivity_of_pair_u(
        window, seen, known, around, u_brightness_k=channel.u_offset,
        u_surface_k=entry.reading_u, u_background=float(np.linalg.norm(moved)))
    return Pair(float(emissivity_of_pair(window, seen, known, around)), u,
                known - float(window.temperature_k(around)))


def _lid(day: Day, entry: Entry, channel: Channel, sky: Sky) -> Pair | None:
    """Compare the reading below a lid with that below the sky just before."""
    settings = day.parameters.campaign.settings.temperature
    below = _seen(day, channel, entry.start_ns, entry.stop_ns, entry.edge_u_s)
    open_sky = _seen(day, channel, entry.start_ns - round(LID_REACH_S * NS), entry.start_ns,
                     entry.edge_u_s)
    if below is None or open_sky is None:
        return None
    window = window_of(channel)
    inputs, _ = surroundings(day, entry, sky, channel)
    values = {name: i.value for name, i in inputs.items()}
    around = float(background(values, window))
    lid_k = entry.reading + 273.15
    u_lid = entry.reading_u if np.isfinite(entry.reading_u) else settings.lid_u_k
    known = [float(window.radiance(open_sky)), float(window.radiance(below)), around,
             float(window.radiance(lid_k))]
    errors = [float(window.radiance(open_sky + 0.1)) - known[0],
              float(window.radiance(below + 0.1)) - known[1],
              float(np.linalg.norm([float(background(values | {i.name: i.value + i.u}, window))
                                    - around for i in inputs.values() if i.u > 0])),
              float(window.radiance(lid_k + u_lid)) - known[3]]
    value = float(emissivity_of_two_backgrounds(*known))
    moves = [float(emissivity_of_two_backgrounds(*(
        k + e * (n == place) for n, k in enumerate(known)))) - value
        for place, e in enumerate(errors)]
    return Pair(value, float(np.linalg.norm(moves)),
                lid_k - float(window.temperature_k(around)))


def _seen(day: Day, channel: Channel, start_ns: int, stop_ns: int,
          edge_u_s: float) -> float | None:
    if channel.emissivity_setting != 1.0:
        return None  # no brightness: the instrument has corrected it in its own way
    edge = round((min(edge_u_s, (stop_ns - start_ns) / NS / 4) + 5 * channel.time_constant_s) * NS)
    _, value = day.readings(channel, start_ns + edge, stop_ns - edge)
    return float(value.mean()) if value.size else None


def _from_ndvi(day: Day, surface: str, entry: Emissivity) -> Found:
    """Return the emissivity of vegetated ground from the day's NDVI of the surface."""
    limits = day.parameters.campaign.settings.ndvi
    found = []
    for this in day.passes:
        records = day.quality.passes.get(this.name)
        if this.surface == surface and this.quantity == "ndvi" and records is not None \
                and not records.refusal:
            found.append(ndvi_of_sums(*(series(day, this, name)[1] for name in BANDS)))
    if not found:
        raise NotEvaluated(f"surfaces.{surface}.emissivity is to come from NDVI, and no pass of "
                           "ndvi on it can be used")
    index = float(np.mean(found))
    form = entry.form or "linear"
    ends = limits.bare_ndvi, limits.full_ndvi
    share = float(vegetation_fraction(index, *ends, form))
    steps = [float(vegetation_fraction(index, ends[0] + limits.cover_ndvi_u, ends[1], form)),
             float(vegetation_fraction(index, ends[0], ends[1] + limits.cover_ndvi_u, form))]
    vegetation, soil = float(entry.vegetation or 0.0), float(entry.soil or 0.0)
    u = float(np.linalg.norm([float(entry.u or 0.0),
                              *((step - share) * (vegetation - soil) for step in steps)]))
    flags: tuple[str, ...] = (f"emissivity from NDVI ({form} vegetation fraction): {NOT_FOR}",)
    if not ends[0] <= index <= ends[1]:
        flags += ("NDVI outside the range of the vegetation fraction",)
    return Input("emissivity", float(emissivity_mixed(share, vegetation, soil)), u,
                 f"{day.name}:emissivity:{surface}:ndvi",
                 f"emissivity from NDVI {index:.2f} ({form} vegetation fraction)"), flags
