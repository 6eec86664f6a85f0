"""The budget of a surface: what each source contributes, and what would narrow the interval."""

from __future__ import annotations

from typing import Any

import numpy as np
from scipy.special import stdtrit

from surveykit.core import FloatArray
from surveykit.evidence.moving import Moves
from surveykit.statistics.pooling import Pooled, passes_needed

SAMPLING = "scatter between passes and patches"


def budget_rows(campaign: str, moves: Moves, weights: FloatArray, pooled: Pooled,
                coverage: float) -> tuple[dict[str, Any], ...]:
    """Return one row a scope: its input u, its contribution, its share, and what halving it gains.

    Signs are kept until the contributions of one scope have added up. `narrower` is how much the
    half-width of the interval shrinks where that source alone is halved: the formula of
    Welch-Satterthwaite with Student's t, NaN where there is no interval.
    """
    first = moves.passes[0]
    quantity = first.this.quantity
    base = {"campaign": campaign, "surface": first.this.surface, "quantity": quantity,
            "kind": first.kind, "unit": "K" if quantity == "temperature" else "1"}
    rows: list[dict[str, Any]] = [
        base | {"scope": scope, "source": one.source, "u_input": one.u,
                "contribution": abs(total)}
        for scope, (one, total) in moves.contributions(weights).items()]
    within = float(np.sqrt((weights**2) @ (moves.own_u**2)))
    scatter = pooled.u if pooled.dof > 0 else within
    rows.append(base | {
        "scope": f"{campaign}:{first.this.surface}:sampling",
        "source": SAMPLING if pooled.dof > 0 else "scatter within the one pass",
        "u_input": scatter, "contribution": scatter})
    variance = sum(row["contribution"] ** 2 for row in rows)
    whole = _half_width(variance, scatter, pooled.dof, coverage)
    for row in rows:
        row["share"] = row["contribution"] ** 2 / variance if variance > 0 else 0.0
        less = scatter / 2 if row is rows[-1] else scatter
        row["narrower"] = whole - _half_width(
            variance - 0.75 * row["contribution"] ** 2, less, pooled.dof, coverage)
    return tuple(sorted(rows, key=lambda row: (-row["contribution"], row["scope"])))


def units_needed(rows: tuple[dict[str, Any], ...], pooled: Pooled, units_u: FloatArray,
                 wanted: float, coverage: float) -> float:
    """Return how many passes (patches where there are several) bring U to what is wanted.

    Their shared errors stay; infinite where these alone are wider, NaN where the scatter is not
    known.
    """
    if pooled.dof <= 0:
        return float("nan")
    shared = float(np.sqrt(sum(row["contribution"] ** 2 for row in rows
                               if row["source"] != SAMPLING)))
    typical = float(np.sqrt(np.mean(units_u**2)))
    return passes_needed(pooled.tau, typical, wanted, coverage, shared_u=shared)


def _half_width(variance: float, scatter: float, dof: int, coverage: float) -> float:
    if dof <= 0:
        return float("nan")
    variance = max(variance, 0.0)
    effective = dof * variance**2 / scatter**4 if scatter > 0 else np.inf
    return float(stdtrit(effective, (1 + coverage) / 2) * np.sqrt(variance)) if variance else 0.0
