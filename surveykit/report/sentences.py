"""Sentences built from the tables: what was measured, differs, changed, was not evaluated and why.

`tables` maps names of `core.TABLES` to frames; `facts` is the run's plain facts, `labels` in it
those of surfaces and earlier campaigns. No number is typed here. Each function returns plain
text, one string a sentence or point; escaping is the page's work.
"""

from __future__ import annotations

import re
from collections import defaultdict
from typing import Any

import pandas as pd

from . import wording as w
from .advice import advice
from .advice import narrowing as narrowing
from .phrases import (
    SHOWN,
    Facts,
    Labels,
    Tables,
    margin,
    missed,
    of_surface,
    reason_of,
    relevant,
    shown,
    signed,
    value_of,
    with_words,
)

WITHOUT = ("not evaluated", "not comparable")  # verdicts and statuses without a number to judge


def abstract(tables: Tables, facts: Facts) -> list[str]:
    """Say in a line each: what was surveyed, how sure, what stands out, changed, and is next."""
    surfaces, passes, labels = tables["surfaces"], tables["passes"], facts.get("labels")
    names, site = surfaces["surface"].unique(), facts["site"]["name"]
    day, visited = w.date_text(facts["date"]), w.plural(len(names), "surface")
    if not len(names):
        return [f"No surface at {site} was surveyed on {day}."]
    if passes.empty:
        return [f"{visited} at {site} {'was' if len(names) == 1 else 'were'} visited on {day}, but "
                "no pass could be matched with records."]
    families = [(w.inside_sentence(*pair), block) for pair, block in w.families(surfaces)]
    lines = [f"Surveyed: {w.listing(what for what, _ in families)} of {visited} at {site}, in "
             f"{w.plural(len(passes), 'pass', 'passes')} on {day}."]
    known = [(what, block.dropna(subset=["value"]).sort_values("value"))
             for what, block in families]
    ends = [f"{what} from {value_of(block.iloc[0], labels)} to {value_of(block.iloc[-1], labels)}"
            if len(block) > 1 else f"{what} {value_of(block.iloc[0], labels)}"
            for what, block in known if len(block)]
    if ends:
        lines.append(f"Found, value ± U ({w.percent(facts['coverage'])}): {'; '.join(ends)}.")
    changes = tables["changes"]
    if len(changes):
        since = [f"{w.label(surface, labels)} since {w.label(earlier, labels)} (" + ", ".join(
            f"{w.inside_sentence(r['quantity'], r['kind'])} {signed(r, 'change')}"
            for r in block.to_dict("records")) + ")" for (surface, earlier), block
            in with_words(changes, "verdict", SHOWN).groupby(["surface", "earlier"], sort=False)]
        judged = ~changes["verdict"].isin(["", *WITHOUT])
        rest = (f"no {'other ' if since else ''}change is shown" if judged.any() else
                "no change could be judged")
        lines.append(f"Changed: {'; '.join([*since, rest])}.")
    return [*lines, *(f"To do next: {text}" for text in [advice(tables, facts)] if text)]


def two_kinds(surfaces: pd.DataFrame, labels: Labels = None) -> list[str]:
    """Say why a surface has two values of one quantity where it has."""
    why = {
        "temperature": "the head sees other background radiation in each way of reading, and the "
                       "readings were taken at other times and spots",
        "albedo": "it depends on the direction that the light comes from",
    }
    lines = []
    for quantity, reason in why.items():
        block = surfaces[(surfaces["quantity"] == quantity) & surfaces["value"].notna()]
        kinds = block.groupby("surface", sort=False)["kind"].unique()
        twice = [w.label(str(name), labels) for name, found in kinds.items() if len(found) > 1]
        if twice:
            who = w.listing(twice) if len(twice) < 4 else f"{len(twice)} surfaces"
            lines.append(f"{who} {'has' if len(twice) == 1 else 'have'} more than one {quantity}, "
                         f"kept apart because {reason}.")
    return lines


