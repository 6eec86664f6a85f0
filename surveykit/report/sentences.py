"""Sentences built from the tables: what was measured, differs, changed, was not evaluated and why.

`tables` maps names of `core.TABLES` to frames; `facts` is the run's plain facts. No number is
typed here. Each function returns plain text, one string a sentence or point; escaping is the
page's work.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping
from typing import Any

import pandas as pd

from . import wording as w

Tables = Mapping[str, pd.DataFrame]
Facts = Mapping[str, Any]
Labels = Mapping[str, str] | None
NEXT = {  # a word of the largest source: what to do about it next time
    "cooling": " Next: read stand-off on sunlit ground, or press for a few seconds "
               "only.",
    "emissivity": " Next: a surer emissivity for these surfaces, from a sample or a reference "
                  "thermometer on the spot.",
    "calibration": " Next: a fresh calibration of these heads; it holds for every surface at once.",
    "scatter": " Next: more passes and, where there is one patch, more patches.",
    "sky": " Next: a reading of the sky itself, and air temperature and humidity at the site.",
    "ground in the head": " Next: a lower head or a larger patch, and the albedo around it.",
    "shade": " Next: a higher head or a smaller one.",
    "zero": " Next: capped readings at the start, in the middle and at the end.",
    "dark": " Next: capped readings at the start, in the middle and at the end.",
}


def measured(tables: Tables, facts: Facts) -> list[str]:
    """Say how much was surveyed, and for each quantity and kind the span of the surfaces."""
    surfaces, labels = tables["surfaces"], facts.get("surfaces")
    names, passes = surfaces["surface"].unique(), tables["passes"]
    where, were = facts["site"]["name"], "was" if len(names) == 1 else "were"
    visited = f"{w.plural(len(names), 'surface')} at {where} {were}"
    lines = [f"{visited} surveyed in {w.plural(len(passes), 'pass', 'passes')} on "
             f"{w.date_text(facts['date'])}."]
    if passes.empty:
        lines = [f"{visited} visited on {w.date_text(facts['date'])}, but no pass could be matched "
                 "with records."] if len(names) else [
                 f"No surface at {where} was surveyed on {w.date_text(facts['date'])}."]
    for (quantity, kind), block in w.families(surfaces):
        known = block[block["value"].notna()].sort_values("value", kind="stable")
        if known.empty:
            continue
        ends = [known.iloc[0], known.iloc[-1]][:len(known)]
        texts = [f"{_value(row)} for {w.label(row['surface'], labels)}" for row in ends]
        lines.append(f"{w.quantity_text(quantity, kind)}: " + (
            f"from {texts[0]} to {texts[1]}." if len(texts) > 1 else f"{texts[0]}."))
    return lines


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
    labels, lines = facts.get("surfaces"), []
    for (quantity, kind), block in w.families(differences):
        judged = block[~block["verdict"].isin(["", "not evaluated", "not comparable"])]
        large = judged[judged["verdict"].isin(["higher", "lower"])]
        parts = [f"{len(large)} of {w.plural(len(judged), 'pair')} "
                 f"{'differs' if len(large) == 1 else 'differ'}{_by_at_least(quantity, facts)}"]
        if len(large):
            largest = large.iloc[int(large["difference"].abs().argmax())]
            parts[0] += f", the largest: {pair_sentence(largest, labels, facts)[:-1]}"
        for verdict in ("higher, small", "lower, small", "equivalent", "no difference shown"):
            rows = judged[judged["verdict"] == verdict].to_dict("records")
            if len(rows) <= 2:
                parts += [pair_sentence(row, labels, facts)[:-1] for row in rows]
            else:
                widest = max(rows, key=lambda row: row["could_have_missed"])
                missed = _missed(widest) if verdict == "no difference shown" else ""
                parts.append(f"{w.plural(len(rows), 'pair')}: {verdict}{missed}")
        if len(judged):
            lines.append(f"{w.quantity_text(quantity, kind)}: {'; '.join(parts)}.")
    return lines


def pair_sentence(row: Any, labels: Labels, facts: Facts) -> str:
    """Return the verdict on a pair as a sentence; "" where the row is not judged."""
    one, other = (w.label(row[end], labels) for end in ("surface", "other"))
    size, small = _size(row, "difference"), _relevant(row["quantity"], facts)
    within = f"±{small}" if small else "the relevant change"
    small = small or "change"
    return {
        "higher": f"{one} is higher than {other} by {size}.",
        "lower": f"{one} is lower than {other} by {size}.",
        "higher, small": f"{one} is higher than {other} by {size}, less than the relevant {small}.",
        "lower, small": f"{one} is lower than {other} by {size}, less than the relevant {small}.",
        "equivalent": f"{one} and {other} are equivalent within {within}.",
        "no difference shown": f"no difference is shown between {one} and {other}{_missed(row)}.",
        "not comparable": f"{one} and {other} are not comparable{_because(row['note'])}.",
        "not evaluated": f"{one} and {other} were not evaluated{_because(row['note'])}.",
    }.get(row["verdict"], "")


def changed(changes: pd.DataFrame, facts: Facts) -> list[str]:
    """Return a sentence for each change shown, then the others gathered by verdict and date."""
    labels, lines = facts.get("surfaces"), []
    gathered: dict[tuple[str, str], dict[str, list[str]]] = {}
    for row in changes.to_dict("records"):
        if row["verdict"] in ("equivalent", "no difference shown"):
            missed = _missed(row, "") if row["verdict"] == "no difference shown" else ""
            gathered.setdefault((row["verdict"], row["earlier"]), {}).setdefault(
                w.inside_sentence(row["quantity"], row["kind"]), []).append(
                f"{w.label(row['surface'], labels)}{missed}")
        elif row["verdict"] not in ("", "not evaluated", "not comparable"):
            lines.append(change_sentence(row, facts))
    for (verdict, earlier), items in gathered.items():
        told = "; ".join(f"{what} of {w.listing(names)}" for what, names in items.items())
        size = ", with what could have been missed" if verdict == "no difference shown" else ""
        lines.append(f"{w.sentence_case(verdict)[:-1]} since {earlier}{size}: {told}.")
    return lines


def change_sentence(row: Any, facts: Facts) -> str:
    """Return the verdict on a change as a sentence; "" where the row is not judged."""
    surface = w.label(row["surface"], facts.get("surfaces"))
    what = w.inside_sentence(row["quantity"], row["kind"])
    control = w.label(row["control"], facts.get("surfaces"))
    since = row["earlier"]
    against = {
        "ratio to control": f"than the control, {control}, leads to expect from {since}",
        "difference in differences": f"than in {since}, the change of {control} taken off",
    }.get(row["method"], f"than in {since}")
    size, small = _size(row, "change"), _relevant(row["quantity"], facts)
    within = f"±{small}" if small else "the relevant change"
    small = small or "change"
    sure = (f" (conditions {row['comparability']}{_because(row['note'])})"
            if row["comparability"] else "")
    if row["verdict"] == "no difference shown":
        return f"{surface}: no difference of {what} from {since} is shown{_missed(row)}{sure}."
    verb = {
        "higher": f"is higher by {size} {against}{sure}",
        "lower": f"is lower by {size} {against}{sure}",
        "higher, small": f"is higher by {size} {against}, less than the relevant {small}{sure}",
        "lower, small": f"is lower by {size} {against}, less than the relevant {small}{sure}",
        "equivalent": f"is equivalent to {since} within {within}{sure}",
        "not comparable": f"is not comparable with {since}{_because(row['note'])}",
        "not evaluated": f"was not evaluated against {since}{_because(row['note'])}",
    }.get(row["verdict"], "")
    return f"{surface}: {what} {verb}." if verb else ""


def not_evaluated(tables: Tables, labels: Labels = None) -> list[str]:
    """Return what has no value or no verdict, gathered by reason, surfaces first."""
    gathered: dict[str, list[str]] = defaultdict(list)
    pairs: dict[tuple[str, str, str, str], list[str]] = defaultdict(list)
    for row in _with(tables.get("surfaces"), "status", ("not evaluated",)):
        gathered[_reason(row)].append(f"{_of_surface(row, labels)} was not evaluated")
    for row in _with(tables.get("differences"), "verdict", ("not evaluated", "not comparable")):
        pairs[_reason(row), row["quantity"], row["kind"], row["verdict"]].append(
            f"{w.label(row['surface'], labels)} and {w.label(row['other'], labels)}")
    for (reason, quantity, kind, verdict), names in pairs.items():
        which = f"between {names[0]}" if len(names) == 1 else f"of {len(names)} pairs"
        verb = "was" if len(names) == 1 else "were"
        gathered[reason].append(f"the {w.inside_sentence(quantity, kind)} difference"
                                f"{'' if len(names) == 1 else 's'} {which} {verb} {verdict}")
    for row in _with(tables.get("changes"), "verdict", ("not evaluated", "not comparable")):
        verb = ("is not comparable with" if row["verdict"] == "not comparable" else
                "was not evaluated against")
        gathered[_reason(row)].append(f"{_of_surface(row, labels)} {verb} {row['earlier']}")
    return [f"{w.sentence_case(reason)[:-1]}: {'; '.join(dict.fromkeys(items))}."
            for reason, items in gathered.items()]


def value_only(surfaces: pd.DataFrame, labels: Labels = None) -> list[str]:
    """Say which values stand without an interval."""
    rows = _with(surfaces, "status", ("value only",))
    if not rows:
        return []
    names = [_of_surface(row, labels) for row in rows]
    return [f"Value without an interval: {w.listing(names)}; a single pass cannot show how much "
            "passes differ, so no verdict uses it."]


def flagged(passes: pd.DataFrame) -> list[str]:
    """Say, for each quantity and kind, what its passes are flagged with, the commonest first."""
    lines = []
    for (quantity, kind), block in w.families(passes):
        told = block["flags"].str.split("; ").explode()
        counts = told[told != ""].value_counts(sort=False).sort_values(ascending=False,
                                                                       kind="stable")
        parts = [f"{flag} ({'every pass' if n == len(block) else f'{n} of {len(block)} passes'})"
                 for flag, n in counts.items()]
        if parts:
            lines.append(f"{w.quantity_text(quantity, kind)}: {'; '.join(parts)}.")
    return lines


def narrowing(budget: pd.DataFrame, labels: Labels = None) -> list[str]:
    """Say, for each quantity and kind, which source holds the largest part of the variance."""
    lines = []
    for (quantity, kind), block in w.families(budget):
        shares = block.groupby(["surface", "source"], as_index=False)["share"].sum()
        mean = shares.groupby("source")["share"].sum() / shares["surface"].nunique()
        if mean.dropna().empty or not mean.max() > 0:
            continue
        top = str(mean.idxmax())
        own = shares[shares["source"] == top]
        most = own.iloc[int(own["share"].argmax())]
        most_of_all = (f", most of all for {w.label(str(most['surface']), labels)} "
                       f"({w.percent(most['share'])})") if most["share"] > mean[top] + 0.05 else ""
        advice = next((text for part, text in NEXT.items() if part in top), "")
        lines.append(f"{w.quantity_text(quantity, kind)}: the largest part of the variance is "
                     f"“{top}”, {w.percent(mean[top])} on average over the "
                     f"surfaces{most_of_all}.{advice}")
    return lines


def _of_surface(row: Any, labels: Labels) -> str:
    return (f"{w.inside_sentence(row['quantity'], row['kind'])} of "
            f"{w.label(row['surface'], labels)}")


def _reason(row: Any) -> str:
    return row["note"].strip().rstrip(".") or "no reason was handed over"


def _with(frame: pd.DataFrame | None, column: str, words: tuple[str, ...]) -> list[dict[str, Any]]:
    rows = [] if frame is None else frame[frame[column].isin(words)].to_dict("records")
    return [{str(key): value for key, value in row.items()} for row in rows]


def _value(row: pd.Series) -> str:
    text = w.interval(row["value"], row["lower"], row["upper"], w.places(row["quantity"]))
    return w.with_unit(text, row["unit"])


def _size(row: Any, column: str) -> str:
    """The size of a signed difference with its interval: the verb tells the direction."""
    value, lower, upper = row[column], row["lower"], row["upper"]
    if value < 0:
        value, lower, upper = -value, -upper, -lower
    return w.with_unit(w.interval(value, lower, upper, w.places(row["quantity"])), row["unit"])


def _relevant(quantity: str, facts: Facts) -> str:
    limit = (facts.get("relevant_change") or {}).get(quantity)
    if limit is None:
        return ""
    unit = "K" if quantity == "temperature" else "1"
    return w.with_unit(w.number(float(limit), w.places(quantity)), unit)


def _by_at_least(quantity: str, facts: Facts) -> str:
    limit = _relevant(quantity, facts)
    return f" by at least the relevant {limit}" if limit else ""


def _missed(row: Any, words: str = "could have missed up to ") -> str:
    missed = row["could_have_missed"]
    if pd.isna(missed):
        return ""
    size = w.with_unit(w.expanded(missed, w.places(row["quantity"])), row["unit"])
    return f" ({words}{size})"


def _because(note: str) -> str:
    return f": {note.strip().rstrip('.')}" if note.strip() else ""
