"""Every default of the method: value, unit, origin and published source."""

from __future__ import annotations

from typing import Annotated, Any, Literal, TypedDict

from pydantic import BaseModel, Field

from surveykit.intake.params.base import Fault, Strict, key, number_words

Origin = Literal["standard", "engineering default", "from memory"]
ENGINEERING: Origin = "engineering default"
MEMORY: Origin = "from memory"
STANDARD: Origin = "standard"
GUM = "JCGM 100:2008 (GUM)"
BSRN = "BSRN recommended limits, Long & Shi 2008"
ISO9060 = "ISO 9060:2018, class B"


def setting(value: Any, unit: str, description: str, origin: Origin = ENGINEERING,
            source: str = "engineering default", **limits: float) -> Any:
    """Return a field of the settings with its unit, origin and source."""
    write = ("true or false" if isinstance(value, bool)
             else "[low, high], two numbers, low below high" if isinstance(value, tuple)
             else number_words(unit, whole=isinstance(value, int), **limits))
    return key(description, write=write, default=value, **limits,
               extra={"unit": unit, "origin": origin, "source": source})


def rising(model: Strict, *names: str) -> list[Fault]:
    """Return the faults of limits that must rise in this order."""
    values = [getattr(model, name) for name in names]
    return [((name,), f"got {value:g}, below {names[n]} ({values[n]:g}); write limits that rise: "
             + ", ".join(names)) for n, (name, value) in enumerate(zip(
                 names[1:], values[1:], strict=True)) if value < values[n]]


class TemperatureSettings(Strict):
    """Surface temperature from infrared or longwave readings."""

    sky_radiance_u: float = setting(
        0.15, "1", "Relative standard uncertainty of the modelled clear-sky radiance.", ge=0)
    sky_view_u: float = setting(
        0.1, "1", "Standard uncertainty of site.sky_view written as a bare number.", ge=0)
    walls_u_k: float = setting(
        10.0, "K", "Standard uncertainty of the temperature of what hides the sky.", ge=0)
    walls_emissivity: float = setting(
        0.92, "1", "Emissivity of what hides the sky.", gt=0, le=1)
    air_temperature_u_k: float = setting(
        0.5, "K", "Standard uncertainty of the air temperature where no other is stated.", ge=0)
    relative_humidity_u: float = setting(
        0.05, "1", "Standard uncertainty of the relative humidity where no other is stated.", ge=0)
    wind_speed_u_m_s: float = setting(
        0.5, "m s-1", "Standard uncertainty of the wind speed where no other is stated.", ge=0)
    air_pressure_u_pa: float = setting(
        200.0, "Pa", "Standard uncertainty of the air pressure where no other is stated.", ge=0)
    body_temperature_u_k: float = setting(
        0.5, "K", "Standard uncertainty of the housing temperature where none is stated.", ge=0)
    bore_emissivity: float = setting(
        0.95, "1", "Emissivity of the bore of a head pressed on the ground.", gt=0, le=1)
    bore_emissivity_u: float = setting(
        0.06, "1", "Its standard uncertainty (about 0.8 to 1, rectangular).", ge=0)
    rim_gap_max: float = setting(
        0.2, "1", "Largest share of sky leaking under the rim on rough ground.", ge=0, le=1)
    effusivity: float = setting(
        1000.0, "J m-2 K-1 s-1/2", "Thermal effusivity of the ground, for the cooling under a "
        "head pressed on sunlit ground.", MEMORY,
        "semi-infinite solid under a step in flux, Carslaw & Jaeger; textbook order", gt=0)
    body_rate_u_s_k: float = setting(
        0.5, "K per K min-1", "Standard uncertainty for each K/min of housing warming.", ge=0)
    dwell_max_rate_k_s: float = setting(
        0.5, "K s-1", "Fastest change of a settled contact reading.", gt=0)
    dwell_min_s: float = setting(3.0, "s", "Shortest settled contact reading.", gt=0)
    min_emissivity: float = setting(
        0.6, "1", "Emissivity below which no temperature is given (bare metal).", gt=0, le=1)
    path_limit_m: float = setting(
        3.0, "m", "Height up to which the air in between is neglected.", gt=0)


