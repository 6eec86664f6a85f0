"""What would narrow the uncertainty most, by how much, and what it takes."""

from __future__ import annotations

import math
import re
from typing import NamedTuple

import numpy as np
import pandas as pd

from . import wording as w
from .phrases import Facts, Tables, margin
from .standing import PROSE

MANY = 100  # passes or patches, above which their number is no plan


class _Narrower(NamedTuple):
    """What gains most where it is halved, for one quantity and kind."""

    what: tuple[str, str]  # quantity and kind
    surfaces: pd.DataFrame
    source: str
    many: str  # how many sources of the budget it stands for, where several
    share: str
    gain: str
    advice: str
    wide: float  # mean U over the relevant change


def narrowing(tables: Tables, facts: Facts) -> list[str]:
    """Say, for each quantity and kind, what would narrow U most, by how much, and what it takes."""
    return [f"{w.quantity_text(*one.what)}: " + (
                f"halving “{one.source}” ({one.many}{one.share} of the variance on average) would "
                f"narrow U most{one.gain}." if one.gain else
                f"“{one.source}” weighs most, {one.many}{one.share} of the known variance.")
            + (f" Next: {one.advice}." if one.advice else "") + _needed(one.surfaces, facts)
            for one in _narrowed(tables, facts)]


def advice(tables: Tables, facts: Facts) -> str:
    """Say in short what to do, for the quantity whose U is widest against the relevant change."""
    if tables["surfaces"]["lower"].isna().all():
        known = tables["surfaces"]["status"].eq("value only").any()
        return ("more than one pass of each surface, since one pass alone gives no interval; what "
                "else was missing stands below." if known else
                "see below what could not be evaluated, and why.")
    one = max(_narrowed(tables, facts), key=lambda one: one.wide, default=None)
    return "" if one is None else (
            f"{one.advice or f'look at “{one.source}”'}; {w.inside_sentence(*one.what)} is the "
            f"least sure against what is relevant, and this would narrow its U most{one.gain}.")


def _narrowed(tables: Tables, facts: Facts) -> list[_Narrower]:
    found = []
    for what, block in w.families(tables["budget"]):
        block = block.assign(remedy=[_remedy(source)[0] for source in block["source"]])
        own = w.of_family(tables["surfaces"], *what).set_index("surface")
        half = (own["upper"] - own["lower"]) / 2
        each = _gathered(block, half)
        gains = each.groupby("remedy")[["narrower", "share"]].sum() / each["surface"].nunique()
        if not gains["share"].max() > 0:
            continue
        top = str(gains["narrower" if gains["narrower"].max() > 0 else "share"].idxmax())
        some = each[each["remedy"] == top]
        most = some.iloc[int(some["narrower"].argmax())]
        now, less = float(half.get(most["surface"], math.nan)), float(most["narrower"])
        ends = [w.expanded(u, w.places(what[0])) for u in (now, now - less)]
        gain = (f", that of {w.label(most['surface'], facts.get('labels'))} from {ends[0]} to "
                + w.with_unit(ends[1], w.difference_unit(what[0]))) if 0 < less < now else ""
        limit = (facts.get("relevant_change") or {}).get(what[0]) or math.nan
        names = block.loc[block["remedy"] == top, "source"].unique()
        found.append(_Narrower(
            what, own.reset_index(), names[0] if len(names) == 1 else top,
            f"{len(names)} sources, " if len(names) > 1 else "",
            w.percent(float(gains["share"][top])), gain, _remedy(names[0])[1],
            float((half / limit).fillna(0).mean())))
    return found


def _remedy(source: str) -> tuple[str, str]:
    """Return what the sources are called that one remedy serves, and the remedy; "" for none."""
    return next(((one["together"], one["advice"]) for one in PROSE["remedies"]
                 if re.match(one["source"], source)), (source, ""))


def _gathered(block: pd.DataFrame, half: pd.Series) -> pd.DataFrame:
    """Return share and narrowing of each surface by remedy; U narrows in quadrature.

    A source that takes n off a half-width U takes U^2 - (U - n)^2 off its square.
    """
    wide = block["surface"].map(half).astype(float)
    taken = wide**2 - (wide - block["narrower"]) ** 2
    each = block.assign(taken=taken).groupby(
        ["surface", "remedy"], as_index=False, sort=False)[["share", "taken"]].sum()
    wide = each["surface"].map(half).astype(float)
    left = np.sqrt((wide**2 - each["taken"]).clip(lower=0))
    return each.assign(narrower=(wide - left).fillna(0))


def _needed(surfaces: pd.DataFrame, facts: Facts) -> str:
    """Say what U within the relevant change would take of the surfaces that are wider now."""
    limit = (facts.get("relevant_change") or {}).get(surfaces["quantity"].iloc[0], math.nan)
    made = surfaces["n_patches"].where(surfaces["n_patches"] > 1, surfaces["n_passes"])
    wide = surfaces[((surfaces["upper"] - surfaces["lower"]) / 2 > limit)
                    & (surfaces["needed"] > made)]
    finite = wide[wide["needed"] < math.inf]
    told = [f"{w.label(row['surface'], facts.get('labels'))} "
            + (f"{row['needed']:.0f}" if row["needed"] <= MANY else f"over {MANY}")
            + (f" patches ({row['n_patches']} read)" if row["n_patches"] > 1 else
               f" passes ({row['n_passes']} made)") for row in finite.to_dict("records")]
    never = [w.label(name, facts.get("labels")) for name in wide["surface"].drop(finite.index)]
    text = margin(surfaces.iloc[0], facts)
    return (f" For U within {text}: {w.listing(told)}." if told else "") + (
        f" No number of passes brings U of {w.listing(never)} within {text}: what they share is "
        "wider." if never else "")
