"""Defaults of the checks of records: ranges, limits, and shares that flag or refuse."""

from __future__ import annotations

from typing import Annotated

from pydantic import AfterValidator, Field

from surveykit.intake.params.base import Fault, Strict, fault, key
from surveykit.intake.params.defaults import MEMORY, STANDARD, rising, setting

BSRN = "BSRN recommended limits, Long & Shi 2008"
COMPARISON = "BSRN comparison of longwave irradiance with air temperature"

Pair = Annotated[tuple[float, float], Field(strict=False)]


def _low_first(pair: tuple[float, float]) -> tuple[float, float]:
    if not pair[0] < pair[1]:
        raise fault(f"got {list(pair)}; write [low, high], two numbers, low below high")
    return pair


Range = Annotated[Pair, AfterValidator(_low_first)]


class Ranges(Strict):
    """Readings outside [low, high] are excluded; SI units."""

    brightness_temperature: Range = setting((233.15, 373.15), "K", "Infrared readings.")
    housing_temperature: Range = setting((263.15, 333.15), "K", "Housing temperature.")
    shortwave_down: Range = setting((-20.0, 2200.0), "W m-2", "Downwelling shortwave.")
    shortwave_up: Range = setting((-20.0, 1800.0), "W m-2", "Upwelling shortwave.")
    longwave_down: Range = setting((40.0, 700.0), "W m-2", "Downwelling longwave.", MEMORY, BSRN)
    longwave_up: Range = setting((40.0, 900.0), "W m-2", "Upwelling longwave.", MEMORY, BSRN)
    red_down: Range = setting((-20.0, 2200.0), "W m-2", "Downwelling red.")
    red_up: Range = setting((-20.0, 2200.0), "W m-2", "Upwelling red.")
    nir_down: Range = setting((-20.0, 2200.0), "W m-2", "Downwelling near-infrared.")
    nir_up: Range = setting((-20.0, 2200.0), "W m-2", "Upwelling near-infrared.")
    air_temperature: Range = setting((223.15, 333.15), "K", "Air temperature.")
    relative_humidity: Range = setting((0.0, 1.05), "1", "Relative humidity.")
    wind_speed: Range = setting((0.0, 75.0), "m s-1", "Wind speed.")
    air_pressure: Range = setting((30000.0, 110000.0), "Pa", "Air pressure.")


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
    flatline_max_repeat: float = setting(
        0.98, "1", "Share of repeated readings up to which a channel is coarse, not stuck.",
        gt=0, lt=1)
    saturation_repeats: int = setting(
        5, "1", "Readings piled up at a channel's own largest or smallest value that show a head "
        "or logger at its end.", ge=3)
    saturation_share: float = setting(
        0.01, "1", "Part of a column's range, else of the plausible one, that is flagged at its "
        "ends.", ge=0, lt=0.5)
    spike_window: int = setting(
        11, "1", "Records around a reading whose median it is held against.", ge=5)
    spike_mad: float = setting(
        5.0, "1", "Distance from that median, in scaled median absolute deviations, that makes a "
        "spike.", gt=0)
    spike_noise: float = setting(
        3.0, "1", "Least distance of a spike, in standard deviations of the channel's own noise.",
        gt=0)
    step_max_k_s: float = setting(
        5.0, "K s-1", "Change of a stand-off reading within a second that is flagged.", gt=0)
    albedo_plausible: Range = setting(
        (0.02, 0.95), "1", "Share of the light that ground without snow sends back.")
    up_down_min_w_m2: float = setting(
        50.0, "W m-2", "Upwelling shortwave from which it must stay below the downwelling.",
        MEMORY, BSRN, ge=0)
    swapped_share: float = setting(
        0.5, "1", "Share of records with more light up than down from which the two columns count "
        "as swapped.", gt=0, le=1)
    longwave_air_low: float = setting(
        0.4, "1", "Least downwelling longwave, as a share of a black body at air temperature.",
        MEMORY, COMPARISON, ge=0, le=1)
    longwave_air_high_w_m2: float = setting(
        25.0, "W m-2", "Largest downwelling longwave above a black body at air temperature.",
        MEMORY, COMPARISON, ge=0)
    below_air_k: float = setting(
        15.0, "K", "How far under the air temperature ground can read.", MEMORY, COMPARISON, gt=0)
    above_air_k: float = setting(
        45.0, "K", "How far above the air temperature ground can read; paving in the sun is "
        "hotter than the 25 K of station networks.", gt=0)
    rate_tolerance: float = setting(
        0.01, "1", "Largest difference of the median interval from the stated one, relative; "
        "jitter from the same share on is noted.", gt=0)
    history_s: float = setting(
        120.0, "s", "How long a change of irradiance is remembered by the ground.", ge=0)
    history_max_w_m2: float = setting(
        150.0, "W m-2", "Change of irradiance within that time from which a temperature is "
        "flagged.", gt=0)
    steady_window_s: float = setting(
        60.0, "s", "Stretch over which the sky's steadiness is judged.", gt=0)
    steady_sd: float = setting(
        0.02, "1", "Largest relative standard deviation of irradiance in that stretch.", gt=0)
    steady_rate_w_m2_s: float = setting(
        2.0, "W m-2 s-1", "Largest slope of irradiance in that stretch.", gt=0)
    full_light_w_m2: float = setting(
        1000.0, "W m-2", "Irradiance that the day's largest red and near-infrared readings stand "
        "for where no shortwave head watched the sky.", gt=0)
    body_rate_window_s: float = setting(
        60.0, "s", "Stretch over which the housing's warming is judged.", gt=0)
    body_rate_flag_k_min: float = setting(
        0.5, "K min-1", "Warming or cooling of the housing that is flagged.", gt=0)
    body_rate_max_k_min: float = setting(
        2.0, "K min-1", "Warming or cooling of the housing from which readings are excluded.",
        gt=0)
    dark_drift_max: float = setting(
        0.01, "1", "Change of a head's dark reading between its caps, as a share of its largest "
        "readings, that is flagged.", gt=0)
    panel_reach_s: float = setting(
        1800.0, "s", "How far from an NDVI pass the nearest row over the panel may lie.", gt=0)
    gap_intervals: float = setting(
        2.5, "1", "Distance of two records, in logging intervals, that makes a gap.", gt=1)
    missing_flag: float = setting(
        0.10, "1", "Share of missing records in a pass that is flagged.", ge=0, le=1)
    excluded_flag: float = setting(
        0.30, "1", "Share of excluded records in a pass that is flagged.", ge=0, le=1)
    excluded_refuse: float = setting(
        0.60, "1", "Share of excluded records above which a pass is refused.", ge=0, le=1)
    clear_index_min: float = setting(
        0.85, "1", "Irradiance over clear-sky irradiance from which the sky is clear.", ge=0)
    clear_index_max: float = setting(
        1.10, "1", "The same, above which clouds beside the sun add to it.", ge=0)
    overcast_index_max: float = setting(
        0.55, "1", "Irradiance over clear-sky irradiance up to which it is overcast.", ge=0)
    steady_max: float = setting(
        0.05, "1", "Largest relative standard deviation of a steady irradiance.", gt=0)

    def range_of(self, quantity: str) -> tuple[float, float]:
        """Return the plausible range of a quantity, SI."""
        low, high = getattr(self.ranges, quantity)
        return float(low), float(high)

    def faults(self) -> list[Fault]:
        """Limits of the sky, of the housing and of exclusion rise."""
        return [*rising(self, "excluded_flag", "excluded_refuse"),
                *rising(self, "body_rate_flag_k_min", "body_rate_max_k_min"),
                *rising(self, "overcast_index_max", "clear_index_min", "clear_index_max")]
