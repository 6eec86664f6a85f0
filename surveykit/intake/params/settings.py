"""Every default of the method, by section, and the listing of them for the report."""

from __future__ import annotations

from typing import Any, Literal, TypedDict

from pydantic import BaseModel

from surveykit.intake.params.base import Fault, Strict, key
from surveykit.intake.params.defaults import (
    MEMORY,
    STANDARD,
    AlbedoSettings,
    NdviSettings,
    TemperatureSettings,
    rising,
    setting,
)
from surveykit.intake.params.quality import QualitySettings

GUM = "JCGM 100:2008 (GUM)"


class ClockSettings(Strict):
    """Clocks of the loggers and of the field sheet."""

    unchecked_u_s: float = setting(
        2.0, "s", "Standard uncertainty of a clock nobody checked.", ge=0)
    cover_u_s: float = setting(
        1.0, "s", "Standard uncertainty of a written time at which the heads were covered.", gt=0)
    search_s: float = setting(
        120.0, "s", "How far from its stated offset a clock is searched for.", gt=0, le=43200)
    cover_contrast: float = setting(
        5.0, "1", "Least change of level under a cover, in standard deviations of the readings.",
        gt=0)
    min_events: int = setting(
        2, "1", "Covers needed for each stretch between two resets of a clock.", ge=2)
    max_residual_u: float = setting(
        3.0, "1", "Largest distance of an event from the line, in its own uncertainties.", gt=0)
    max_residual_s: float = setting(
        1.0, "s", "Largest distance from the line of an event that two loggers saw.", gt=0)
    max_drift_ppm: float = setting(200.0, "ppm", "Largest credible drift of a clock.", gt=0)
    max_offset_s: float = setting(
        43200.0, "s", "Largest credible offset; more is a wrong date or zone.", gt=0)
    extrapolate: float = setting(
        0.10, "1", "Reach beyond the first and last event, as a share of their span, from which a "
        "pass is flagged.", ge=0)
    jump_s: float = setting(
        3600.0, "s", "Gap between records after which a clock may have been set anew.", gt=0)
    min_peak: float = setting(
        0.3, "1", "Least correlation of two signals that aligns their clocks.", gt=0, lt=1)
    max_second: float = setting(
        0.5, "1", "Largest second peak of the correlation, as a share of the first.", gt=0, lt=1)
    max_halves_s: float = setting(
        1.0, "s", "Largest difference of the lags of the two halves of the records.", gt=0)
    crosscheck_s: float = setting(
        900.0, "s", "How far clocks of loggers under one sky are checked against each other.",
        gt=0, le=43200)
    sun_shift_min: float = setting(
        25.0, "min", "Shift against the clear sky from which time or place is wrong.", gt=0)


class PassSettings(Strict):
    """Timed coverages."""

    sheet_u_s: float = setting(5.0, "s", "Standard uncertainty of a written time.", ge=0)
    sheet_minutes_u_s: float = setting(
        60.0, "s", "Standard uncertainty of a time written without seconds.", ge=0)
    min_duration_s: float = setting(
        30.0, "s", "Shortest pass after its ends are trimmed.", gt=0)
    settle_time_constants: float = setting(
        5.0, "1", "Time constants dropped after a head is placed.", ge=0)
    edge_u: float = setting(
        3.0, "1", "Distance of the readings' own edge from the written one, in its standard "
        "uncertainties, that is flagged.", gt=0)
    edge_contrast: float = setting(
        5.0, "1", "Least change of level that counts as an edge, in standard deviations.", gt=0)
    exclude_turns: bool = setting(
        True, "1", "Whether records in the turns between lanes are left out, where lanes are "
        "written. They count neither as faults nor in the whole of which excluded_flag and "
        "excluded_refuse are shares.")
    turn_s: float = setting(
        1.0, "s", "Left out on each side of a turn, besides three time constants.", ge=0)
    pace_u: float = setting(
        0.05, "1", "Standard uncertainty of the pace along a lane, relative.", ge=0)


class StatisticsSettings(Strict):
    """Draws and intervals."""

    between_passes: Literal["own", "common"] = key(
        "Scatter between passes: each surface's own, or one common to all surfaces of a quantity; "
        "declare it before the run.", default="own", write="own or common",
        extra={"unit": "1", "origin": "engineering default", "source": "engineering default"})
    seed: int = setting(20251, "1", "Seed of the draws.", ge=0, le=10**9)
    draws: int = setting(
        20000, "1", "Monte Carlo draws of each shared error; 200000 for a final report.",
        ge=1000, le=1_000_000)
    stable_digits: int = setting(
        0, "1", "Significant digits of u that the ends of the surfaces' intervals must hold: draws "
        "are doubled until they do, up to 400000; 0: the draws as stated.", STANDARD,
        "JCGM 101:2008, 7.9", ge=0, le=2)
    coverage: float = setting(
        0.95, "1", "Coverage probability of the intervals.", STANDARD, GUM, gt=0.5, lt=1)
    few_effective: float = setting(
        10.0, "1", "Effective records below which a pass is flagged.", ge=1)
    variogram_pairs: int = setting(
        30, "1", "Least pairs of records at a distance that take part in the ground's pattern.",
        ge=1)


