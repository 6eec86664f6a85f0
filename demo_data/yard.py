"""The invented Pellowick Yard: what is true there, before any instrument looks.

Sun, sky, weather, surface temperature, albedo and NDVI as functions of time, and the errors that
every instrument of the yard carries. Numbers are invented; the relations are published ones, named
beside each. Nothing here is shared with the package that reduces the survey: two codes, one truth.
"""

from __future__ import annotations

import hashlib
from dataclasses import dataclass

import numpy as np
import pandas as pd
import pvlib

SEED = 2025
SITE = {"latitude": 41.30, "longitude": -7.75, "elevation_m": 120.0, "zone": "Europe/Lisbon"}
SKY_VIEW, SKY_VIEW_U = 0.95, 0.05
WALL_EMISSIVITY = 0.92
BEAM = 0.85  # share of the beam in the irradiance of a clear sky
D = 0.1  # zenith dependence of albedo, weak
STEP_S = 0.1  # of every internal series
SIGMA = 5.670374419e-8  # W m-2 K-4
ICE_K = 273.15


@dataclass(frozen=True)
class Surface:
    """One kind of ground: what it does to sunlight and heat (all [1] unless said)."""

    label: str
    patches: tuple[str, ...]
    albedo: float  # at 45 deg zenith
    red: float  # reflectance in the red band at 45 deg zenith
    nir: float
    emissivity: float  # declared in the parameter file
    emissivity_u: float
    around: float  # albedo of what lies around a patch, declared
    around_u: float
    size_m: tuple[float, float]
    storage: float  # share of the absorbed sunlight that goes into the ground
    evaporation: float  # share that evaporates water, times s / (s + gamma)
    convection: float  # factor on the wind function
    lag_min: float  # by which the surface follows the sun
    rim_gap: float  # share of the bore's background that is sky, in contact
    spread_k: float  # within a patch, standard deviation
    spread_albedo: float  # relative
    spread_green: float  # relative, of nir against red
    effusivity: float  # J m-2 K-1 s-1/2: how slowly it cools in the shade of a head


BEFORE = {
    "worn-asphalt": Surface("Worn asphalt", ("A1", "A2", "A3", "A4"), 0.120, 0.112,
                            0.129, 0.95, 0.010, 0.16, 0.03, (4.0, 4.0),
                            0.30, 0.0, 1.0, 35.0, 0.03, 0.8, 0.035, 0.006, 1300.0),
    "coated-court": Surface("Coated court", ("C1", "C2", "C3", "C4"), 0.110, 0.103, 0.117,
                            0.95, 0.010, 0.16, 0.03, (4.0, 4.0),
                            0.30, 0.0, 1.0, 35.0, 0.02, 0.7, 0.030, 0.005, 1300.0),
    "brick-path": Surface("Brick path", ("B1",), 0.240, 0.255, 0.305, 0.94, 0.015, 0.20, 0.03,
                          (3.0, 6.0), 0.32, 0.0, 1.0, 40.0, 0.04, 0.8, 0.040, 0.008, 1600.0),
    "lawn": Surface("Lawn", ("L1", "L2", "L3", "L4"), 0.215, 0.045, 0.400, 0.98, 0.010, 0.18,
                    0.03, (4.0, 4.0), 0.08, 0.50, 1.2, 8.0, 0.12, 0.9, 0.045, 0.040, 900.0),
    "bark-bed": Surface("Bark bed", ("K1",), 0.150, 0.125, 0.215, 0.96, 0.015, 0.18, 0.03,
                        (4.0, 4.0), 0.12, 0.06, 1.05, 12.0, 0.10, 1.2, 0.050, 0.020, 800.0),
}
CONTROL = "worn-asphalt"


def _court(albedo: float, red: float, nir: float, emissivity: float, u: float) -> Surface:
    return Surface(**{**BEFORE["coated-court"].__dict__, "albedo": albedo, "red": red, "nir": nir,
                      "emissivity": emissivity, "emissivity_u": u})


@dataclass(frozen=True)
class Day:
    """One survey day: its weather and the surfaces as they were."""

    date: str
    title: str
    air_degc: float
    humidity: float
    wind_m_s: float
    clarity: float  # factor on the clear-sky irradiance
    court: Surface

    @property
    def campaign(self) -> str:
        return f"pellowick-yard-{self.date}"

    @property
    def surfaces(self) -> dict[str, Surface]:
        return {**BEFORE, "coated-court": self.court}


DAYS = (
    Day("2025-06-11", "before the pale coating", 24.0, 0.42, 1.5, 0.98, BEFORE["coated-court"]),
    Day("2025-07-16", "five weeks after the pale coating", 31.0, 0.33, 2.5, 0.96,
        _court(0.360, 0.368, 0.392, 0.93, 0.015)),
    Day("2025-09-17", "end of the season", 22.0, 0.50, 2.0, 1.00,
        _court(0.330, 0.336, 0.360, 0.93, 0.015)),
)

ERRORS: dict[str, dict[str, float]] = {}  # every shared error as drawn, for truth.json


