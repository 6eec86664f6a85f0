"""Pass estimates as plain tables, and back: how one notebook hands them to the next."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import fields
from typing import Any

import pandas as pd

from surveykit.core import Input
from surveykit.evidence.conditions import Sky
from surveykit.evidence.estimates import PassEstimate
from surveykit.intake.passes import Pass

NUMBERS = ("value_raw", "value", "u_within", "n_records", "n_effective", "zenith_deg",
           "wind_m_s")
WORDS = ("kind", "model", "status", "note")
INPUT = tuple(f.name for f in fields(Input))
SKY = tuple(f.name for f in fields(Sky))
AIR = "air temperature of the pass"


def to_frames(estimates: Sequence[PassEstimate]) -> dict[str, pd.DataFrame]:
    """Return the frames `estimates` (a row a pass) and `inputs` (a row an input)."""
    rows: list[dict[str, Any]] = []
    inputs: list[dict[str, Any]] = []
    for e in estimates:
        rows.append({"pass": e.this.name, "flags": "; ".join(e.flags)}
                    | {name: getattr(e, name) for name in (*NUMBERS, *WORDS)}
                    | {f"sky_{name}": getattr(e.sky, name) for name in SKY})
        for role, some in (("model", e.inputs), (AIR, (e.air,) if e.air else ())):
            inputs += [{"pass": e.this.name, "role": role}
                       | {name: getattr(i, name) for name in INPUT} for i in some]
    return {"estimates": pd.DataFrame(rows), "inputs": pd.DataFrame(
        inputs, columns=["pass", "role", *INPUT])}


def from_frames(frames: dict[str, pd.DataFrame],
                passes: tuple[Pass, ...]) -> tuple[PassEstimate, ...]:
    """Return the estimates that `to_frames` made, for the same passes."""
    held: dict[tuple[str, str], list[Input]] = {}
    for row in frames["inputs"].to_dict("records"):
        held.setdefault((row["pass"], row["role"]), []).append(
            Input(**{name: row[name] for name in INPUT}))
    by_name = {this.name: this for this in passes}
    made = []
    for row in frames["estimates"].to_dict("records"):
        name = row["pass"]
        air = held.get((name, AIR), [])
        made.append(PassEstimate(
            this=by_name[name], sky=Sky(**{s: row[f"sky_{s}"] for s in SKY}),
            air=air[0] if air else None, inputs=tuple(held.get((name, "model"), ())),
            flags=tuple(f for f in row["flags"].split("; ") if f),
            **{key: row[key] for key in (*NUMBERS, *WORDS)}))
    return tuple(made)
