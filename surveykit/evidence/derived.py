"""What follows from the surfaces' values when it is asked for: energy, indices, daily albedo."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from surveykit.core import Input, table
from surveykit.evidence import models
from surveykit.evidence.conditions import Day
from surveykit.evidence.emissivities import NOT_FOR
from surveykit.evidence.estimates import PassEstimate
from surveykit.evidence.parts import surface_scope
from surveykit.evidence.surfaces import Group
from surveykit.physics.energy import (
    SRI_CONVECTION,
    longwave_up,
    net_radiation,
    solar_reflectance_index,
)
from surveykit.physics.shortwave import daily_factor
from surveykit.physics.surroundings import sky_emissivity_full, vapour_pressure_hpa
from surveykit.physics.thermal import SIGMA
from surveykit.physics.vegetation import savi, vegetation_fraction
from surveykit.statistics.draws import Draws, Result, combine, summarise

NS_A_DAY = 86_400_000_000_000
Groups = dict[tuple[str, str, str], Group]


@dataclass(frozen=True)
class Asked:
    """What the derived rows are made of."""

    day: Day
    groups: Groups
    draws: Draws
    coverage: float

    def of(self, surface: str, quantity: str) -> list[Group]:
        """Return the groups of a surface and quantity that have a value."""
        return [g for key, g in self.groups.items()
                if key[:2] == (surface, quantity) and np.isfinite(g.value)]

    def known(self, one: Input) -> Result:
        """Return an uncertain input as a result."""
        moved = one.value + one.u * self.draws.standard(one.scope, one.distribution)
        return Result(one.value, moved, moved, ())


def derived(day: Day, groups: Sequence[Group], draws: Draws, coverage: float) -> pd.DataFrame:
    """Return the table `derived`: a row each product, surface and form that was asked for."""
    asked = Asked(day, {g.key: g for g in groups}, draws, coverage)
    campaign = day.parameters.campaign
    rows: list[dict[str, Any]] = []
    for product in campaign.derived:
        for surface in dict.fromkeys(g.surface for g in groups):
            rows += PRODUCTS[product](asked, surface)
    if campaign.caution is not None:
        rows += _caution(asked)
    return table("derived", rows)


def _row(asked: Asked, surface: str, product: str, form: str, unit: str, result: Result | None,
         *, value: float = np.nan, note: str = "", status: str = "ok") -> dict[str, Any]:
    row: dict[str, Any] = {
        "campaign": asked.day.name, "surface": surface, "product": product, "form": form,
        "unit": unit, "value": value, "u": np.nan, "lower": np.nan, "upper": np.nan,
        "coverage": asked.coverage, "status": status, "note": note}
    if result is not None:
        found = summarise(result, asked.coverage)
        row |= {"value": found.value, "u": found.u, "lower": found.lower, "upper": found.upper}
    elif status == "ok":
        row["status"] = "value only" if np.isfinite(value) else "not evaluated"
    return row


def _missing(asked: Asked, surface: str, product: str, what: str) -> list[dict[str, Any]]:
    return [_row(asked, surface, product, "", "1", None, note=f"{what} is missing")]


def _made(asked: Asked, surface: str, product: str, form: str, unit: str,
          function: Callable[..., Any], parts: Sequence[Group | Input],
          note: str = "") -> dict[str, Any]:
    """Return a row of a function of groups and inputs; without repeats it has a value only."""
    values = [p.value for p in parts]
    results = [p.result if isinstance(p, Group) else asked.known(p) for p in parts]
    if any(r is None for r in results):
        return _row(asked, surface, product, form, unit, None, value=float(function(*values)),
                    note="; ".join(filter(None, [note, "no repeats: no interval"])))
    return _row(asked, surface, product, form, unit,
                combine(function, *(r for r in results if r is not None)), note=note)


def _broadband(asked: Asked, surface: str) -> Input | None:
    entry = asked.day.parameters.campaign.surfaces[surface].emissivity_broadband
    if entry is None:
        return None
    return Input("emissivity_broadband", float(entry.value or 0), float(entry.u or 0),
                 surface_scope("emissivity broadband", surface, entry), "")


def _sri(asked: Asked, surface: str) -> Iterator[dict[str, Any]]:
    """Solar reflectance index by the balance and by the equation, for three winds."""
    emissivity = _broadband(asked, surface)
    clear = [g for g in asked.of(surface, "albedo") if g.kind == "clear"]
    if emissivity is None or not clear:
        yield from _missing(asked, surface, "sri", f"surfaces.{surface}.emissivity_broadband"
                            if emissivity is None else "a clear-sky albedo")
        return
    group = clear[0]
    away = {d for p in group.used for d in e1918_deviations(asked.day, p)}
    note = ("conditions of E1980 met" if not away else
            f"SRI-like, not by E1980: {'; '.join(sorted(away))}")
    for wind, convection in SRI_CONVECTION.items():
        for place, how in enumerate(("balance", "equation")):
            def index(albedo: Any, eps: Any, h: float = convection, n: int = place) -> Any:
                at = group.value, emissivity.value
                here = solar_reflectance_index(*at, h)[n]
                slopes = [(solar_reflectance_index(at[0] + d, at[1] + e, h)[n]
                           - solar_reflectance_index(at[0] - d, at[1] - e, h)[n]) / 2e-3
                          for d, e in ((1e-3, 0.0), (0.0, 1e-3))]
                return here + slopes[0] * (albedo - at[0]) + slopes[1] * (eps - at[1])

            yield _made(asked, surface, "sri", f"{how}, {wind} wind", "1", index,
                        [group, emissivity], note)


def _longwave_down(asked: Asked, group: Group) -> tuple[Input | None, str]:
    """Return the longwave irradiance of the sky over a group's passes, logged or modelled."""
    settings = asked.day.parameters.campaign.settings.temperature
    for channel in asked.day.channels.get("longwave_down", []):
        read = [asked.day.readings(channel, p.this.start_ns, p.this.stop_ns)[1] for p in group.used]
        some = [float(v.mean()) for v in read if v.size]
        if some:
            mean = float(np.mean(some))
            return Input("down", mean, float(np.hypot(channel.u_offset, channel.u_gain * mean)),
                         channel.offset_scope, ""), "longwave from the sky logged"
    air = group.mean("air_k")
    humid = [asked.day.weather("relative_humidity", p.this) for p in group.used]
    damp = [h.value for h in humid if h is not None]
    if not np.isfinite(air) or not damp:
        return None, ""
    full = float(sky_emissivity_full(air, vapour_pressure_hpa(air, float(np.mean(damp)))))
    return Input("down", min(full, 1.0) * SIGMA.value * air**4, settings.longwave_down_u_w_m2,
                 f"{asked.day.name}:longwave down", ""), "longwave from the sky modelled, clear"


