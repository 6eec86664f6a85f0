"""Sentences that stand on every report: cautions, how to read the numbers, what computed them."""

from __future__ import annotations

import pandas as pd

from . import wording as w
from .sentences import Facts, Labels


def cautions(surfaces: pd.DataFrame, labels: Labels = None) -> list[str]:
    """Return the cautions, led by the hottest upper end among the surfaces."""
    hot = surfaces[(surfaces["quantity"] == "temperature") & surfaces["value"].notna()]
    lines = []
    if len(hot):
        top = hot.assign(end=hot["upper"].fillna(hot["value"]))
        row = top.iloc[int(top["end"].argmax())]
        what = "value" if pd.isna(row["upper"]) else "upper end of an interval"
        lines.append(f"Hot surfaces: the highest {what} is "
                     f"{w.with_unit(w.number(row['end'], 1), row['unit'])} "
                     f"({w.label(row['surface'], labels)}), a mean over an area: single spots are "
                     "hotter. What contact is acceptable, for whom and how long, is for local "
                     "codes and licensed practice to say.")
    return [
        *lines,
        "Heat, sun and traffic: work outdoors, on roofs and beside traffic follows local rules and "
        "the people licensed to apply them; nothing here replaces them.",
        "This report certifies nothing: it states what was measured on one day with its "
        "uncertainty. It holds for the patches, times and conditions named, and judges no code, "
        "standard or contract.",
    ]


def reading(facts: Facts) -> list[str]:
    """Say how the numbers are written and made, with the published methods."""
    coverage = w.percent(facts["coverage"]) if facts.get("coverage") else "the stated coverage"
    return [
        f"Value ± U: U is the expanded uncertainty, half the interval that covers {coverage}; "
        "where the two arms of an interval differ by more than a fifth, both ends are printed. The "
        "page rounds temperatures to 0.1 and albedo and NDVI to 0.001; the CSV tables keep every "
        "digit.",
        "Uncertainty: each uncertain input is drawn "
        f"{w.count(facts.get('draws') or 0)} times (seed {facts.get('seed', 'not stated')}) and "
        "carried through to the result; an error that two results share is the same draw in both, "
        "so it cancels in their difference as far as it should (JCGM 100:2008; JCGM 101:2008).",
        "Passes: the pass is the statistical unit. Records within a pass are correlated, so they "
        "count for fewer (Geyer 1992); passes are pooled by weights that include how much they "
        "differ (Paule and Mandel 1982), with the interval of Hartung and Knapp (2001) never below "
        "what the passes’ own uncertainties give (Röver, Knapp and Friede 2015).",
        "Verdicts: higher and lower mean that the interval excludes zero after allowance for many "
        "comparisons (Holm 1979) and that the size is at least the relevant one; no difference "
        "shown is not proof of none, so it comes with the size that could have been missed.",
    ]


def programs(facts: Facts) -> str:
    """Name the programs that computed the numbers, with their versions."""
    versions = facts.get("versions") or {}
    named = w.listing(f"{name} {version}" for name, version in versions.items())
    return f"Computed by {named}." if versions else "No version was handed over."