def stream(*words: object) -> np.random.Generator:
    """Return the random stream of this name: adding one never moves another."""
    key = hashlib.sha256("|".join(map(str, (SEED, *words))).encode()).digest()
    return np.random.default_rng(int.from_bytes(key[:8], "little"))


def shared_error(scope: str, u: float, limit: float = np.inf) -> float:
    """Draw the one error of `scope` (normal, standard deviation `u`) and keep a note of it."""
    drawn = float(np.clip(u * stream("shared", scope).standard_normal(), -limit, limit))
    ERRORS[scope] = {"u": u, "drawn": round(drawn, 6)}
    return drawn


def follow(x: np.ndarray, memory: float) -> np.ndarray:
    """Return y[i] = memory y[i-1] + x[i], starting from y[0] = x[0]."""
    y, last = np.empty_like(x), 0.0
    for i, value in enumerate(x.tolist()):
        last = memory * last + value
        y[i] = last
    return y


def wander(rng: np.random.Generator, n: int, scale_s: float, step_s: float = STEP_S) -> np.ndarray:
    """Return n values step_s apart of unit variance that forget with exp(-t / scale_s)."""
    memory = float(np.exp(-step_s / scale_s))
    x = rng.standard_normal(n) * np.sqrt(1 - memory**2)
    x[0] /= np.sqrt(1 - memory**2)
    return follow(x, memory)


def slow(rng: np.random.Generator, n: int, scale_s: float) -> np.ndarray:
    """Return n such values STEP_S apart for the weather: nothing in them is faster than 30 s."""
    knots = round(30 / STEP_S)
    few = n // knots + 2
    return np.interp(np.arange(n), knots * np.arange(few), wander(rng, few, scale_s, 30.0))


def pattern(patch: str, size_m: tuple[float, float], lanes: int, walked: np.ndarray) -> np.ndarray:
    """Return what the ground below a walk along lanes has that the patch's mean has not.

    A sum of cosines over the patch, so that its mean is 0 and its variance 1; their weights are
    those of a covariance that falls with exp(-distance / 0.4 m). `walked` is the share of the walk.
    """
    width, length = size_m
    lane = np.clip(np.floor(walked * lanes), 0, lanes - 1)
    along = walked * lanes - lane
    along = np.where(lane % 2 == 0, along, 1 - along)
    i, j = (k.ravel()[1:] for k in np.meshgrid(np.arange(20), np.arange(20), indexing="ij"))
    wave = np.pi * np.hypot(i / length, j / width)
    weight = (1 + (0.4 * wave) ** 2) ** -0.75 * stream("pattern", patch).standard_normal(i.size)
    square = np.where(i > 0, 0.5, 1.0) * np.where(j > 0, 0.5, 1.0)  # mean square of each wave
    weight /= np.sqrt((weight**2) @ square)
    waves = np.cos(np.pi * np.outer(along, i)) * np.cos(np.pi * np.outer((lane + 0.5) / lanes, j))
    return np.asarray(waves @ weight)


_WAVELENGTH_UM = np.linspace(8.0, 14.0, 601)
_BAND_T_K = np.arange(180.0, 420.0, 0.1)
_spectral = 1.191042972e8 / _WAVELENGTH_UM**5 / np.expm1(
    14387.76877 / (_WAVELENGTH_UM * _BAND_T_K[:, None]))  # Planck, W m-2 sr-1 um-1
_BAND_L = ((_spectral[:, 1:] + _spectral[:, :-1]) / 2 * np.diff(_WAVELENGTH_UM)).sum(axis=1)


def radiance(t_k: np.ndarray | float) -> np.ndarray:
    """Return the 8-14 um radiance [W m-2 sr-1] of a black body at t_k."""
    return np.exp(np.interp(t_k, _BAND_T_K, np.log(_BAND_L)))


def brightness_k(band_radiance: np.ndarray) -> np.ndarray:
    """Return the temperature [K] of the black body with this 8-14 um radiance."""
    return np.interp(np.log(band_radiance), np.log(_BAND_L), _BAND_T_K)


def true_emissivity(name: str, surface: Surface) -> float:
    """Return what the declared emissivity stands for: one draw while the entry is the same."""
    u = surface.emissivity_u
    scope = f"emissivity:{name}:{surface.emissivity:g}"
    return min(surface.emissivity + shared_error(scope, u), 0.995)


def zenith_factor(cos_zenith: np.ndarray) -> np.ndarray:
    """Return albedo over albedo at 45 deg (Dickinson 1983; Briegleb et al. 1986)."""
    return (1 + 2 * D * np.sqrt(0.5)) / (1 + 2 * D * cos_zenith)