def differs(differences: pd.DataFrame, facts: Facts) -> list[str]:
    """Say, for each quantity and kind, how many pairs differ, the largest, and which do not."""
    lines = []
    for (quantity, kind), block in w.families(differences):
        judged = block[~block["verdict"].isin(["", *WITHOUT])]
        large = judged[judged["verdict"].isin(["higher", "lower"])]
        limit = relevant(quantity, facts)
        parts = [f"{len(large)} of {w.plural(len(judged), 'pair')} "
                 f"{'differs' if len(large) == 1 else 'differ'}"
                 + (f" by at least the relevant {limit}" if limit else "")]
        if len(large):
            largest = large.iloc[int(large["difference"].abs().argmax())]
            parts[0] += f", the largest: {pair_part(largest, facts)}"
        for verdict in (*SHOWN[2:], "equivalent", "no difference shown"):
            rows = judged[judged["verdict"] == verdict].to_dict("records")
            if len(rows) <= 2:
                parts += [pair_part(row, facts) for row in rows]
            else:
                widest = max(rows, key=lambda row: row["could_have_missed"])
                most = missed(widest) if verdict == "no difference shown" else ""
                parts.append(f"{w.plural(len(rows), 'pair')}: {verdict}{most}")
        if len(judged):
            lines.append(f"{w.quantity_text(quantity, kind)}: {'; '.join(parts)}.")
    return lines


def pair_part(row: Any, facts: Facts) -> str:
    """Return the verdict on a judged pair as a sentence without its full stop."""
    one, other = (w.label(row[end], facts.get("labels")) for end in ("surface", "other"))
    if row["verdict"] == "equivalent":
        return f"{one} and {other} are equivalent within {margin(row, facts)}"
    if row["verdict"] == "no difference shown":
        return f"no difference is shown between {one} and {other}{missed(row)}"
    return f"{one} is {shown(row, 'difference', f'than {other}', facts)}"


def changed(changes: pd.DataFrame, facts: Facts) -> list[str]:
    """Return a point a surface and date with the changes shown, then the rest by verdict."""
    labels, lines = facts.get("labels"), []
    for (surface, earlier), block in with_words(changes, "verdict", SHOWN).groupby(
            ["surface", "earlier"], sort=False):
        rows = block.to_dict("records")
        grades = dict.fromkeys(row["comparability"] for row in rows if row["comparability"])
        why = "; ".join(dict.fromkeys(part for row in rows for part in
                                      reason_of(row["note"], labels).split("; ") if part))
        lines.append(f"{w.label(surface, labels)} since {w.label(earlier, labels)}: "
                     f"{'; '.join(change_part(row, facts) for row in rows)}."
                     + (f" Conditions {': '.join(filter(None, [w.listing(grades), why]))}."
                        if grades else ""))
    for verdict, word in (("no difference shown", ", with what could have been missed"),
                          ("equivalent", " within the relevant change")):
        rest = with_words(changes, "verdict", (verdict,))
        for earlier, block in rest.groupby("earlier", sort=False):
            told = [f"{w.inside_sentence(*pair)} of " + w.listing(
                w.label(row["surface"], labels) + (missed(row, "") if "missed" in word else "")
                for row in some.to_dict("records")) for pair, some in w.families(block)]
            lines.append(f"{w.sentence_case(verdict)[:-1]} since {w.label(earlier, labels)}{word}: "
                         f"{'; '.join(told)}.")
    return lines


def change_part(row: Any, facts: Facts) -> str:
    """Return what a change of a surface shows, and against what."""
    control = w.label(row["control"], facts.get("labels"))
    against = {
        "ratio to control": f"than the control, {control}, leads to expect",
        "difference in differences": f"than before, the change of {control} taken off",
    }.get(row["method"], "than before")
    what = w.inside_sentence(row["quantity"], row["kind"])
    return f"{what} is {shown(row, 'change', against, facts)}"


