"""What would narrow the uncertainty most, by how much, and what it takes."""

from __future__ import annotations

import math
from typing import NamedTuple

import pandas as pd

from . import wording as w
from .phrases import Facts, Tables, margin

NEXT = {  # a word of a source: what to do about it next time
    "cooling": "read stand-off on sunlit ground, or press for a few seconds only",
    "emissivity": "a surer emissivity, from a sample or a reference thermometer on the spot",
    "calibration": "a fresh calibration of these heads; it holds for every surface at once",
    "scatter": "more passes and, where there is one patch, more patches",
    "sky": "a reading of the sky itself, and air temperature and humidity at the site",
    "ground in the head": "a lower head or a larger patch, and the albedo around it",
    "albedo around": "measure the albedo around the patches",
    "shade": "a higher head or a smaller one",
    "directional response": "the sun high, surfaces in close turn, or an upper head whose "
                            "directional response is better known",
    "zero": "capped readings at the start, in the middle and at the end",
    "dark": "capped readings at the start, in the middle and at the end",
}


def narrowing(tables: Tables, facts: Facts) -> list[str]:
    """Say, for each quantity and kind, what would narrow U most, by how much, and what it takes."""
    return [f"{w.quantity_text(one.quantity, one.kind)}: " + (
                f"halving “{one.source}” ({w.percent(one.share)} of the variance on average) would "
                f"narrow U most{one.gain}." if one.gain else
                f"“{one.source}” weighs most, {w.percent(one.share)} of the known variance.")
            + (f" Next: {one.advice}." if one.advice else "") + _needed(one.surfaces, facts)
            for one in _narrowed(tables, facts)]


def advice(tables: Tables, facts: Facts) -> list[str]:
    """Say the same in short, the quantity first whose U is widest against the relevant change."""
    if tables["surfaces"]["lower"].isna().all():
        return ["more than one pass of each surface, since one pass alone gives no interval; what "
                "else was missing stands below."]
    found = sorted(_narrowed(tables, facts), key=lambda one: -one.wide)
    return [f"{one.advice or f'look at “{one.source}”'}: of all, "
            f"{w.inside_sentence(one.quantity, one.kind)} is least sure against what is relevant, "
            f"and this would narrow it most{one.gain}." for one in found]


class _Narrower(NamedTuple):
    """The source of a quantity and kind whose halving gains most."""

    quantity: str
    kind: str
    surfaces: pd.DataFrame
    source: str
    share: float
    gain: str
    wide: float  # mean U over the relevant change

    @property
    def advice(self) -> str:
        return next((text for part, text in NEXT.items() if part in self.source), "")


def _narrowed(tables: Tables, facts: Facts) -> list[_Narrower]:
    found = []
    for (quantity, kind), block in w.families(tables["budget"]):
        own = w.of_family(tables["surfaces"], quantity, kind).set_index("surface")
        half = (own["upper"] - own["lower"]) / 2
        each = block.groupby(["surface", "source"], as_index=False)[["share", "narrower"]].sum()
        gains = each.groupby("source")[["narrower", "share"]].sum() / each["surface"].nunique()
        if not gains["share"].max() > 0:
            continue
        top = str(gains["narrower" if gains["narrower"].max() > 0 else "share"].idxmax())
        some = each[each["source"] == top]
        most = some.iloc[int(some["narrower"].argmax())]
        now, less = float(half.get(most["surface"], math.nan)), float(most["narrower"])
        ends = [w.expanded(u, w.places(quantity)) for u in (now, now - less)]
        gain = (f", that of {w.label(most['surface'], facts.get('labels'))} from {ends[0]} to "
                + w.with_unit(ends[1], w.difference_unit(quantity))) if 0 < less < now else ""
        limit = (facts.get("relevant_change") or {}).get(quantity) or math.nan
        found.append(_Narrower(quantity, kind, own.reset_index(), top,
                               float(gains["share"][top]), gain,
                               float((half / limit).fillna(0).mean())))
    return found


def _needed(surfaces: pd.DataFrame, facts: Facts) -> str:
    """Say what U within the relevant change would take of the surfaces that are wider now."""
    limit = (facts.get("relevant_change") or {}).get(surfaces["quantity"].iloc[0], math.nan)
    wide = surfaces[((surfaces["upper"] - surfaces["lower"]) / 2 > limit)
                    & surfaces["needed"].notna()]
    finite = wide[wide["needed"] < math.inf]
    told = [f"{w.label(row['surface'], facts.get('labels'))} "
            + (f"{row['needed']:.0f} patches ({row['n_patches']} read)" if row["n_patches"] > 1 else
               f"{row['needed']:.0f} passes ({row['n_passes']} made)")
            for row in finite.to_dict("records")]
    never = [w.label(name, facts.get("labels")) for name in wide["surface"].drop(finite.index)]
    text = margin(surfaces.iloc[0], facts)
    return (f" For U within {text}: {w.listing(told)}." if told else "") + (
        f" No number of passes brings U of {w.listing(never)} within {text}: what they share is "
        "wider." if never else "")
