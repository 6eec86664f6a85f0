"""Pass estimates made by hand for the tests of this folder, through the package's own models."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np
from small_survey import KIT, SITE

from surveykit.core import Input
from surveykit.evidence.comparability import Date
from surveykit.evidence.conditions import Sky
from surveykit.evidence.estimates import PassEstimate
from surveykit.evidence.models import MODELS
from surveykit.evidence.moving import Batch
from surveykit.evidence.surfaces import Group, groups
from surveykit.intake.params import Campaign, Channel, Instrument, Parameters
from surveykit.intake.params.settings import Settings
from surveykit.intake.passes import Pass
from surveykit.statistics.draws import Draws

DRAWS = Draws(20251, 20000)
NS = 1_000_000_000
CLEAR = Sky(900.0, 1.0, "clear")
CLOUD = Sky(300.0, 0.3, "diffuse")
LOGGERS = {"temperature": "thermal", "albedo": "pair", "ndvi": "rednir-sky"}
ALBEDO_REST = ("footprint_share=1 footprint_per_m=0 shade_share=0 shade_per_m=0 around_albedo=0 "
               "around_error=0 contamination_error=0 height_error=0 shade_error=0 up_gain_error=0 "
               "down_gain_error=0 up_zero_error=0 down_zero_error=0 directional_error=0 "
               "levelling_error=0")
NDVI_REST = ("footprint_share=1 footprint_per_m=0 around_ndvi=0 around_error=0 "
             "contamination_error=0 height_error=0 red_up_gain_error=0 red_down_gain_error=0 "
             "nir_up_gain_error=0 nir_down_gain_error=0 red_up_zero_error=0 red_down_zero_error=0 "
             "nir_up_zero_error=0 nir_down_zero_error=0")
THERMAL_REST = ("emissivity=1 gain_reading=0 gain_error=0 offset_error=0 body_rate_error=0 "
                "body_rate_k_min=0 band_low_um=8 band_high_um=14 air_k=303.15 "
                "relative_humidity=.3 sky_factor=1 sky_view=1 walls_k=303.15 walls_emissivity=.92")


def inputs(rest: str, *uncertain: Input, **values: float) -> tuple[Input, ...]:
    """Return the inputs of a model: those given, and the rest without uncertainty."""
    held = {name: float(value) for name, value in (pair.split("=") for pair in rest.split())}
    held |= values
    for one in uncertain:
        held.pop(one.name, None)
    return (*(Input(name, value, 0.0, "", "") for name, value in held.items()), *uncertain)


def albedo(value: float, *uncertain: Input) -> tuple[Input, ...]:
    return inputs(ALBEDO_REST, *uncertain, up=1000 * value, down=1000.0)


def ndvi(red: float, nir: float, *uncertain: Input) -> tuple[Input, ...]:
    return inputs(NDVI_REST, *uncertain, red_up=100 * red, red_down=100.0, nir_up=100 * nir,
                  nir_down=100.0)


def kelvin(value: float, *uncertain: Input) -> tuple[Input, ...]:
    """A black surface seen from above: the reading is the temperature."""
    return inputs(THERMAL_REST, *uncertain, brightness_k=value)


def error(name: str, u: float, scope: str, distribution: Any = "normal") -> Input:
    return Input(name, 0.0, u, scope, f"source of {scope}", distribution)


def evaluate(model: str, these: Sequence[Input]) -> float:
    """Return the model at its inputs' own values."""
    return float(MODELS[model]({i.name: i.value for i in these}))


def sensitivities(model: str, these: Sequence[Input]) -> dict[str, float]:
    """Return per uncertain input its signed contribution, as the budget of one pass has it."""
    parts = ({i.name: np.array([getattr(i, part)]) for i in these} for part in ("value", "u"))
    batch = Batch((0,), model, tuple(these), *parts)
    return {name: float(moved[0]) for name, moved in batch.slopes.items()}


def channel_of(logger: str, **changed: Any) -> dict[str, Channel]:
    entry = Instrument.model_validate(KIT[logger] | changed)
    return {c.quantity: c for c in entry.channels(logger, Settings())}


