"""What follows from a surface's values when it is asked for: energy, indices, daily albedo."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from typing import Any, Literal

import numpy as np

from surveykit.core import Input
from surveykit.evidence import e1918, models
from surveykit.evidence.conditions import Day
from surveykit.evidence.emissivities import NOT_FOR
from surveykit.evidence.parts import fixed, surface_scope
from surveykit.evidence.surfaces import Group, pool_passes
from surveykit.physics.bands import SIGMA
from surveykit.physics.energy import (
    SRI_CONVECTION,
    longwave_up,
    net_radiation,
    solar_reflectance_index,
)
from surveykit.physics.shortwave import daily_factor
from surveykit.physics.surroundings import sky_emissivity_full, vapour_pressure_hpa
from surveykit.physics.vegetation import vegetation_fraction
from surveykit.statistics.draws import Draws, Result, combine, summarise

NS_A_DAY = 86_400_000_000_000
FOOTPRINT = 0.94  # what E1918's own geometry sees: a disc of 2 m below a head at 50 cm
Row = dict[str, Any]
Rows = Iterator[Row]


@dataclass(frozen=True)
class Asked:
    """One product of one surface, and all that it may be made of."""

    day: Day
    groups: tuple[Group, ...]
    draws: Draws
    coverage: float
    surface: str
    product: str

    def of(self, quantity: str) -> list[Group]:
        """Return the groups of the surface and a quantity that have a value."""
        return [g for g in self.groups
                if g.key[:2] == (self.surface, quantity) and np.isfinite(g.value)]

    @property
    def broadband(self) -> Input | None:
        """The surface's broadband emissivity, if stated."""
        entry = self.day.parameters.campaign.surfaces[self.surface].emissivity_broadband
        return None if entry is None else Input(
            "emissivity_broadband", float(entry.value or 0), float(entry.u or 0),
            surface_scope("emissivity broadband", self.surface, entry), "")

    def missing(self, what: str) -> Row:
        """Return the row of a product that lacks something."""
        return self.row("", "1", None, note=f"{what} is missing")

    def row(self, form: str, unit: str, result: Result | None, *, value: float = np.nan,
            note: str = "") -> Row:
        """Return a row of the table `derived`; without a result there is no interval."""
        row: Row = {
            "campaign": self.day.name, "surface": self.surface, "product": self.product,
            "form": form, "unit": unit, "value": value, "u": np.nan, "lower": np.nan,
            "upper": np.nan, "coverage": self.coverage, "note": note,
            "status": "value only" if np.isfinite(value) else "not evaluated"}
        if result is not None:
            s = summarise(result, self.coverage)
            row |= {"value": s.value, "u": s.u, "lower": s.lower, "upper": s.upper, "status": "ok"}
        return row

    def made(self, form: str, unit: str, function: Callable[..., Any],
             parts: Sequence[Group | Input], note: str = "") -> Row:
        """Return a row of a function of groups and inputs; without repeats it has a value only."""
        results = [p.result if isinstance(p, Group) else self._known(p) for p in parts]
        if any(r is None for r in results):
            return self.row(form, unit, None, value=float(function(*(p.value for p in parts))),
                            note="; ".join(filter(None, [note, "no repeats: no interval"])))
        return self.row(form, unit, combine(function, *(r for r in results if r is not None)),
                        note=note)

    def _known(self, one: Input) -> Result:
        moved = one.value + one.u * self.draws.standard(one.scope, one.distribution)
        return Result(one.value, moved, moved, ())


def sri(asked: Asked) -> Rows:
    """Solar reflectance index by the balance and by the equation, for three winds."""
    emissivity = asked.broadband
    clear = [g for g in asked.of("albedo") if g.kind == "clear"]
    if emissivity is None or not clear:
        yield asked.missing("a clear-sky albedo" if emissivity else
                            f"surfaces.{asked.surface}.emissivity_broadband")
        return
    group = clear[0]
    met = _e1980(asked, group)
    note = e1918.told(met, name="E1980", like="SRI-like, not by E1980")
    like = {"status": "qualified"} if any(c.state != "met" for c in met) else {}
    for wind, convection in SRI_CONVECTION.items():
        for place, how in enumerate(("balance", "equation")):
            def index(albedo: Any, eps: Any, h: float = convection, n: int = place) -> Any:
                return solar_reflectance_index(albedo, eps, h)[n]

            row = asked.made(f"{how}, {wind} wind", "1", index, [group, emissivity], note)
            yield row | (like if row["status"] == "ok" else {})


def _e1980(asked: Asked, group: Group) -> list[e1918.Condition]:
    """Return the worst of the conditions of a surface's passes; those of E1918, and the view."""
    shares = [i.value for p in group.used for i in p.inputs if i.name == "footprint_share"]
    seen = min(shares)
    return [*e1918.worst([e1918.conditions(asked.day, p, group.used) for p in group.used]),
            e1918.Condition("view", "met" if seen >= FOOTPRINT else "not met",
                            f"patch fills {seen:.2f} of the view, not {FOOTPRINT:g}")]


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


