"""What the appendix says of the methods: one point a step, with what it was taken from."""

from __future__ import annotations

from collections.abc import Mapping

import pandas as pd

from . import wording as w
from .standing import PROSE


def methods(tables: Mapping[str, pd.DataFrame]) -> list[str]:
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
    notes = geometry.loc[geometry["role"] == "used", "note"]
    told = [f"{note} ({w.plural(int(n), 'pass', 'passes')})"
            for note, n in notes.value_counts(sort=False).items()] or [
        "the patches' sizes are not on record, so nothing is said of how the passes stand to it"]
    return (f"ASTM E1918: {'; '.join(told)}. Its conditions on height, size and readings are "
            "quoted from memory; no conformity is claimed.")
