"""Sentences that stand on every report, from `template/prose.toml`, with the run's numbers in."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pandas as pd

from . import wording as w
from .phrases import Facts, Labels

PROSE = tomllib.loads((Path(__file__).parent / "template/prose.toml").read_text("utf-8"))
SAFETY = tuple(PROSE["safety"])  # of the plan and of the field sheet


def cautions(surfaces: pd.DataFrame, labels: Labels = None) -> list[str]:
    """Return the cautions, led by the hottest upper end among the surfaces."""
    hot = surfaces[(surfaces["quantity"] == "temperature") & surfaces["value"].notna()]
    if hot.empty:
        return [*PROSE["cautions"]]
    top = hot.assign(end=hot["upper"].fillna(hot["value"]))
    row = top.iloc[int(top["end"].argmax())]
    return [PROSE["hot"].format(
        what="value" if pd.isna(row["upper"]) else "upper end of an interval",
        size=w.with_unit(w.number(row["end"], 1), row["unit"]),
        surface=w.label(row["surface"], labels)), *PROSE["cautions"]]


def reading(facts: Facts) -> list[str]:
    """Say how the numbers are written and made, with the published methods."""
    coverage = w.percent(facts["coverage"]) if facts.get("coverage") else "the stated coverage"
    return [line.format(coverage=coverage, draws=w.count(facts.get("draws") or 0),
                        seed=facts.get("seed", "not stated")) for line in PROSE["reading"]]


def programs(facts: Facts) -> str:
    """Name the programs that computed the numbers, with their versions."""
    versions = facts.get("versions") or {}
    named = w.listing(f"{name} {version}" for name, version in versions.items())
    return f"Computed by {named}." if versions else "No version was handed over."
