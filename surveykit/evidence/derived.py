"""The table `derived`: what was asked for beside the measured quantities, and the caution."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
import pandas as pd

from surveykit.core import FloatArray, table
from surveykit.evidence.conditions import Day
from surveykit.evidence.estimates import PassEstimate
from surveykit.evidence.models import MODELS
from surveykit.evidence.parts import raw_series
from surveykit.evidence.products import PRODUCTS, Asked, Row
from surveykit.evidence.surfaces import Group
from surveykit.statistics.draws import Draws, summarise

HOTTEST = 0.95  # quantile of the records that a caution looks at
SERIES = {"longwave": {"longwave_up": "up", "longwave_down": "down"}}


def derived(day: Day, groups: Sequence[Group], draws: Draws, coverage: float) -> pd.DataFrame:
    """Return the table `derived`: a row each product, surface and form that was asked for."""
    campaign = day.parameters.campaign
    surfaces = tuple(dict.fromkeys(g.surface for g in groups))

    def asked(surface: str, product: str) -> Asked:
        return Asked(day, tuple(groups), draws, coverage, surface, product)

    rows = [row for product in campaign.derived for surface in surfaces
            for row in PRODUCTS[product](asked(surface, product))]
    if campaign.caution is not None:
        rows += [row for surface in surfaces for row in _caution(asked(surface, "caution"))]
    return table("derived", rows)


def _caution(asked: Asked) -> Iterator[Row]:
    """Hold the hottest of a surface's records, plus U, against the temperature entered.

    The hottest are the 95th percentile of the records; U is that of the surface's mean.
    """
    caution = asked.day.parameters.campaign.caution
    assert caution is not None
    limit = f"the {caution.temperature_degC:g} degC entered ({caution.source})"
    for group in asked.of("temperature"):
        hottest = float(np.quantile(np.concatenate(
            [_records_k(asked.day, p) for p in group.used]), HOTTEST)) - 273.15
        row = asked.row(group.kind, "degC", None, value=hottest)
        upper = np.nan
        what = f"95th percentile of the records {hottest:.1f} degC (one pass, so U is not known)"
        if group.result is not None:
            upper = hottest + summarise(group.result, asked.coverage).upper - group.value
            what = f"upper bound {upper:.1f} degC (95th percentile of the records, plus U)"
            row["status"] = "ok"
        over = np.nanmax([hottest, upper]) > caution.temperature_degC
        yield row | {"upper": upper, "note": (
            f"caution: {what} exceeds {limit}, consult local codes and the safety officer"
            if over else f"{what} lies below {limit}")}


def _records_k(day: Day, one: PassEstimate) -> FloatArray:
    """Return the temperature [K] of each record of a pass, by the pass's own model."""
    names = SERIES.get(one.model, {"brightness_temperature": "brightness_k"})
    read = {name: raw_series(day, one.this, quantity)[1] for quantity, name in names.items()}
    return np.asarray(MODELS[one.model]({i.name: i.value for i in one.inputs} | read))
