"""Defaults of the quantities: value, unit, origin and published source of each."""

from __future__ import annotations

from typing import Any, Literal

from surveykit.intake.params.base import Fault, Strict, key, number_words

Origin = Literal["standard", "engineering default", "from memory"]
ENGINEERING: Origin = "engineering default"
MEMORY: Origin = "from memory"
STANDARD: Origin = "standard"
ISO9060 = "ISO 9060:2018, class B"


def setting(value: Any, unit: str, description: str, origin: Origin = ENGINEERING,
            source: str = "engineering default", **limits: Any) -> Any:
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
    weather_reach_s: float = setting(
        1800.0, "s", "How far a weather reading reaches beyond the first and the last.", ge=0)
    body_rate_u_min: float = setting(
        0.5, "min", "Standard uncertainty for each K/min of housing warming: K per K/min.", ge=0)
    dwell_max_rate_k_s: float = setting(
        0.5, "K s-1", "Fastest change of a settled contact reading.", gt=0)
    dwell_min_s: float = setting(3.0, "s", "Shortest settled contact reading.", gt=0)
    min_emissivity: float = setting(
        0.6, "1", "Emissivity below which no temperature is given (bare metal).", gt=0, le=1)
    path_limit_m: float = setting(
        3.0, "m", "Height up to which the air in between is neglected.", gt=0)
    correct_surroundings: bool = setting(
        True, "1", "Whether what the ground reflects of sky and walls is taken off.")
    correct_emissivity: bool = setting(
        True, "1", "Whether the surface's emissivity is corrected; without, nothing reflected is.")
    correct_bore: bool = setting(
        True, "1", "Whether what the ground reflects of a pressed head's bore is taken off.")
    correct_rim_gap: bool = setting(
        True, "1", "Whether half of rim_gap_max is taken as the gap under the rim.")
    correct_head_cooling: bool = setting(
        True, "1", "Whether contact readings are led back to the touch by a fit.")
    correct_emissivity_setting: bool = setting(
        True, "1", "Whether an emissivity set in the instrument is undone.")
    sky_radiance_cloud_u: float = setting(
        0.30, "1", "The same as sky_radiance_u with cloud in the sky.", ge=0)
    cloud_base_k: float = setting(
        10.0, "K", "How far below the air's temperature the base of clouds is taken.", ge=0)
    vapour_pressure_max_hpa: float = setting(
        35.0, "hPa", "Vapour pressure from which the sky model runs past its range.", gt=0)
    sky_measured_u: float = setting(
        0.05, "1", "Relative standard uncertainty of a sky radiance measured at the zenith and "
        "made hemispheric.", ge=0)
    foil_reflectance: float = setting(
        0.96, "1", "Reflectance of a crumpled aluminium foil.", MEMORY,
        "ISO 18434-1 and ASTM E1862, reflector method", gt=0.5, le=1)
    foil_reflectance_u: float = setting(0.01, "1", "Its standard uncertainty.", ge=0)
    foil_temperature_u_k: float = setting(
        10.0, "K", "Standard uncertainty of the foil's temperature where none was read.", ge=0)
    head_cooling_u_k: float = setting(
        0.3, "K", "Standard uncertainty of the form of the law by which ground cools under a "
        "head.", ge=0)
    head_cooling_fit_max_u_k: float = setting(
        0.5, "K", "Standard error of the fitted temperature above which a pass is refused.", gt=0)
    head_cooling_max_k: float = setting(
        2.0, "K", "Cooling under the head above which a pass without fit is refused.", gt=0)
    head_cooling_sun_w_m2: float = setting(
        50.0, "W m-2", "Irradiance below which no cooling under the head is expected.", ge=0)
    check_max_k: float = setting(
        0.5, "K", "Difference of a check reading from the known temperature that is flagged.",
        gt=0)
    pair_min_contrast_k: float = setting(
        20.0, "K", "Least difference of ground and background for a measured emissivity.", gt=0)
    pair_max_half_width: float = setting(
        0.03, "1", "Largest half-width (95 %) of a measured emissivity.", gt=0)
    longwave_down_u_w_m2: float = setting(
        30.0, "W m-2", "Standard uncertainty of the modelled longwave irradiance of the sky.",
        ge=0)
    lid_u_k: float = setting(
        2.0, "K", "Standard uncertainty of a lid's temperature where none is written.", ge=0)
    lid_span_s: float = setting(
        5.0, "s", "Stretch just before a lid is put on, and just after, whose readings are "
        "compared.", gt=0, le=60)
    lid_reading_u_k: float = setting(
        0.1, "K", "Standard uncertainty of either of these readings against the other.", ge=0)


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
        0.20, "1", "Self-shade and contamination above which no albedo is given.", gt=0, lt=1)
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
        4.0, "cm", "Largest radius of a head that states none, for its shade.", gt=0)
    correct_darks: bool = setting(True, "1", "Whether dark readings are taken off.")
    correct_lag: bool = setting(
        True, "1", "Whether light that changes is made up for where two heads differ in speed.")
    correct_gain_ratio: bool = setting(
        True, "1", "Whether the heads' gain ratio found by swapping them is used.")
    correct_surroundings: bool = setting(
        True, "1", "Whether foreign ground in the head's view is taken off.")
    correct_self_shade: bool = setting(
        True, "1", "Whether the shade of head and rod is made up for.")
    max_corrected: float = setting(
        0.10, "1", "Self-shade and contamination up to which they are corrected.", gt=0, lt=1)
    min_lit: float = setting(
        0.75, "1", "Least share of the view that is lit patch.", gt=0, le=1)
    footprint_u: float = setting(
        0.01, "1", "Standard uncertainty of the share of the view that the patch fills.", ge=0)
    self_shade_u: float = setting(
        0.20, "1", "Relative standard uncertainty of the computed self-shade.", ge=0)
    swap_min_pairs: int = setting(
        3, "1", "Swaps of the heads below which their gain ratio is flagged.", ge=1)
    swap_min_s: float = setting(
        60.0, "s", "Time in either position below which a swap does not count as one of them.",
        ge=0)
    swap_max_sd: float = setting(
        0.01, "1", "Relative standard deviation of the swaps' gain ratios above which none is "
        "used.", gt=0)
    operator_distance_m: float = setting(
        1.5, "m", "Distance of the operator from the head, where the sheet says on which side.",
        gt=0)
    rod_length_m: float = setting(1.5, "m", "Length of the rod behind the head.", gt=0)
    spectral_u: float = setting(
        0.05, "1", "Relative standard uncertainty from a response that is not flat.", MEMORY,
        "ISO 9060:2018, spectral error of class C", ge=0)
    lane_effect_max: float = setting(
        0.01, "1", "Relative effect of the lanes' direction on the upper head that is flagged.",
        gt=0)
    normalise_zenith: bool = setting(
        False, "1", "Whether albedos are converted to normalise_zenith_deg.")
    normalise_zenith_deg: float = setting(
        45.0, "deg", "Zenith angle to which they are then converted.", ge=0, lt=90)
    zenith_dependence: float = setting(
        0.1, "1", "Zenith dependence d for that conversion and for daily albedo.", MEMORY,
        "Briegleb et al. 1986, weak dependence", ge=0, le=1)
    zenith_dependence_u: float = setting(0.1, "1", "Its standard uncertainty.", ge=0)

    def faults(self) -> list[Fault]:
        """Limits of the sun's height rise, and so do those of shade and contamination."""
        return [*rising(self, "zenith_standard_deg", "zenith_qualified_deg", "zenith_max_deg"),
                *rising(self, "max_corrected", "max_shade_contamination")]


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
        20.0, "1", "Least ratio of the signal to the scatter of the dark reading.", ge=1)
    max_dark_u: float = setting(
        0.02, "1", "Largest uncertainty of the dark reading, relative to the signal of a head "
        "that looks down.", gt=0)
    around_ndvi: float = setting(
        0.4, "1", "NDVI assumed of what surrounds a patch.", ge=-1, le=1)
    around_ndvi_u: float = setting(
        0.25, "1", "Its standard uncertainty (paving to dense green, rectangular).", ge=0)
    correct_darks: bool = setting(True, "1", "Whether dark readings are taken off.")
    correct_lag: bool = setting(
        True, "1", "Whether light that changes is made up for where two heads differ in speed.")
    correct_gain_ratio: bool = setting(
        True, "1", "Whether a gain ratio by panel, swap or certificate is used.")
    correct_bands: bool = setting(
        True, "1", "Whether a conversion of NDVI to other bands is used.")
    soil_factor: float = setting(
        0.5, "1", "L of the soil-adjusted index.", MEMORY, "Huete 1988", ge=0, le=1)
    bare_ndvi: float = setting(
        0.2, "1", "NDVI of bare ground, for the vegetation fraction.", ge=-1, le=1)
    full_ndvi: float = setting(
        0.86, "1", "NDVI of full cover.", ge=-1, le=1)
    cover_ndvi_u: float = setting(
        0.03, "1", "Standard uncertainty of bare_ndvi and of full_ndvi.", ge=0)

    def faults(self) -> list[Fault]:
        """Full cover is greener than bare ground."""
        return rising(self, "bare_ndvi", "full_ndvi")