def _longwave_up(asked: Asked, surface: str) -> Iterator[dict[str, Any]]:
    emissivity = _broadband(asked, surface)
    groups = asked.of(surface, "temperature")
    if emissivity is None or not groups:
        yield from _missing(asked, surface, "longwave_up", "a temperature" if emissivity else
                            f"surfaces.{surface}.emissivity_broadband")
        return
    for group in groups:
        down, how = _longwave_down(asked, group)
        if down is None:
            yield from _missing(asked, surface, "longwave_up", "air temperature or humidity")
            continue
        yield _made(asked, surface, "longwave_up", group.kind, "W m-2", longwave_up,
                    [group, down, emissivity], how)


def _net_radiation(asked: Asked, surface: str) -> Iterator[dict[str, Any]]:
    emissivity, bright = _broadband(asked, surface), asked.of(surface, "albedo")
    groups = asked.of(surface, "temperature")
    if emissivity is None or not bright or not groups:
        yield from _missing(asked, surface, "net_radiation", "albedo, temperature or "
                            f"surfaces.{surface}.emissivity_broadband")
        return
    for group in groups:
        down, how = _longwave_down(asked, group)
        sun = group.mean("irradiance_w_m2")
        if down is None or not np.isfinite(sun):
            yield from _missing(asked, surface, "net_radiation", "air, humidity or irradiance")
            continue
        head = asked.day.channels["shortwave_down"][0]
        light = Input("irradiance", sun, float(np.hypot(head.u_gain * sun, head.u_offset)),
                      head.gain_scope, "")

        def net(t: Any, a: Any, g: Any, d: Any, e: Any) -> Any:
            return net_radiation(a, g, d, longwave_up(t, d, e))

        yield _made(asked, surface, "net_radiation", group.kind, "W m-2", net,
                    [group, bright[0], light, down, emissivity],
                    f"{how}; at the times of the temperature passes")


def _above_air(asked: Asked, surface: str) -> Iterator[dict[str, Any]]:
    for group in asked.of(surface, "temperature"):
        airs = [p.air for p in group.used if p.air is not None]
        if len(airs) < len(group.used):
            yield from _missing(asked, surface, "surface_minus_air", "air temperature")
            continue
        air = Input("air", group.mean("air_k"), airs[0].u, airs[0].scope, "")
        yield _made(asked, surface, "surface_minus_air", group.kind, "K", lambda t, a: t - a,
                    [group, air])


