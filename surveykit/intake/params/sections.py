"""The sections of a campaign's parameter file."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import UTC, datetime
from typing import Annotated, Any, Literal
from zoneinfo import ZoneInfo

from pydantic import AfterValidator, BeforeValidator, Field

from surveykit.intake.params.amounts import (
    Amount,
    BareNumber,
    FromSettings,
    Uncertain,
    given_once,
    whole,
)
from surveykit.intake.params.base import (
    DATE_WRITE,
    TEXT_WRITE,
    DateText,
    Fault,
    Name,
    Strict,
    Text,
    fault,
    key,
    twice,
)
from surveykit.intake.params.instruments import one_or_more, zone_fault
from surveykit.intake.params.timekeeping import Clock

MAX_ZONE_GAP_H = 3.5
Elevation = Annotated[float, Field(ge=0, le=90)]


def _zone(zone: str) -> str:
    wrong = zone_fault(zone)
    if wrong:
        raise fault(wrong)
    return zone


class Walls(Strict):
    """What hides part of the sky."""

    temperature_degC: Annotated[  # noqa: N815 - the unit is written so
        Uncertain, BareNumber("temperature.walls_u_k", -60, 120, "degC")] = key(
        "Temperature; where walls are absent, the air's.",
        write="a number in degC, or {value, u}")
    emissivity: Annotated[float, FromSettings("temperature.walls_emissivity")] = key(
        "Emissivity; absent: settings.temperature.walls_emissivity.", default=None,
        validate_default=True, gt=0, le=1, unit="")


class Site(Strict):
    """Where the campaign took place."""

    name: Text = key("Name of the site.", write=TEXT_WRITE)
    latitude: float = key("Degrees north; south negative.", ge=-90, le=90,
                          write="degrees north, a number from -90 to 90, south negative")
    longitude: float = key("Degrees east; west negative.", ge=-180, le=180,
                           write="degrees east, a number from -180 to 180, west negative")
    elevation_m: float = key("Height above sea level.", ge=-450, le=9000, unit="m")
    time_zone: Annotated[str, AfterValidator(_zone)] = key(
        "Time zone of the field sheet: UTC or an IANA name.",
        write="UTC or an IANA name such as Europe/Lisbon")
    sky_view: Annotated[Uncertain, BareNumber("temperature.sky_view_u", 0.0, 1.0)] = key(
        "Share of the sky seen from the ground.", default=1.0, validate_default=True,
        write="a number from 0 to 1, or {value, u}")
    horizon_deg: Annotated[tuple[Elevation, ...], Field(strict=False, min_length=4)] | None = key(
        "Elevation of the horizon in evenly spaced directions all round, in place of sky_view.",
        default=None, write="a list of four or more elevations from 0 to 90, such as one every 45 "
        "degrees, in degrees")
    walls: Walls | None = key("What hides the rest of the sky.", default=None,
                              write="{temperature_degC, emissivity}")

    def faults(self) -> Iterator[Fault]:
        """The sky's share once; longitude and time zone must belong together."""
        if self.horizon_deg is not None and "sky_view" in self.model_fields_set:
            yield ("horizon_deg",), "got it beside sky_view; write one of the two"
        if self.time_zone in ("UTC", "Etc/UTC", "Etc/UCT", "UCT", "Zulu", "Etc/Zulu", "Universal",
                              "Etc/Universal"):
            return
        offset_h = _standard_offset_h(self.time_zone)
        gap = (self.longitude / 15 - offset_h + 12) % 24 - 12
        if abs(gap) > MAX_ZONE_GAP_H:
            yield ("longitude",), (
                f"got {self.longitude:g}, {abs(gap):.1f} h of sun away from time_zone "
                f"{self.time_zone} ({offset_h:+g} h); write degrees east (west negative), "
                "or the zone of the site")


def _standard_offset_h(zone: str) -> float:
    # Standard time is the smaller of the offsets of winter and summer, either hemisphere.
    offsets = [datetime(2025, month, 1, tzinfo=UTC).astimezone(ZoneInfo(zone)).utcoffset()
               for month in (1, 7)]
    return min(offset.total_seconds() for offset in offsets if offset is not None) / 3600


class LoggerUse(Strict):
    """One logger's files and clock on this day."""

    files: Annotated[
        tuple[Text, ...], Field(strict=False, min_length=1),
        BeforeValidator(one_or_more, json_schema_input_type=Text | list[Text])] = key(
        "Its files in data_folder; * and ? stand for any text.",
        write='a file name or a pattern such as "thermal*.csv", or a list of them')
    clock: Clock | None = key("Its clock; absent: not checked.", default=None,
                              write="{offset_s, u_s}")


# how an emissivity is found: (keys that it needs, keys that may stand beside them)
_WAYS = {"from: None": (("value", "u", "source"), ()),
         "from: ndvi": (("vegetation", "soil", "u"), ("form",)),
         "from: ndvi, form: logarithmic": (("u",), ("form",))}