def one_pass(these: tuple[Input, ...], *, surface: str = "court", patch: str = "C1", n: int = 1,
             quantity: str = "temperature", u_within: float = 0.1, sky: Sky = CLEAR,
             zenith_deg: float = 30.0, air_k: float | None = 303.15, air_u: float = 0.0,
             wind_m_s: float = 2.0, hour: float = 12.0, flags: tuple[str, ...] = (),
             note: str = "", kind: str | None = None, logger: str = "",
             **kit: Any) -> PassEstimate:
    """Return one pass; a `note` makes it one that was not evaluated."""
    word = {"temperature": "stand-off", "albedo": sky.kind, "ndvi": ""}[quantity]
    kind = word if kind is None else kind
    model = "stand-off" if quantity == "temperature" else quantity
    start = round(hour * 3600) * NS
    this = Pass(
        name=f"{patch}-{quantity}-{n}", surface=surface, patch=patch, quantity=quantity,
        kind="stand-off" if quantity == "temperature" else "", mode="", row=n, start_ns=start,
        stop_ns=start + 60 * NS, trim_s=0.0, from_ns=start, to_ns=start + 60 * NS,
        channels=channel_of(logger or LOGGERS[quantity], **kit), height_m=0.4, width_m=4.0,
        length_m=4.0, lanes=0, reading=float("nan"))
    value = float("nan") if note else evaluate(model, these)
    air = None if air_k is None else Input("air_temperature", air_k, air_u, "weather:air", "air")
    return PassEstimate(
        this, kind, model, value, value, u_within, 100, 50.0, zenith_deg, sky, air, wind_m_s,
        "not evaluated" if note else "ok", note, flags, () if note else these)


def pooled(passes: Sequence[PassEstimate], *, campaign: str = "yard",
           coverage: float = 0.95) -> tuple[Group, ...]:
    return groups(campaign, passes, DRAWS, coverage=coverage)


def only(passes: Sequence[PassEstimate], **more: Any) -> Group:
    (group,) = pooled(passes, **more)
    return group


def parameters(name: str = "yard", day: str = "2025-06-11", *, control: str | None = "control",
               sky: str | None = "clear", rain: float | None = 0.0,
               settings: dict[str, Any] | None = None) -> Parameters:
    campaign = Campaign.model_validate({
        "campaign": name, "title": "Yard", "date": day, "site": SITE,
        "instruments": {"pair": KIT["pair"]}, "data_folder": "data", "field_sheet": "sheet.csv",
        "loggers": {"pair": {"files": "pair.csv", "clock": {"offset_s": 0, "u_s": 0}}},
        "surfaces": {s: {"label": s} for s in ("court", "lawn", "control", "path")},
        "conditions": {"sky": sky, "rain_48h_mm": rain}, "settings": settings or {},
        "comparison": {"control": control}})
    return Parameters(Path("params/yard.yml"), Path(), campaign, {}, None, ())


def date(passes: Sequence[PassEstimate], name: str = "yard", **more: Any) -> Date:
    found = pooled(passes, campaign=name)
    return Date(parameters(name, **more), {group.key: group for group in found})


def heat(name: str, values: dict[str, float], *, u: float = 0.05,
         shared: tuple[Input, ...] = (), n: int = 4, **more: Any) -> Date:
    """Temperatures [K] by surface, four passes each on its own patch."""
    stated = {k: more.pop(k) for k in ("control", "rain", "settings") if k in more}
    some = [one_pass(kelvin(value, *shared), surface=surface, patch=f"{surface}{i}", n=i,
                     u_within=u, **more)
            for surface, value in values.items() for i in range(n)]
    return date(some, name, **stated)


def bright(name: str, values: dict[str, float], *, u: float = 0.001,
           shared: tuple[Input, ...] = (), day: str = "2025-06-11", n: int = 4,
           **more: Any) -> Date:
    """Albedos by surface, likewise."""
    stated = {k: more.pop(k) for k in ("control", "rain") if k in more}
    some = [one_pass(albedo(value, *shared), surface=surface, patch=f"{surface}{i}", n=i,
                     quantity="albedo", u_within=u, **more)
            for surface, value in values.items() for i in range(n)]
    return date(some, name, day=day, **stated)