def _fraction(asked: Asked, surface: str) -> Iterator[dict[str, Any]]:
    limits = asked.day.parameters.campaign.settings.ndvi
    ends = [Input("bare", limits.bare_ndvi, limits.cover_ndvi_u, f"{asked.day.name}:bare", ""),
            Input("full", limits.full_ndvi, limits.cover_ndvi_u, f"{asked.day.name}:full", "")]
    entry = asked.day.parameters.campaign.surfaces[surface].emissivity
    for group in asked.of(surface, "ndvi"):
        form = (entry.form if entry is not None else None) or "linear"

        def share(n: Any, low: Any, high: Any, form: Any = form) -> Any:
            return vegetation_fraction(n, low, high, form)

        outside = not limits.bare_ndvi <= group.value <= limits.full_ndvi
        yield _made(asked, surface, "vegetation_fraction", form, "1", share, [group, *ends],
                    f"from NDVI; {NOT_FOR}" + ("; NDVI outside its range, cut" if outside else ""))


def _savi(asked: Asked, surface: str) -> Iterator[dict[str, Any]]:
    factor = asked.day.parameters.campaign.settings.ndvi.soil_factor
    for group in asked.of(surface, "ndvi"):
        values = []
        for p in group.used:
            values.append(float(savi(*models.reflectances({i.name: i.value for i in p.inputs}),
                                     factor)))
        yield _row(asked, surface, "savi", f"L {factor:g}", "1", None,
                   value=float(np.dot(group.weights, values)),
                   note="needs the absolute reflectances: gains as calibrated, or over a panel")


def _daily(asked: Asked, surface: str) -> Iterator[dict[str, Any]]:
    """Energy-weighted albedo of a clear day, from the declared zenith dependence."""
    settings = asked.day.parameters.campaign.settings.albedo
    for group in [g for g in asked.of(surface, "albedo") if g.kind == "clear"]:
        start = group.used[0].this.start_ns // NS_A_DAY * NS_A_DAY
        site = asked.day.parameters.campaign.site
        shift = round(-site.longitude / 360 * NS_A_DAY)
        times = start + shift + np.arange(0, NS_A_DAY, 300 * 10**9, dtype=np.int64)
        sun = asked.day.sun(times)
        zenith = float(np.degrees(np.arccos(group.mean("cos_zenith"))))
        d = Input("d", settings.zenith_dependence, settings.zenith_dependence_u,
                  f"{surface}:zenith dependence", "")

        def whole(albedo: Any, strength: Any, sun: Any = sun, zenith: float = zenith) -> Any:
            return albedo * daily_factor(sun.zenith_deg, sun.clear_sky_w_m2, zenith, strength)

        yield _made(asked, surface, "daily_albedo", "clear sky", "1", whole, [group, d],
                    f"d = {d.value:g} with u {d.u:g} as set")


def _caution(asked: Asked) -> Iterator[dict[str, Any]]:
    """Compare the hottest pass plus U with the temperature that the user entered."""
    caution = asked.day.parameters.campaign.caution
    assert caution is not None
    for group in asked.groups.values():
        if group.quantity != "temperature" or not np.isfinite(group.value):
            continue
        hottest = max(p.value for p in group.used) - 273.15
        if group.result is None:
            yield _row(asked, group.surface, "caution", group.kind, "degC", None, value=hottest,
                       note="one pass: no upper bound can be given")
            continue
        upper = hottest + summarise(group.result, asked.coverage).upper - group.value
        over = upper > caution.temperature_degC
        row = _row(asked, group.surface, "caution", group.kind, "degC", None, value=hottest)
        yield row | {"upper": upper, "status": "ok", "note": (
            f"caution: the upper bound of the hottest pass, {upper:.0f} degC, exceeds the "
            f"{caution.temperature_degC:g} degC entered ({caution.source}); consult local codes "
            "and the safety officer" if over else
            f"the upper bound stays below the {caution.temperature_degC:g} degC entered "
            f"({caution.source})")}


def e1918_deviations(day: Day, estimate: PassEstimate) -> list[str]:
    """Return in what an albedo pass departs from the conditions of ASTM E1918."""
    this, settings = estimate.this, day.parameters.campaign.settings.albedo
    away = []
    if not estimate.zenith_deg <= settings.zenith_standard_deg:
        away.append(f"zenith above {settings.zenith_standard_deg:g} degrees")
    if estimate.sky.kind != "clear":
        away.append("sky not clear")
    if abs(this.height_m - 0.5) > 0.05:
        away.append("head not at 50 cm")
    if not np.nanmin([this.length_m, this.width_m]) >= 4.0:
        away.append("patch below 4 m")
    return [*away, "slope not recorded"]


PRODUCTS: dict[str, Callable[[Asked, str], Iterator[dict[str, Any]]]] = {
    "sri": _sri, "net_radiation": _net_radiation, "longwave_up": _longwave_up,
    "surface_minus_air": _above_air, "vegetation_fraction": _fraction, "savi": _savi,
    "daily_albedo": _daily,
}
