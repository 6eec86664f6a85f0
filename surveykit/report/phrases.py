"""The parts that sentences on results are made of, one rule each."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import pandas as pd

from . import wording as w
from .markup import with_labels

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


def reason_of(note: str, labels: Labels) -> str:
    """Return a note without its full stop, names told by their labels."""
    return with_labels(note, labels).strip().rstrip(".")


def value_of(row: Any, labels: Labels) -> str:
    """Return "value ± U unit (Surface)"."""
    text = w.interval(row["value"], row["lower"], row["upper"], w.places(row["quantity"]))
    return f"{w.with_unit(text, row['unit'])} ({w.label(row['surface'], labels)})"


def signed(row: Any, column: str) -> str:
    """Return a signed difference with its interval and unit."""
    return w.with_unit(w.interval(row[column], row["lower"], row["upper"],
                                  w.places(row["quantity"]), sign=True), row["unit"])


def shown(row: Any, column: str, against: str, facts: Facts) -> str:
    """Return what a verdict shows, its size without a sign: "1.2 ± 0.3 K lower than ..."."""
    value, lower, upper = row[column], row["lower"], row["upper"]
    if value < 0:
        value, lower, upper = -value, -upper, -lower
    size = w.with_unit(w.interval(value, lower, upper, w.places(row["quantity"])), row["unit"])
    word, _, small = row["verdict"].partition(",")
    less = f", less than the relevant {relevant(row['quantity'], facts) or 'change'}"
    return f"{size} {word} {against}{less if small else ''}"


def relevant(quantity: str, facts: Facts) -> str:
    """Return the relevant change with its unit; "" where none was declared."""
    limit = (facts.get("relevant_change") or {}).get(quantity)
    return "" if limit is None else w.with_unit(w.number(float(limit), w.places(quantity)),
                                                w.difference_unit(quantity))


def margin(row: Any, facts: Facts) -> str:
    """Return the margin within which two values are equivalent."""
    small = relevant(row["quantity"], facts)
    return f"±{small}" if small else "the relevant change"


def missed(row: Any, words: str = "could have missed up to ") -> str:
    """Return in brackets what could have been missed, where it is known."""
    most = row["could_have_missed"]
    size = w.with_unit(w.expanded(most, w.places(row["quantity"])), row["unit"])
    return "" if pd.isna(most) else f" ({words}{size})"