class AlbedoSettings(Strict):
    """Albedo from an up/down pair of shortwave heads."""

    zenith_standard_deg: float = setting(
        45.0, "deg", "Sun's zenith angle up to which an albedo is standard.", STANDARD,
        "ASTM E1918, scope: sun angle to the normal below 45 degrees", gt=0, le=90)
    zenith_qualified_deg: float = setting(
        60.0, "deg", "Zenith angle up to which an albedo is qualified.", gt=0, le=90)
    zenith_max_deg: float = setting(
        70.0, "deg", "Zenith angle above which no albedo is given.", gt=0, le=90)
    min_down_w_m2: float = setting(
        50.0, "W m-2", "Downwelling irradiance below which no albedo is given.", ge=0)
    min_footprint: float = setting(
        0.90, "1", "Least share of the view that the patch must fill.", gt=0, le=1)
    max_shade_contamination: float = setting(
        0.20, "1", "Largest self-shade and contamination that is still corrected.", gt=0, lt=1)
    around_albedo: float = setting(
        0.20, "1", "Albedo of the surroundings where a surface states none.", ge=0, le=1)
    around_albedo_u: float = setting(
        0.15, "1", "Its standard uncertainty where a surface states none.", ge=0)
    zero_offset_u_w_m2: float = setting(
        3.0, "W m-2", "Standard uncertainty of the zero offset a cap does not show.", ge=0)
    levelling_u_deg: float = setting(
        1.0, "deg", "Standard uncertainty of the head's level.", ge=0)
    directional_limit_w_m2: float = setting(
        20.0, "W m-2", "Limit of the directional response at 1000 W m-2 of beam.", MEMORY,
        ISO9060, ge=0)
    beam_fraction: float = setting(
        0.85, "1", "Share of the beam in clear-sky irradiance.", ge=0, le=1)
    height_u_cm: float = setting(1.0, "cm", "Standard uncertainty of heights.", ge=0)
    head_radius_assumed_cm: float = setting(
        4.0, "cm", "Radius assumed for the shade of a head of unstated radius.", gt=0)

    def faults(self) -> list[Fault]:
        """Limits of the sun's height rise."""
        return rising(self, "zenith_standard_deg", "zenith_qualified_deg", "zenith_max_deg")


class NdviSettings(Strict):
    """NDVI from up/down pairs of red and near-infrared heads."""

    zenith_max_deg: float = setting(
        70.0, "deg", "Sun's zenith angle above which no NDVI is given.", gt=0, le=90)
    min_down_share: float = setting(
        0.10, "1", "Least light, as a share of the campaign's clear maximum.", ge=0, le=1)
    dark_u: float = setting(
        0.001, "1", "Standard uncertainty of the dark reading, relative to the campaign's "
        "largest reading.", ge=0)
    min_dark_ratio: float = setting(
        20.0, "1", "Least ratio of the signal to the uncertainty of the dark reading.", ge=1)
    levelling_u_deg: float = setting(
        1.0, "deg", "Standard uncertainty of the head's level.", ge=0)


Pair = Annotated[tuple[float, float], Field(strict=False)]


class Ranges(Strict):
    """Readings outside [low, high] are excluded; SI units."""

    brightness_temperature: Pair = setting((233.15, 373.15), "K", "Infrared readings.")
    housing_temperature: Pair = setting((263.15, 333.15), "K", "Housing temperature.")
    shortwave_down: Pair = setting((-20.0, 2200.0), "W m-2", "Downwelling shortwave.")
    shortwave_up: Pair = setting((-20.0, 1800.0), "W m-2", "Upwelling shortwave.")
    longwave_down: Pair = setting((40.0, 700.0), "W m-2", "Downwelling longwave.", MEMORY, BSRN)
    longwave_up: Pair = setting((40.0, 900.0), "W m-2", "Upwelling longwave.", MEMORY, BSRN)
    red_down: Pair = setting((-20.0, 2200.0), "W m-2", "Downwelling red.")
    red_up: Pair = setting((-20.0, 2200.0), "W m-2", "Upwelling red.")
    nir_down: Pair = setting((-20.0, 2200.0), "W m-2", "Downwelling near-infrared.")
    nir_up: Pair = setting((-20.0, 2200.0), "W m-2", "Upwelling near-infrared.")
    air_temperature: Pair = setting((223.15, 333.15), "K", "Air temperature.")
    relative_humidity: Pair = setting((0.0, 1.05), "1", "Relative humidity.")
    wind_speed: Pair = setting((0.0, 75.0), "m s-1", "Wind speed.")
    air_pressure: Pair = setting((30000.0, 110000.0), "Pa", "Air pressure.")

    def faults(self) -> list[Fault]:
        """A range needs low below high."""
        return [((name,), f"got {list(pair)}; write [low, high], two numbers, low below high")
                for name, pair in self if not pair[0] < pair[1]]