class Emissivity(Strict):
    """An emissivity: stated with its u and source, or to be found on the day."""

    value: float | None = key("The emissivity.", default=None, gt=0, le=1, unit="")
    u: float | None = key("Its standard uncertainty (k = 1).", default=None, ge=0, le=1, unit="")
    source: Text | None = key("Where it comes from.", default=None,
                              write="where the value comes from, plain text")
    from_: Literal["reference_pairs", "two_backgrounds", "ndvi"] | None = key(
        "How it is found on the day, in place of value: reference or lid rows of the sheet, or "
        "the surface's NDVI.", default=None, alias="from",
        write="reference_pairs, two_backgrounds or ndvi")
    vegetation: float | None = key(
        "Emissivity of full vegetation, from: ndvi.", default=None, gt=0, le=1, unit="")
    soil: float | None = key(
        "Emissivity of bare ground, from: ndvi.", default=None, gt=0, le=1, unit="")
    form: Literal["linear", "squared", "logarithmic"] | None = key(
        "Form of the vegetation fraction, from: ndvi; absent: linear; or logarithmic in NDVI, for "
        "natural ground, without vegetation and soil.", default=None,
        write="linear, squared or logarithmic")

    def faults(self) -> Iterator[Fault]:
        """Each way needs its own keys and takes no others."""
        way = f"from: {self.from_}" + (", form: logarithmic" if self.from_ == "ndvi"
                                       and self.form == "logarithmic" else "")
        needed, optional = _WAYS.get(way, ((), ()))
        for name, info in type(self).model_fields.items():
            given = getattr(self, name) is not None
            extra: Any = info.json_schema_extra
            if name in needed and not given:
                yield (name,), f"missing; write {extra['write']}"
            if given and name not in (*needed, *optional, "from_"):
                yield (name,), (f"does not go with {way}; leave it out" if self.from_
                                else "goes with from: ndvi only; leave it out")


class Around(Strict):
    """What surrounds a patch."""

    albedo: Annotated[Amount, BareNumber(None, 0.0, 1.0)] = key(
        "Its albedo.", write="a number from 0 to 1, or {value, u}")
    u: float | None = key("Standard uncertainty of albedo.", default=None, ge=0, unit="1")

    def faults(self) -> Iterator[Fault]:
        """The u of the albedo, once."""
        yield from given_once("albedo", self.albedo, "u", self.u)
        if self.albedo.u is None and self.u is None:
            yield ("u",), "missing; write the standard uncertainty of albedo"

    @property
    def amount(self) -> Uncertain:
        """The albedo with its u."""
        return whole(self.albedo, self.u)


class Surface(Strict):
    """A kind of ground."""

    label: Text = key("Its name on the page.", write=TEXT_WRITE)
    emissivity: Emissivity | None = key("Emissivity in the band of the infrared head.",
                                        default=None, write="{value, u, source}")
    emissivity_broadband: Emissivity | None = key(
        "Emissivity over all wavelengths, for longwave pairs, net radiation and the solar "
        "reflectance index.", default=None, write="{value, u, source}")
    reflection: Literal["diffuse", "specular"] = key(
        "How it reflects in the thermal band: rough ground shows the whole sky, polished ground "
        "seen from above the sky overhead.", default="diffuse", write="diffuse or specular")
    slope_deg: float | None = key(
        "Its slope, for the conditions of published methods.", default=None, ge=0, le=90,
        unit="deg")
    around: Around | None = key("What surrounds its patches.", default=None, write="{albedo, u}")

    def faults(self) -> Iterator[Fault]:
        """A broadband emissivity is stated."""
        broad = self.emissivity_broadband
        if broad is not None and broad.from_ is not None:
            yield ("emissivity_broadband", "from"), "does not go here; write value, u and source"


class Conditions(Strict):
    """What was noted of the weather."""

    sky: Literal["clear", "broken", "overcast"] | None = key(
        "The sky as seen.", default=None, write="clear, broken or overcast")
    rain_48h_mm: float | None = key(
        "Rain in the 48 h before.", default=None, ge=0, le=2000, unit="mm")


class Intervention(Strict):
    """Something done to a surface, marked in every comparison across that day."""

    date: DateText = key("Day at the site.", write=DATE_WRITE)
    surface: Name = key("The surface it was done to.", write="the name of one of surfaces")
    text: Text = key("What was done.", write=TEXT_WRITE)


class RelevantChange(Strict):
    """The smallest difference that matters."""

    temperature: float = key("Of temperatures [K].", default=1.0, gt=0, unit="K")
    albedo: float = key("Of albedos.", default=0.02, gt=0, unit="")
    ndvi: float = key("Of NDVI.", default=0.03, gt=0, unit="")

    def of(self, quantity: str) -> float:
        """Return that of a quantity: temperature [K], albedo or ndvi."""
        return float(getattr(self, quantity))


class Comparison(Strict):
    """Comparison with earlier campaigns."""

    earlier: Annotated[tuple[Text, ...], Field(strict=False)] = key(
        "Parameter files of earlier campaigns, from the project folder.", default=(),
        write="a list such as [params/mill-yard-2025-06-12.yml]")
    control: Name | None = key("The surface left unchanged.", default=None,
                               write="the name of one of surfaces")
    second_control: Name | None = key(
        "Another surface left unchanged: the two are held against each other.", default=None,
        write="the name of one of surfaces, not that of control")
    families: dict[Name, Annotated[tuple[Name, ...], Field(strict=False, min_length=2)]] = key(
        "Surfaces to be compared with each other, fixed before looking; absent: all of them.",
        default_factory=dict, write="{name: [surface, surface, ...]}")
    relevant_change: RelevantChange = key(
        "The smallest difference that matters.", default_factory=RelevantChange,
        write="{temperature, albedo, ndvi}")

    def faults(self) -> Iterator[Fault]:
        """A family names each surface once."""
        for family, names in self.families.items():
            yield from twice(("families", family), names, "surface")