def upward_longwave(asked: Asked) -> Rows:
    """Longwave that leaves the surface: emitted, and reflected from the sky."""
    emissivity, groups = asked.broadband, asked.of("temperature")
    if emissivity is None or not groups:
        yield asked.missing("a temperature" if emissivity else
                            f"surfaces.{asked.surface}.emissivity_broadband")
        return
    for group in groups:
        down, how = _longwave_down(asked, group)
        yield asked.missing("air temperature or humidity") if down is None else asked.made(
            group.kind, "W m-2", longwave_up, [group, down, emissivity], how)


def net(asked: Asked) -> Rows:
    """Net radiation at the times of the temperature passes."""
    emissivity, bright, groups = asked.broadband, asked.of("albedo"), asked.of("temperature")
    if emissivity is None or not bright or not groups:
        yield asked.missing("albedo, temperature or "
                            f"surfaces.{asked.surface}.emissivity_broadband")
        return
    for group in groups:
        down, how = _longwave_down(asked, group)
        sun = group.mean("irradiance_w_m2")
        if down is None or not np.isfinite(sun):
            yield asked.missing("air, humidity or irradiance")
            continue
        head = asked.day.channels["shortwave_down"][0]
        light = Input("irradiance", sun, float(np.hypot(head.u_gain * sun, head.u_offset)),
                      head.gain_scope, "")

        def balance(t: Any, a: Any, g: Any, d: Any, e: Any) -> Any:
            return net_radiation(a, g, d, longwave_up(t, d, e))

        yield asked.made(group.kind, "W m-2", balance, [group, bright[0], light, down, emissivity],
                         f"{how}; at the times of the temperature passes")


def above_air(asked: Asked) -> Rows:
    """Surface temperature less air temperature."""
    for group in asked.of("temperature"):
        airs = [p.air for p in group.used if p.air is not None]
        if len(airs) < len(group.used):
            yield asked.missing("air temperature")
            continue
        air = Input("air", group.mean("air_k"), airs[0].u, airs[0].scope, "")
        yield asked.made(group.kind, "K", lambda t, a: t - a, [group, air])


def fraction(asked: Asked) -> Rows:
    """Share of the ground that vegetation covers, by the form declared."""
    limits = asked.day.parameters.campaign.settings.ndvi
    ends = [Input("bare", limits.bare_ndvi, limits.cover_ndvi_u, f"{asked.day.name}:bare", ""),
            Input("full", limits.full_ndvi, limits.cover_ndvi_u, f"{asked.day.name}:full", "")]
    entry = asked.day.parameters.campaign.surfaces[asked.surface].emissivity
    form: Literal["linear", "squared"] = (
        "squared" if entry is not None and entry.form == "squared" else "linear")
    for group in asked.of("ndvi"):
        outside = not limits.bare_ndvi <= group.value <= limits.full_ndvi
        yield asked.made(form, "1", lambda n, low, high: vegetation_fraction(
            n, low, high, form), [group, *ends],
                         f"from NDVI; {NOT_FOR}" + ("; NDVI outside its range, cut" if outside
                                                    else ""))


def soil_adjusted(asked: Asked) -> Rows:
    """Soil-adjusted vegetation index: the passes of the NDVI, pooled anew."""
    factor = asked.day.parameters.campaign.settings.ndvi.soil_factor
    for group in asked.of("ndvi"):
        passes = []
        for p in group.used:
            inputs = (*p.inputs, fixed("soil_factor", factor))
            x = {i.name: i.value for i in inputs}
            whole = sum(float(part) for part in models.reflectances(x))
            passes.append(replace(
                p, model="savi", inputs=inputs, value=float(models.MODELS["savi"](x)),
                u_within=p.u_within / x.get("conversion_slope", 1.0) * (1 + factor) * whole
                / (whole + factor)))
        made = pool_passes(asked.day.name, (asked.surface, "savi", ""), passes, asked.draws,
                           asked.coverage)
        yield asked.row(f"L {factor:g}", "1", made.result, value=made.value,
                        note="needs the absolute reflectances: gains as calibrated, or a panel")


def daily(asked: Asked) -> Rows:
    """Energy-weighted albedo of a clear day, from the declared zenith dependence."""
    settings, site = (asked.day.parameters.campaign.settings.albedo,
                      asked.day.parameters.campaign.site)
    for group in [g for g in asked.of("albedo") if g.kind == "clear"]:
        start = group.used[0].this.start_ns // NS_A_DAY * NS_A_DAY
        shift = round(-site.longitude / 360 * NS_A_DAY)
        sun = asked.day.sun(start + shift + np.arange(0, NS_A_DAY, 300 * 10**9, dtype=np.int64))
        zenith = float(np.degrees(np.arccos(group.mean("cos_zenith"))))
        d = Input("d", settings.zenith_dependence, settings.zenith_dependence_u,
                  f"{asked.surface}:zenith dependence", "")

        def whole(albedo: Any, strength: Any, sun: Any = sun, zenith: float = zenith) -> Any:
            return albedo * daily_factor(sun.zenith_deg, sun.clear_sky_w_m2, zenith, strength)

        yield asked.made("clear sky", "1", whole, [group, d], f"d = {d.value:g} with u {d.u:g} as "
                         f"set; from {zenith:.0f} degrees of zenith angle")


PRODUCTS: dict[str, Callable[[Asked], Rows]] = {
    "sri": sri, "net_radiation": net, "longwave_up": upward_longwave,
    "surface_minus_air": above_air, "vegetation_fraction": fraction, "savi": soil_adjusted,
    "daily_albedo": daily,
}
