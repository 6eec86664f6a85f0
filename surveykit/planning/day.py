"""The plan of a survey day: sun, heights, walking, passes and the order of visits.

What a plan assumes where nothing better is known stands in `settings.planning`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from surveykit import pipeline
from surveykit.core import FloatArray
from surveykit.intake.params import Channel
from surveykit.opening import Survey, open_file
from surveykit.physics import footprint, walking
from surveykit.physics.sun import sun_track
from surveykit.planning.patches import Patch, offered, patches
from surveykit.statistics.pooling import passes_needed, paule_mandel

MINUTE_NS = 60_000_000_000
HEADS = {"contact": "brightness_temperature", "stand-off": "brightness_temperature",
         "longwave": "longwave_up", "albedo": "shortwave_up", "ndvi": "red_up"}
UNITS = {"temperature": "K", "albedo": "1", "ndvi": "1"}
LOWEST_SUN_DEG = 80.0  # from the zenith: lower, the beam's shade has no end on the ground


@dataclass(frozen=True)
class Plan:
    """A plan as tables: sun windows, course of the sun, heights, height curves, passes."""

    patches: tuple[Patch, ...]
    source: str
    course: pd.DataFrame
    windows: pd.DataFrame
    heights: pd.DataFrame
    curves: pd.DataFrame
    passes: pd.DataFrame


def make(survey: Survey) -> Plan:
    """Return the plan of a campaign; its logs and its filled field sheet need not be there."""
    found, source = patches(survey)
    course = sun_course(survey)
    windows = sun_windows(course, survey)
    zenith = float(course["zenith_deg"].min())
    before = earlier(survey)
    heights, curves = _heights(survey, found, zenith, before)
    return Plan(found, source, course, windows, heights, curves, passes(survey, before))


def earlier(survey: Survey) -> tuple[str, pipeline.Tables]:
    """Return name and tables of the last earlier campaign; "" and none where there is none."""
    for path in survey.parameters.earlier[-1:]:
        one = open_file(path)
        return one.campaign.campaign, pipeline.surfaces(one).tables
    return "", {}


def sun_course(survey: Survey) -> pd.DataFrame:
    """Return the sun's zenith angle in each minute of the campaign's day at the site."""
    site = survey.campaign.site
    midnight = pd.Timestamp(survey.campaign.date).tz_localize(
        site.time_zone, nonexistent="shift_forward", ambiguous=True)
    minutes = midnight.value + np.arange(24 * 60, dtype=np.int64) * MINUTE_NS
    track = sun_track(minutes, site.latitude, site.longitude, site.elevation_m)
    return pd.DataFrame({"time_utc": pd.to_datetime(minutes, utc=True),
                         "zenith_deg": track.zenith_deg})


def sun_windows(course: pd.DataFrame, survey: Survey) -> pd.DataFrame:
    """Return for each limit of the zenith angle when the sun is inside it.

    Columns: limit_deg, meaning, first, last (site time; "never" and "" where it is not), hours.
    """
    albedo, ndvi = survey.campaign.settings.albedo, survey.campaign.settings.ndvi
    limits: dict[float, list[str]] = {}
    for limit, meaning in ((albedo.zenith_standard_deg, "albedo, standard"),
                           (albedo.zenith_qualified_deg, "albedo, qualified"),
                           (albedo.zenith_max_deg, "albedo, the last usable"),
                           (ndvi.zenith_max_deg, "NDVI, the last usable")):
        limits.setdefault(limit, []).append(meaning)
    rows = []
    zone = survey.campaign.site.time_zone
    for limit, meanings in sorted(limits.items()):
        inside = course.loc[course["zenith_deg"] <= limit, "time_utc"]
        ends = [f"{t.tz_convert(zone):%H:%M}" for t in inside.iloc[[0, -1]]] if len(inside) else []
        rows.append({"limit_deg": limit, "meaning": "; ".join(meanings),
                     "first": ends[0] if ends else "never",
                     "last": ends[1] if ends else "", "hours": round(len(inside) / 60, 1)})
    return pd.DataFrame(rows)


def _heights(survey: Survey, found: tuple[Patch, ...], zenith_deg: float,
             before: tuple[str, pipeline.Tables]) -> tuple[pd.DataFrame, pd.DataFrame]:
    rows: list[dict[str, object]] = []
    curves: list[pd.DataFrame] = []
    for patch in found:
        for head in patch.heads:
            channel = _channel(survey, HEADS[head])
            if channel is None or head == "contact":
                continue
            contrast = _contrast(survey, patch, before[1].get("surfaces"))
            row, curve = _height(survey, patch, head, channel, zenith_deg, contrast)
            rows.append({"surface": patch.surface, "patch": patch.name, "reading": head} | row)
            if curve is not None and all(c["across_m"].iloc[0] != patch.across_m for c in curves):
                curves.append(curve.assign(patch=patch.name, across_m=patch.across_m))
    frame = pd.DataFrame(rows)
    return frame, pd.concat(curves, ignore_index=True) if curves else pd.DataFrame()


def _height(survey: Survey, patch: Patch, head: str, channel: Channel, zenith_deg: float,
            contrast: float) -> tuple[dict[str, object], pd.DataFrame | None]:
    """Return the row of one patch and head, and for albedo the curve of errors over height."""
    across, half_angle = patch.across_m, channel.half_angle_deg or 90.0
    view_angle = channel.view_angle_deg or 0.0
    planning = survey.campaign.settings.planning
    if not np.isfinite(across):
        return {"height_m": np.nan, "note": "the patch's size is not known"}, None
    if view_angle and view_angle + half_angle >= 90:
        return {"height_m": np.nan, "note": "the head looks above the horizon"}, None
    curve, note = None, ""
    if head == "albedo":
        settings = survey.campaign.settings.albedo
        radius = channel.head_radius_m or settings.head_radius_assumed_cm / 100
        note = "" if channel.head_radius_m else "the head's radius is assumed"
        optics = (radius, across / 2, contrast, min(zenith_deg, LOWEST_SUN_DEG),
                  settings.beam_fraction)
        height = footprint.best_height_m(*optics)
        curve = _curve(*optics)
    elif half_angle >= 89.9:
        height = across / 2 / walking.RADII_FOR_90
    else:
        height = walking.spot_height_m(across, half_angle, planning.spot_share, view_angle)
    height = min(height, planning.reach_m)
    wide = walking.footprint_m(height, half_angle, view_angle)
    speed = walking.walking_speed_m_s(wide, channel.time_constant_s)
    return {"height_m": height, "footprint_m": wide,
            "margin_m": walking.edge_margin_m(across, wide),
            "lanes": walking.lanes(patch.width_m if np.isfinite(patch.width_m) else across, wide),
            "speed_m_s": min(speed, 1.0),
            "settle_s": walking.settling_time_s(1.0, planning.settled_share,
                                                channel.time_constant_s),
            "note": "; ".join(filter(None, (note, "stop and hold instead of walking"
                                            if speed < planning.hold_below_m_s else "")))}, curve


def _contrast(survey: Survey, patch: Patch, known: pd.DataFrame | None) -> float:
    """Relative contrast of a patch with what surrounds it, from the last earlier campaign."""
    around, planning = survey.campaign.surfaces[patch.surface].around, \
        survey.campaign.settings.planning
    if around is None or known is None:
        return planning.contrast
    own = known.loc[(known["surface"] == patch.surface) & (known["quantity"] == "albedo")
                    & (known["value"] > 0), "value"]
    return max(float(abs(around.amount.value / own.iloc[0] - 1)), planning.least_contrast) \
        if len(own) else planning.contrast


def _curve(radius: float, patch_radius: float, contrast: float, zenith_deg: float,
           beam_fraction: float) -> pd.DataFrame:
    height: FloatArray = np.geomspace(0.02, max(2 * patch_radius, 0.1), 80)
    shade = footprint.self_shade(radius, height, zenith_deg, beam_fraction)
    foreign = contrast * (1 - footprint.disc_share(patch_radius, height))
    curve = pd.DataFrame({"height_m": height, "shade": shade, "contamination": foreign,
                          "effect": shade + foreign, "role": ""})
    curve.loc[curve["effect"].idxmin(), "role"] = "best"
    return curve


def _channel(survey: Survey, quantity: str) -> Channel | None:
    for logger in survey.campaign.loggers:
        for channel in survey.parameters.channels(logger):
            if channel.quantity == quantity:
                return channel
    return None


def passes(survey: Survey, before: tuple[str, pipeline.Tables]) -> pd.DataFrame:
    """Return how many passes of a surface make U no wider than the relevant change.

    Columns: surface, quantity, kind, between, within (both standard deviations), wanted (U),
    passes, unit, source. U here is that of repeating alone; calibrations and emissivities come on
    top and do not shrink with passes.
    """
    wanted, rows = survey.campaign.relevant_change, []
    coverage = survey.campaign.settings.statistics.coverage
    told, planning = _spreads(*before), survey.campaign.settings.planning
    assumed = {"temperature": (planning.temperature_between_k, planning.temperature_within_k),
               "albedo": (planning.albedo_between, planning.albedo_within),
               "ndvi": (planning.ndvi_between, planning.ndvi_within)}
    for quantity in dict.fromkeys(head if head in assumed else "temperature"
                                  for head in offered(survey)):
        for surface in survey.campaign.surfaces:
            known = {k: v for k, v in told.items() if k[:2] == (surface, quantity)}
            for (_, _, kind), (between, within, source) in (known or {
                    (surface, quantity, ""): (*assumed[quantity], "settings")}).items():
                need = passes_needed(between, within, wanted.of(quantity), coverage)
                rows.append({"surface": surface, "quantity": quantity, "kind": kind,
                             "between": between, "within": within, "wanted": wanted.of(quantity),
                             "passes": need, "unit": UNITS[quantity], "source": source})
    return pd.DataFrame(rows)


def _spreads(name: str, before: pipeline.Tables
             ) -> dict[tuple[str, str, str], tuple[float, float, str]]:
    """Return the spread between and within passes that an earlier campaign showed."""
    out = {}
    if before:
        table = before["passes"].dropna(subset=["value", "u_within"])
        for (surface, quantity, kind), rows in table.groupby(["surface", "quantity", "kind"]):
            if len(rows) > 1:
                within = float(np.median(rows["u_within"]))
                tau2 = paule_mandel(rows["value"].to_numpy(), rows["u_within"].to_numpy())
                out[str(surface), str(quantity), str(kind)] = float(np.sqrt(tau2)), within, name
    return out
