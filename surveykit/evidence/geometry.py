"""What height does to an albedo: shade and foreign ground, as used and at the best height."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import pandas as pd

from surveykit.core import table
from surveykit.evidence import e1918
from surveykit.evidence.conditions import Day
from surveykit.evidence.estimates import PassEstimate
from surveykit.evidence.parts import NotEvaluated
from surveykit.evidence.views import albedo_around, footprint_share, shade_share

HEIGHTS_M = (0.05, 0.10, 0.20, 0.30, 0.50, 1.00)
SEARCH_M = np.geomspace(0.02, 2.0, 93)  # 5 % a step


def geometry(day: Day, estimates: Sequence[PassEstimate]) -> pd.DataFrame:
    """Return the table `geometry`: for each evaluated albedo pass its heights, used and best."""
    rows: list[dict[str, Any]] = []
    for e in estimates:
        if e.this.quantity == "albedo" and e.evaluated:
            try:
                rows += _of_pass(day, e, estimates)
            except NotEvaluated:
                continue
    return table("geometry", rows)


def _of_pass(day: Day, e: PassEstimate,
             estimates: Sequence[PassEstimate]) -> list[dict[str, Any]]:
    head, settings = e.this.channels["shortwave_up"], day.parameters.campaign.settings.albedo
    around, _ = albedo_around(day, e.this)
    contrast = abs(around.value - e.value) / e.value
    radius = head.head_radius_m or settings.head_radius_assumed_cm / 100

    def shares(height: float) -> tuple[float, float]:
        foreign = 1 - footprint_share(e.this, head, height)
        return foreign, shade_share(day, e.this, head, e.sky, e.zenith_deg, radius, height)

    def effect(height: float) -> float:
        foreign, shade = shares(height)
        return contrast * foreign + shade

    best = float(SEARCH_M[int(np.argmin([effect(h) for h in SEARCH_M]))])
    met = e1918.told(e1918.conditions(day, e, estimates), name="ASTM E1918", like="E1918-like")
    plan = sorted([*((h, "") for h in HEIGHTS_M if h not in (e.this.height_m, best)),
                   (e.this.height_m, "used"), (best, "best")])
    rows = []
    for height, role in plan:
        foreign, shade = shares(height)
        rows.append({
            "campaign": day.name, "surface": e.this.surface, "patch": e.this.patch,
            "pass": e.this.name, "height_m": height, "role": role, "foreign": foreign,
            "contamination": contrast * foreign, "shade": shade,
            "effect": contrast * foreign + shade,
            "note": met if role == "used" else ""})
    return rows