class ComparisonSettings(Strict):
    """When two dates can be compared."""

    cos_zenith_match: float = setting(
        0.05, "1", "Largest difference in the cosine of the zenith angle.", gt=0)
    irradiance_match: float = setting(
        0.10, "1", "Largest relative difference in irradiance.", gt=0)
    wind_match_m_s: float = setting(1.0, "m s-1", "Largest difference in wind speed.", gt=0)
    rain_max_mm: float = setting(
        0.0, "mm", "Rain in the last 48 h up to which dates are matched.", ge=0)
    wet_rain_mm: float = setting(
        1.0, "mm", "Rain in the last 48 h above which the ground is wet: not comparable.", ge=0)
    min_control_excess_k: float = setting(
        8.0, "K", "Least excess of the control over the air.", gt=0)
    model_u_matched: float = setting(
        0.01, "1", "Model-form uncertainty, share of the control's excess, matched dates.", ge=0)
    model_u_partly: float = setting(
        0.02, "1", "The same, partly matched dates.", ge=0)
    vegetated_ndvi: float = setting(
        0.3, "1", "NDVI above which the model-form uncertainty is doubled: plants evaporate.",
        ge=-1, le=1)
    course_form_u: float = setting(
        0.3, "1", "Standard uncertainty of a correction for the day's course, relative: another "
        "ground need not follow the control.", ge=0, le=1)
    drift_per_year: float = setting(
        0.015, "1", "Relative change of an instrument in a year.", ge=0)
    zenith_dependence: float = setting(
        0.1, "1", "Zenith dependence d of the albedo.", MEMORY,
        "Briegleb et al. 1986, weak dependence", ge=0, le=1)

    def faults(self) -> list[Fault]:
        """Limits of rain and of the model's uncertainty rise."""
        return [*rising(self, "rain_max_mm", "wet_rain_mm"),
                *rising(self, "model_u_matched", "model_u_partly")]


class PlanningSettings(Strict):
    """What a plan assumes before the day."""

    temperature_between_k: float = setting(
        0.5, "K", "Standard deviation between passes where no earlier campaign tells it.", ge=0)
    temperature_within_k: float = setting(
        0.3, "K", "Standard uncertainty within a pass where no earlier campaign tells it.", gt=0)
    albedo_between: float = setting(0.01, "1", "The same between passes, of albedo.", ge=0)
    albedo_within: float = setting(0.005, "1", "The same within a pass, of albedo.", gt=0)
    ndvi_between: float = setting(0.01, "1", "The same between passes, of NDVI.", ge=0)
    ndvi_within: float = setting(0.005, "1", "The same within a pass, of NDVI.", gt=0)
    reach_m: float = setting(
        1.0, "m", "Greatest height at which a hand-held pole carries a head level.", gt=0)
    contrast: float = setting(
        0.5, "1", "Relative contrast of albedo between a patch and what surrounds it, where "
        "neither is known.", gt=0)
    least_contrast: float = setting(
        0.05, "1", "Contrast below which a head is not lifted any further.", gt=0)
    spot_share: float = setting(
        0.33, "1", "Largest spot of an infrared head, as a share of the patch.", gt=0, le=1)
    hold_below_m_s: float = setting(
        0.3, "m s-1", "Walking speed below which the plan says stop and hold.", ge=0)
    settled_share: float = setting(
        0.0033, "1", "Share of a step that may be left when a head counts as settled: 0.1 K of "
        "30 K.", gt=0, lt=1)
    control_every_min: float = setting(
        20.0, "min", "Longest time between two visits to the control.", gt=0)
    walk_min: float = setting(1.0, "min", "Walk from one patch to the next.", ge=0)
    least_rounds: int = setting(3, "1", "Least rounds over all patches.", ge=1)


def _section(model: type[Strict], description: str) -> Any:
    return key(description, default_factory=model, write="keys of this section, with their values")


class SettingRow(TypedDict):
    """One line of the listing."""

    section: str
    name: str
    value: float | int | str
    unit: str
    origin: str
    source: str


class Settings(Strict):
    """Any default of the method, changed; the report prints all of them with their origin."""

    temperature: TemperatureSettings = _section(TemperatureSettings, "Surface temperature.")
    albedo: AlbedoSettings = _section(AlbedoSettings, "Albedo.")
    ndvi: NdviSettings = _section(NdviSettings, "NDVI.")
    quality: QualitySettings = _section(QualitySettings, "Checks of the records.")
    clocks: ClockSettings = _section(ClockSettings, "Clocks.")
    passes: PassSettings = _section(PassSettings, "Passes.")
    statistics: StatisticsSettings = _section(StatisticsSettings, "Draws and intervals.")
    comparison: ComparisonSettings = _section(ComparisonSettings, "Comparison of dates.")
    planning: PlanningSettings = _section(PlanningSettings, "Planning of a survey day.")

    def listing(self) -> list[SettingRow]:
        """Return every setting with its value, unit, origin ('yours' if changed) and source."""
        rows: list[SettingRow] = []
        for section, model in self:
            rows += _rows(section, "", model)
        return rows


def _rows(section: str, prefix: str, model: BaseModel) -> list[SettingRow]:
    rows: list[SettingRow] = []
    for name, field in type(model).model_fields.items():
        value = getattr(model, name)
        if isinstance(value, BaseModel):
            rows += _rows(section, f"{prefix}{name}.", value)
            continue
        extra: Any = field.json_schema_extra
        yours = value != field.default
        shown = (f"{value[0]:g} to {value[1]:g}" if isinstance(value, tuple)
                 else ("yes" if value else "no") if isinstance(value, bool) else value)
        rows.append({
            "section": section, "name": prefix + name, "value": shown, "unit": extra["unit"],
            "origin": "yours" if yours else extra["origin"],
            "source": "parameter file" if yours else extra["source"]})
    return rows