class QualitySettings(Strict):
    """Checks of the records."""

    ranges: Ranges = key("Plausible range of each quantity, SI units.", default_factory=Ranges,
                         write="keys that are quantities, each with [low, high]")
    rare_limit_warning: bool = setting(
        True, "1", "Note irradiance beyond the extremely rare limit.", STANDARD, BSRN)
    flatline_min_s: float = setting(
        10.0, "s", "Shortest stretch of equal readings that can be a flatline.", gt=0)
    flatline_false_alarms: float = setting(
        0.001, "1", "Accepted probability of calling chance a flatline.", gt=0, lt=1)
    gap_intervals: float = setting(
        2.5, "1", "Distance of two records, in logging intervals, that makes a gap.", gt=1)
    missing_flag: float = setting(
        0.10, "1", "Share of missing records in a pass that is flagged.", ge=0, le=1)
    excluded_flag: float = setting(
        0.30, "1", "Share of excluded records in a pass that is flagged.", ge=0, le=1)
    excluded_refuse: float = setting(
        0.60, "1", "Share of excluded records above which a pass is refused.", ge=0, le=1)
    clear_index_min: float = setting(
        0.80, "1", "Irradiance over clear-sky irradiance from which the sky is clear.", ge=0)
    overcast_index_max: float = setting(
        0.50, "1", "Irradiance over clear-sky irradiance up to which it is overcast.", ge=0)
    steady_max: float = setting(
        0.05, "1", "Largest relative standard deviation of a steady irradiance.", gt=0)

    def faults(self) -> list[Fault]:
        """Limits of the sky and of exclusion rise."""
        return [*rising(self, "excluded_flag", "excluded_refuse"),
                *rising(self, "overcast_index_max", "clear_index_min")]


class ClockSettings(Strict):
    """Clocks of the loggers and of the field sheet."""

    unchecked_u_s: float = setting(
        2.0, "s", "Standard uncertainty of a clock nobody checked.", ge=0)


class PassSettings(Strict):
    """Timed coverages."""

    sheet_u_s: float = setting(5.0, "s", "Standard uncertainty of a written time.", ge=0)
    sheet_minutes_u_s: float = setting(
        60.0, "s", "Standard uncertainty of a time written without seconds.", ge=0)
    min_duration_s: float = setting(
        30.0, "s", "Shortest pass after its ends are trimmed.", gt=0)
    settle_time_constants: float = setting(
        5.0, "1", "Time constants dropped after a head is placed.", ge=0)


class StatisticsSettings(Strict):
    """Draws and intervals."""

    RESERVED = {"between_passes": "reserved for later work; leave it out"}

    seed: int = setting(20251, "1", "Seed of the draws.", ge=0, le=10**9)
    draws: int = setting(
        20000, "1", "Monte Carlo draws of each shared error.", ge=1000, le=1_000_000)
    coverage: float = setting(
        0.95, "1", "Coverage probability of the intervals.", STANDARD, GUM, gt=0.5, lt=1)
    few_effective: float = setting(
        10.0, "1", "Effective records below which a pass is flagged.", ge=1)


class ComparisonSettings(Strict):
    """When two dates can be compared."""

    cos_zenith_match: float = setting(
        0.05, "1", "Largest difference in the cosine of the zenith angle.", gt=0)
    irradiance_match: float = setting(
        0.10, "1", "Largest relative difference in irradiance.", gt=0)
    wind_match_m_s: float = setting(1.0, "m s-1", "Largest difference in wind speed.", gt=0)
    rain_max_mm: float = setting(0.0, "mm", "Rain in the last 48 h up to which it is dry.", ge=0)
    min_control_excess_k: float = setting(
        8.0, "K", "Least excess of the control over the air.", gt=0)
    model_u_matched: float = setting(
        0.01, "1", "Model-form uncertainty, share of the control's excess, matched dates.", ge=0)
    model_u_partly: float = setting(
        0.02, "1", "The same, partly matched dates.", ge=0)
    drift_per_year: float = setting(
        0.015, "1", "Relative change of an instrument in a year.", ge=0)
    zenith_dependence: float = setting(
        0.1, "1", "Zenith dependence d of the albedo.", MEMORY,
        "Briegleb et al. 1986, weak dependence", ge=0, le=1)


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