def trending(trends: pd.DataFrame, facts: Facts) -> list[str]:
    """Say which lines through three dates or more are established, or that none is."""
    lines = [f"Trend of {of_surface(row, facts.get('labels'))}: {signed(row, 'slope')} over "
             f"{row['dates']} dates, {row['verdict']}."
             for row in with_words(trends, "verdict", SHOWN).to_dict("records")]
    judged = int((trends["verdict"] != "").sum())
    if judged and not lines:
        lines = [f"No trend is established over {w.plural(int(trends['dates'].max()), 'date')} "
                 f"({judged} series judged)."]
    return lines


def not_evaluated(tables: Tables, labels: Labels = None) -> list[str]:
    """Return what has no value or no verdict, gathered by reason, surfaces first."""
    def rows(name: str, column: str = "verdict") -> list[Any]:
        return with_words(tables[name], column, WITHOUT).to_dict("records")

    told = [(row["note"], f"{of_surface(row, labels)} was not evaluated")
            for row in rows("surfaces", "status")]
    told += [(row["note"], f"{w.product_text(row['product'])} of "
              f"{w.label(row['surface'], labels)} was not evaluated")
             for row in rows("derived", "status")]
    surfaces = tables["surfaces"].set_index(["surface", "quantity", "kind"])["status"]
    for (note, *key), block in with_words(tables["passes"], "status", WITHOUT).groupby(
            ["note", "surface", "quantity", "kind"], sort=False):
        first, n = block.iloc[0], len(block)
        which = f"pass {first['pass']}" if n == 1 else f"{n} passes"
        if surfaces.get(tuple(key)) not in WITHOUT:
            told.append((note, f"{of_surface(first, labels)} in {which} was not evaluated"))
    for (note, _, _, verdict), block in with_words(
            tables["differences"], "verdict", WITHOUT).groupby(
            ["note", "quantity", "kind", "verdict"], sort=False):
        first, n = block.iloc[0], len(block)
        which = (f" between {w.label(first['surface'], labels)} and "
                 f"{w.label(first['other'], labels)} was" if n == 1 else f"s of {n} pairs were")
        told.append((note, f"the {w.inside_sentence(first['quantity'], first['kind'])} "
                           f"difference{which} {verdict}"))
    verb = {"not comparable": "is not comparable with",
            "not evaluated": "was not evaluated against"}
    told += [(row["note"], f"{of_surface(row, labels)} {verb[row['verdict']]} "
              f"{w.label(row['earlier'], labels)}") for row in rows("changes")]
    gathered: dict[str, dict[str, None]] = defaultdict(dict)
    for note, text in told:
        gathered[reason_of(note, labels)][text] = None
    return [f"{w.sentence_case(reason)[:-1] or 'No reason was handed over'}: {'; '.join(texts)}."
            for reason, texts in gathered.items()]


def value_only(surfaces: pd.DataFrame, labels: Labels = None) -> list[str]:
    """Say which values stand without an interval."""
    names = [of_surface(row, labels) for row in
             with_words(surfaces, "status", ("value only",)).to_dict("records")]
    return [f"Value without an interval: {w.listing(names)}; a single pass cannot show how much "
            "passes differ, so no verdict uses it."] if names else []


def flagged(passes: pd.DataFrame) -> list[str]:
    """Say, for each quantity and kind, what its passes are flagged with, the commonest first.

    Flags that differ in their numbers only are told as one, by the first of them.
    """
    lines = []
    for (quantity, kind), block in w.families(passes):
        told = block["flags"].str.split("; ").explode()
        told = told[told != ""]
        alike = told.map(lambda flag: re.sub(r"[-+]?\d+(\.\d+)?", "#", flag))
        counts = alike.reset_index().drop_duplicates()["flags"].value_counts(sort=False)
        parts = []
        for key, n in counts.sort_values(ascending=False, kind="stable").items():
            some = [*dict.fromkeys(told[alike == key])]
            often = "every pass" if n == len(block) else f"{n} of {len(block)} passes"
            parts.append(f"{some[0]}{' and the like' if some[1:] else ''} ({often})")
        if parts:
            lines.append(f"{w.quantity_text(quantity, kind)}: {'; '.join(parts)}.")
    return lines
