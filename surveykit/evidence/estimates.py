"""One estimate a pass: the model's value over its good records, and its uncertain inputs.

The value is made from the pass's records; the inputs, their uncertainties and whom they belong to
(scope ids) go along, so that every later result draws upon the same errors.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from surveykit.core import FloatArray, Input
from surveykit.evidence.albedo import albedo
from surveykit.evidence.conditions import Day, Sky
from surveykit.evidence.hills import TWO_KINDS, histogram, two_kinds
from surveykit.evidence.mapping import patch_mean
from surveykit.evidence.parts import NotEvaluated, PassValue
from surveykit.evidence.temperature import contact, longwave, stand_off
from surveykit.evidence.vegetation import vegetation_index
from surveykit.intake.passes import Pass

MAKERS: dict[str, Callable[[Day, Pass, Sky], PassValue]] = {
    "contact": contact, "stand-off": stand_off, "longwave": longwave, "albedo": albedo,
    "ndvi": vegetation_index,
}
UNITS = {"temperature": "degC", "albedo": "1", "ndvi": "1"}


@dataclass(frozen=True)
class PassEstimate:
    """A pass's value with everything that later stages need of it.

    Temperatures are in K here. A pass that could not be evaluated has NaN values, no inputs, and
    `note` says why. Weather and irradiance are NaN where nothing told them. `u_within` is that of
    the patch's mean where the walk was mapped, else that of a series in time; `bars` (lower, upper,
    records) are the histogram of a pass whose readings fall into two groups.
    """

    this: Pass
    kind: str
    model: str
    value_raw: float
    value: float
    u_within: float
    n_records: int
    n_effective: float
    zenith_deg: float
    sky: Sky
    air: Input | None
    wind_m_s: float
    status: str
    note: str
    flags: tuple[str, ...]
    inputs: tuple[Input, ...] = ()
    steps: tuple[tuple[str, float], ...] = ()
    dwells: tuple[tuple[int, int, float, float, int], ...] = ()
    bars: tuple[tuple[float, float, int], ...] = ()

    @property
    def air_k(self) -> float:
        """Air temperature [K] during the pass; NaN where nothing told it."""
        return self.air.value if self.air else float("nan")

    @property
    def cos_zenith(self) -> float:
        """Cosine of the sun's zenith angle [1]."""
        return float(np.cos(np.radians(self.zenith_deg)))

    @property
    def irradiance_w_m2(self) -> float:
        """Irradiance [W m-2] during the pass; NaN where no shortwave head watched the sky."""
        return self.sky.irradiance_w_m2

    @property
    def middle_ns(self) -> float:
        """Middle of the pass [ns UTC]."""
        return (self.this.start_ns + self.this.stop_ns) / 2

    @property
    def evaluated(self) -> bool:
        """Whether the pass has a value."""
        return self.status != "not evaluated"


def estimate(day: Day, this: Pass) -> PassEstimate:
    """Return the estimate of one pass; never raises for a fault of the data, but says it."""
    records = day.quality.passes[this.name]
    model = this.kind or this.quantity
    sky = day.sky(this.start_ns, this.stop_ns)
    air, wind = day.weather("air_temperature", this), day.weather("wind_speed", this)
    base = PassEstimate(
        this, this.kind or (sky.kind if this.quantity == "albedo" else ""), model,
        np.nan, np.nan, np.nan, int(records.index.size), np.nan, records.zenith_deg, sky,
        air, wind.value if wind else np.nan,
        "not evaluated", records.refusal, ())
    if records.refusal:
        return base
    try:
        made = MAKERS[model](day, this, sky)
    except NotEvaluated as refusal:
        return replace(base, note=str(refusal))
    if not np.isfinite(made.value):
        return replace(base, note="the readings lie outside the range of the model")
    flags = made.flags + records.flags + this.notes
    if made.n_effective < day.parameters.campaign.settings.statistics.few_effective and \
            model != "contact":  # which counts placements, with a flag of its own
        flags += ("few effective records",)
    u_within = made.u_within
    bars: tuple[tuple[float, float, int], ...] = ()
    if made.records is not None:
        of_patch, more = patch_mean(day, this, made.records)
        u_within, flags = u_within if np.isnan(of_patch) else of_patch, flags + more
        if two_kinds(made.records, made.u_within, made.n_effective):
            flags += (TWO_KINDS,)
            bars = histogram(made.records - made.records.mean() + made.value)
    return replace(
        base, value_raw=made.value_raw, value=made.value, u_within=u_within,
        n_effective=made.n_effective, status="ok", note="", flags=flags, inputs=made.inputs,
        steps=made.steps, dwells=made.dwells, bars=bars)


def estimate_all(day: Day, passes: tuple[Pass, ...]) -> tuple[PassEstimate, ...]:
    """Return the estimates of all passes, in the order of the passes."""
    day = replace(day, passes=passes)
    return tuple(estimate(day, this) for this in passes)


def display(values: FloatArray | float, quantity: str) -> FloatArray | float:
    """Return values in the unit people read: K becomes degC, the others stay."""
    return values - 273.15 if quantity == "temperature" else values