class World:
    """The yard on one day, on a time axis of STEP_S.

    Parameters
    ----------
    day : Day
    start_s, stop_s : float
        Seconds since 1970 UTC.
    """

    def __init__(self, day: Day, start_s: float, stop_s: float) -> None:
        self.day = day
        self.time_s = start_s + STEP_S * np.arange(round((stop_s - start_s) / STEP_S))
        n = self.time_s.size
        self.cos_zenith = cos_zenith(self.time_s)
        hour = (self.time_s - solar_noon(day.date)) / 3600
        haze = 1 + 0.006 * slow(stream(day.date, "haze"), n, 1500.0)
        self.haze = haze
        self.irradiance = self._clear(self.time_s) * haze  # W m-2
        self.air_k = (day.air_degc + ICE_K + 0.9 * (hour - 0.4)
                      + 0.25 * slow(stream(day.date, "air"), n, 600.0))
        self.humidity = np.clip(day.humidity - 0.02 * hour
                                + 0.01 * slow(stream(day.date, "damp"), n, 900.0), 0.05, 0.95)
        gust = 1 + 0.06 * slow(stream(day.date, "wind"), n, 1800.0) + 0.04 * hour
        self.wind_m_s = day.wind_m_s * gust
        self._sky()
        self.temperature_k = {name: self.balance(name, surface)
                              for name, surface in day.surfaces.items()}

    def _clear(self, time_s: np.ndarray) -> np.ndarray:
        mu = np.maximum(cos_zenith(time_s), 0.01)
        return self.day.clarity * 1098.0 * mu * np.exp(-0.057 / mu)  # Haurwitz 1945

    def _sky(self) -> None:
        """Sky and walls in the band and in the full spectrum (Idso 1981; Kimball et al. 1982)."""
        t_c = self.air_k - ICE_K
        self.vapour_hpa = self.humidity * 6.1094 * np.exp(17.625 * t_c / (t_c + 243.04))
        window = 0.24 + 2.98e-8 * self.vapour_hpa**2 * np.exp(3000 / self.air_k)
        window = np.minimum(window * (1.4 - 0.4 * window), 1.0)
        departure = 1 + shared_error(f"{self.day.campaign}:sky", 0.15)
        self.sky = window * radiance(self.air_k) * departure
        walls_k = self.air_k + shared_error(f"{self.day.campaign}:walls", 10.0, 15.0)
        view = min(SKY_VIEW + shared_error("site:sky_view", SKY_VIEW_U), 0.995)
        walls = WALL_EMISSIVITY * radiance(walls_k) + (1 - WALL_EMISSIVITY) * self.sky
        self.background = view * self.sky + (1 - view) * walls
        full = 0.70 + 5.95e-5 * self.vapour_hpa * np.exp(1500 / self.air_k)
        self.cooling = SIGMA * self.air_k**4 * (1 - full)  # black longwave loss at air temperature

    def albedo(self, surface: Surface) -> np.ndarray:
        return surface.albedo * zenith_factor(self.cos_zenith)

    def balance(self, name: str, surface: Surface) -> np.ndarray:
        """Return the surface temperature [K] of the linear energy balance, following the sun late.

        Wind function of McAdams type, 5.7 + 3.8 u (from memory); evaporation grows with the slope
        of the saturation curve as in Priestley & Taylor (1972).
        """
        sun = self._clear(self.time_s - 60 * surface.lag_min) * self.haze
        absorbed = (1 - self.albedo(surface)) * sun
        t_c = self.air_k - ICE_K
        slope = 4098 * 6.1094 * np.exp(17.625 * t_c / (t_c + 243.04)) / (t_c + 243.04) ** 2
        damp = surface.evaporation * slope / (slope + 0.66)
        emissivity = true_emissivity(name, surface)
        gain = absorbed * (1 - surface.storage - damp) - emissivity * self.cooling
        loss = (surface.convection * (5.7 + 3.8 * self.wind_m_s)
                + 4 * emissivity * SIGMA * (self.air_k + 10) ** 3)
        return self.air_k + gain / loss

    def mean(self, series: np.ndarray, start_s: float, stop_s: float) -> float:
        """Return the time mean of `series` from start to stop."""
        return float(series[self.between(start_s, stop_s)].mean())

    def between(self, start_s: float, stop_s: float) -> slice:
        """Return the samples from start to stop."""
        first = self.time_s[0]
        return slice(round((start_s - first) / STEP_S), round((stop_s - first) / STEP_S))


def cos_zenith(time_s: np.ndarray) -> np.ndarray:
    """Return the cosine of the sun's apparent zenith angle, from one position a minute."""
    knots = np.arange(np.floor(time_s[0] / 60) * 60, time_s[-1] + 60, 60.0)
    times = pd.DatetimeIndex((knots * 1e9).astype("int64"), tz="UTC")
    position = pvlib.solarposition.get_solarposition(
        times, SITE["latitude"], SITE["longitude"], altitude=SITE["elevation_m"])
    zenith = np.radians(position["apparent_zenith"].to_numpy())
    return np.interp(time_s, knots, np.cos(zenith))


def solar_noon(date: str) -> float:
    """Return when the sun stands highest, seconds since 1970 UTC, to the minute."""
    midnight = pd.Timestamp(date, tz="UTC").timestamp()
    minutes = midnight + 60 * np.arange(11 * 60, 15 * 60, dtype=float)
    return float(minutes[np.argmax(cos_zenith(minutes))])
