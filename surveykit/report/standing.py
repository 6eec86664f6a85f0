"""Sentences that stand on every report, from `template/prose.toml`, with the run's numbers in."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pandas as pd

from . import wording as w
from .phrases import Facts, Labels, Tables

PROSE = tomllib.loads((Path(__file__).parent / "template/prose.toml").read_text("utf-8"))
SAFETY = tuple(PROSE["safety"])  # of the plan and of the field sheet


def cautions(surfaces: pd.DataFrame, labels: Labels = None) -> list[str]:
    """Return the cautions, led by the hottest upper end among the surfaces."""
    hot = surfaces[(surfaces["quantity"] == "temperature") & surfaces["value"].notna()]
    if hot.empty:
        return [*PROSE["cautions"]]
    top = hot.assign(end=hot["upper"].fillna(hot["value"]))
    row = top.iloc[int(top["end"].argmax())]
    return [PROSE["touching"].format(
        what="value" if pd.isna(row["upper"]) else "upper end of an interval",
        size=w.with_unit(w.number(row["end"], 1), row["unit"]),
        surface=w.label(row["surface"], labels)), *PROSE["cautions"]]


def reading(facts: Facts, tables: Tables) -> list[str]:
    """Say how the numbers are written and made, with the published methods."""
    return [line.format(coverage=w.percent(facts["coverage"]), draws=w.count(facts["draws"]),
                        seed=facts["seed"], ends=_ends(tables)) for line in PROSE["reading"]]


def _ends(tables: Tables) -> str:
    """Say how well so many draws tell the ends of the intervals: the worst of them."""
    shares = pd.concat([2 * frame["end_error"] / (frame["upper"] - frame["lower"]) for frame in (
        tables[name] for name in ("surfaces", "differences", "changes"))]).dropna()
    return (f" So many draws leave the ends of the intervals a standard error of at most "
            f"{w.percent(float(shares.max()))} of U." if len(shares) else "")


def programs(facts: Facts) -> str:
    """Name the programs that computed the numbers, with their versions."""
    versions = facts.get("versions") or {}
    named = w.listing(f"{name} {version}" for name, version in versions.items())
    return f"Computed by {named}." if versions else "No version was handed over."


def methods(tables: Tables) -> list[str]:
    """Return the methods of the quantities that this campaign has, with their citations."""
    families = [pair for pair, _ in w.families(tables["surfaces"])]
    lines = [*PROSE["shared"]]
    for name, text in PROSE["methods"].items():
        quantity, _, kind = name.partition(" ")
        if any(q == quantity and kind in ("", k) for q, k in families):
            lines.append(text)
            if quantity == "albedo":
                lines.append(_likeness(tables["geometry"]))
    return [*lines, *(PROSE["compared"] if len(tables["changes"]) else ())]


def _likeness(geometry: pd.DataFrame) -> str:
    """Say how the albedo passes stand to ASTM E1918, only as far as the record goes."""
    kinds = geometry.loc[geometry["role"] == "used", "note"].str.split("[:,]").str[0]
    told = w.listing(f"{kind} ({w.plural(int(n), 'pass', 'passes')})"
                     for kind, n in kinds.value_counts(sort=False).items())
    return ("ASTM E1918: " + (
        f"{told}; what deviates stands below the table of heights" if told else
        "the patches' sizes are not on record, so nothing is said of how the passes stand to it")
        + ". Its conditions on height, size and readings are quoted from memory; no conformity is "
          "claimed.")
