"""Corrections one after the other: what each does to a pass, and what a switched-off one leaves."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np

from surveykit.core import FloatArray, Input
from surveykit.evidence import models
from surveykit.evidence.parts import HALF_WIDTH, fixed

Inputs = dict[str, Input]


@dataclass(frozen=True)
class Correction:
    """One correction of a model.

    `without` holds the inputs that the correction changes, at the values that leave it out;
    `switch` is its key in the settings and `on` whether it is made; `why` says what else than its
    switch keeps it from being made.
    """

    name: str
    without: Mapping[str, float]
    switch: str
    on: bool = True
    why: str = ""


class Corrected(NamedTuple):
    """Inputs as used, the steps from raw to final, and flags of what is switched off."""

    inputs: Inputs
    steps: tuple[tuple[str, float], ...]
    flags: tuple[str, ...]


def correct(model: str, inputs: Inputs, corrections: Sequence[Correction], owner: str, *,
            series: Mapping[str, Any] | None = None,
            reduce: Callable[[FloatArray], Any] = np.mean) -> Corrected:
    """Apply corrections in their order, the first step being the raw value.

    Parameters
    ----------
    model : str
        Name of the model, see `models.MODELS`.
    inputs : dict of Input
        By name, all corrections applied.
    corrections : sequence of Correction
        In the order of the table.
    owner : str
        Whom the effects belong to: the beginning of their scopes.
    series : mapping, optional
        Arrays that stand in for inputs of the same names, shape (n,): the records of the pass.
    reduce : callable
        Makes one number of the model's n values.

    Returns
    -------
    Corrected
        A correction that is off leaves its inputs at `without`; its whole size is then allowed on
        either side of the value, as an input whose name ends in `_left`.
    """
    run = models.MODELS[model]
    full: dict[str, Any] = {name: i.value for name, i in inputs.items()} | dict(series or {})

    def value(x: Mapping[str, Any]) -> float:
        return float(reduce(np.asarray(run(x), dtype=np.float64)))

    x = dict(full)
    for one in corrections:
        x |= one.without
    steps = [("raw", value(x))]
    for one in corrections:
        if one.on:
            x |= {name: full[name] for name in one.without}
            steps.append((one.name, value(x)))
    held, flags, final = dict(inputs), [], steps[-1][1]
    for one in corrections:
        if one.on:
            continue
        size = value(x | {name: full[name] for name in one.without}) - final
        held |= {name: fixed(name, number) for name, number in one.without.items()}
        key = f"{one.switch.rpartition('.')[2]}_left"
        held[key] = Input(key, 0.0, abs(size) * HALF_WIDTH, f"{owner}:{one.name}",
                          f"{one.name}: not corrected", "rectangular")
        flags.append(one.why or f"not corrected, settings.{one.switch} is off: {one.name}")
    return Corrected(held, tuple(steps), tuple(flags))


def lag_corrections(inputs: Iterable[Input], switch: str, on: bool) -> list[Correction]:
    """Return the correction for heads that follow the light at different speeds, if they do."""
    lags = {i.name: 0.0 for i in inputs if i.name.endswith("lag_s") and i.value != 0}
    return [Correction("lag of the heads", lags, switch, on)] if lags else []
