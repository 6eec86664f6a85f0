"""How the passes of a group move with their uncertain inputs: slopes, own scatter, draws.

All passes of one model and one set of scopes are treated at once: slopes as arrays over the
passes, draws at the weighted mean of their inputs. What the single passes' slopes differ from
those at the mean is added back scope by scope, so that the mean's draws are those of the passes
to first order exactly, and to second order at the mean.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Any

import numpy as np

from surveykit.core import FloatArray, Input
from surveykit.evidence import models
from surveykit.evidence.estimates import PassEstimate
from surveykit.statistics.draws import Draws

OWN = "the pass itself"
EXACT = ("band_low_um", "band_high_um")  # settings of a model, not inputs to average


@dataclass(frozen=True)
class Batch:
    """Passes of one model whose inputs belong to the same scopes: values and u, shape (n,)."""

    rows: tuple[int, ...]
    model: str
    inputs: tuple[Input, ...]  # of the first pass, the pass's own scope called OWN
    values: dict[str, FloatArray]
    u: dict[str, FloatArray]

    @cached_property
    def slopes(self) -> dict[str, FloatArray]:
        """Per input the signed contribution to each pass: half from value - u to value + u."""
        return _slopes(self.model, self.values, self.u)

    def at_mean(self, weights: FloatArray) -> tuple[Input, ...]:
        """Return the inputs at their weighted means over the passes."""
        share = weights[list(self.rows)] / weights[list(self.rows)].sum()
        return tuple(replace(i, value=float(share @ self.values[i.name]),
                             u=float(share @ self.u[i.name])) for i in self.inputs)


class Moves:
    """The passes of one group and their inputs."""

    def __init__(self, campaign: str, passes: Sequence[PassEstimate]) -> None:
        self.passes = tuple(passes)
        self.batches = tuple(_batches(campaign, self.passes))

    @cached_property
    def own_u(self) -> FloatArray:
        """What each pass does not share: scatter within it and inputs of its own scope."""
        square = np.array([p.u_within**2 for p in self.passes])
        for batch in self.batches:
            for i in batch.inputs:
                if i.scope == OWN and i.name in batch.slopes:
                    square[list(batch.rows)] += batch.slopes[i.name] ** 2
        return np.sqrt(square)

    def contributions(self, weights: FloatArray) -> dict[str, tuple[Input, float]]:
        """Return per shared scope its largest input and what it moves the weighted mean by."""
        out: dict[str, tuple[Input, float]] = {}
        for batch in self.batches:
            share = weights[list(batch.rows)]
            for i in batch.inputs:
                if i.scope == OWN or i.name not in batch.slopes:
                    continue
                largest = replace(i, u=float(batch.u[i.name].max()))
                known, total = out.get(i.scope, (largest, 0.0))
                out[i.scope] = (largest if largest.u > known.u else known,
                                total + float(share @ batch.slopes[i.name]))
        return out

    def systematic(self, weights: FloatArray, draws: Draws) -> FloatArray:
        """Return draws of the weighted mean less its nominal value, shape (M,), mean 0."""
        moved = np.zeros(draws.size)
        for batch in self.batches:
            share = weights[list(batch.rows)]
            mean = batch.at_mean(weights)
            moved += share.sum() * models.deviations(batch.model, mean, draws, OWN)
            if len(batch.rows) == 1:
                continue
            slopes = _slopes(batch.model, {i.name: np.array([i.value]) for i in mean},
                             {i.name: np.array([i.u]) for i in mean})
            for i in mean:
                if i.scope != OWN and i.name in batch.slopes:
                    rest = float(share @ batch.slopes[i.name]) - share.sum() * slopes[i.name][0]
                    moved += rest * draws.standard(i.scope, i.distribution)
        return moved - moved.mean()


def _slopes(model: str, values: dict[str, FloatArray],
            u: dict[str, FloatArray]) -> dict[str, FloatArray]:
    """Return half of what each uncertain input moves the model from value - u to value + u."""
    moved = [name for name, size in u.items() if size.any()]
    if not moved:
        return {}
    x: dict[str, Any] = {name: float(v[0]) if name in EXACT or np.ptp(v) == 0 else v
                         for name, v in values.items()}
    for row, name in enumerate(moved):
        sides = np.repeat(values[name][None, :], 2 * len(moved), axis=0)
        sides[2 * row] += u[name]
        sides[2 * row + 1] -= u[name]
        x[name] = sides
    made = np.broadcast_to(models.MODELS[model](x), (2 * len(moved), values[moved[0]].size))
    return dict(zip(moved, (made[0::2] - made[1::2]) / 2, strict=True))


def _batches(campaign: str, passes: tuple[PassEstimate, ...]) -> list[Batch]:
    found: dict[tuple[Any, ...], list[int]] = {}
    held = []
    for row, p in enumerate(passes):
        own = f"{campaign}:pass:{p.this.name}"
        inputs = tuple(replace(i, scope=OWN) if i.scope == own else i for i in p.inputs)
        held.append(inputs)
        key = (p.model, *((i.name, i.scope, i.distribution,
                           i.value if i.name in EXACT else None) for i in inputs))
        found.setdefault(key, []).append(row)
    return [Batch(tuple(rows), key[0], held[rows[0]],
                  *({i.name: np.array([getattr(held[row][k], part) for row in rows])
                     for k, i in enumerate(held[rows[0]])} for part in ("value", "u")))
            for key, rows in found.items()]
