"""The parts that sentences on results are made of, one rule each."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import pandas as pd

from . import wording as w

Tables = Mapping[str, pd.DataFrame]
Facts = Mapping[str, Any]
Labels = Mapping[str, str] | None
SHOWN = ("higher", "lower", "higher, small", "lower, small")


def with_words(frame: pd.DataFrame, column: str, words: tuple[str, ...]) -> pd.DataFrame:
    """Return the rows whose column holds one of the words."""
    return frame[frame[column].isin(words)]


def of_surface(row: Any, labels: Labels) -> str:
    """Return "quantity (kind) of Surface"."""
    return (f"{w.inside_sentence(row['quantity'], row['kind'])} of "
            f"{w.label(row['surface'], labels)}")


def reason_of(row: Any) -> str:
    """Return why a row has no value, without its full stop."""
    return row["note"].strip().rstrip(".") or "no reason was handed over"


def value_of(row: Any, labels: Labels) -> str:
    """Return "value ± U unit (Surface)"."""
    text = w.interval(row["value"], row["lower"], row["upper"], w.places(row["quantity"]))
    return f"{w.with_unit(text, row['unit'])} ({w.label(row['surface'], labels)})"


def covering(facts: Facts) -> str:
    """Return the coverage in brackets, where it is known."""
    return f" ({w.percent(facts['coverage'])})" if facts.get("coverage") else ""


def signed(row: Any, column: str) -> str:
    """Return a signed difference with its interval and unit."""
    return w.with_unit(w.interval(row[column], row["lower"], row["upper"],
                                  w.places(row["quantity"]), sign=True), row["unit"])


def verbs(row: Any, column: str, against: str, facts: Facts, lead: str,
          end: str = ".") -> dict[str, str]:
    """Return the sentences of the four verdicts that show something, size without sign."""
    value, lower, upper = row[column], row["lower"], row["upper"]
    if value < 0:
        value, lower, upper = -value, -upper, -lower
    size = w.with_unit(w.interval(value, lower, upper, w.places(row["quantity"])), row["unit"])
    less = f", less than the relevant {relevant(row['quantity'], facts) or 'change'}"
    return {word: f"{lead}{size} {word.partition(',')[0]} {against}"
                  f"{less if 'small' in word else ''}{end}" for word in SHOWN}


def relevant(quantity: str, facts: Facts) -> str:
    """Return the relevant change with its unit; "" where none was declared."""
    limit = (facts.get("relevant_change") or {}).get(quantity)
    return "" if limit is None else w.with_unit(w.number(float(limit), w.places(quantity)),
                                                w.difference_unit(quantity))


def margin(row: Any, facts: Facts) -> str:
    """Return the margin within which two values are equivalent."""
    small = relevant(row["quantity"], facts)
    return f"±{small}" if small else "the relevant change"


def by_at_least(quantity: str, facts: Facts) -> str:
    """Return " by at least the relevant ...", where one was declared."""
    limit = relevant(quantity, facts)
    return f" by at least the relevant {limit}" if limit else ""


def missed(row: Any, words: str = "could have missed up to ") -> str:
    """Return in brackets what could have been missed, where it is known."""
    most = row["could_have_missed"]
    size = w.with_unit(w.expanded(most, w.places(row["quantity"])), row["unit"])
    return "" if pd.isna(most) else f" ({words}{size})"


def because(note: str) -> str:
    """Return a note as the reason that follows a verdict."""
    return f": {note.strip().rstrip('.')}" if note.strip() else ""
