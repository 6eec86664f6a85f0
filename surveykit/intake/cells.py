"""Delimited text at the level of cells: times and numbers of well-formed lines."""

from __future__ import annotations

import io
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from surveykit.core import BoolArray, FloatArray
from surveykit.intake.params.instruments import Layout

_NUMBER = r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?"
_PRINTED = re.compile(r"[+-]?(?=\.?\d)\d*(?:\.(\d*))?(?:[eE]([+-]?\d{1,3}))?")


@dataclass(frozen=True)
class Numbers:
    """One column: values as logged (NaN where there is none), and which cells are no number."""

    values: FloatArray
    unreadable: BoolArray


def read_table(text: bytes, fields: int, texts_at: Sequence[int], numbers_at: Sequence[int],
               iso: bool, layout: Layout) -> tuple[pd.Series, dict[int, Numbers]]:
    """Return the column of times and the columns of numbers of well-formed lines.

    Times are datetime64 where pandas' reader could convert every one (ISO 8601), else text; of
    several columns of text, the texts joined by a blank. Without `texts_at` they are an empty
    column.
    """
    if not text:
        empty = Numbers(np.zeros(0), np.zeros(0, dtype=np.bool_))
        return pd.Series([], dtype=object), dict.fromkeys(numbers_at, empty)
    iso = iso and len(texts_at) == 1
    if iso and layout.decimal == "," and b"." not in text:  # then the fast readers can be used
        text = text.replace(b",", b".")
        layout = layout.model_copy(update={
            "decimal": ".", "missing": tuple(code.replace(",", ".") for code in layout.missing)})
    options: dict[str, Any] = {
        "header": None, "names": range(fields), "usecols": [*texts_at, *numbers_at],
        "index_col": False, "sep": layout.delimiter, "decimal": layout.decimal,
        "skipinitialspace": f"{layout.delimiter} ".encode() in text[: text.find(b"\n")],
        "skip_blank_lines": False, "keep_default_na": False,
        "na_values": missing_codes(layout)[0], "low_memory": False, "encoding": "utf-8"}
    dates: dict[str, Any] = {"parse_dates": [*texts_at], "date_format": "ISO8601"} if iso else {}
    kinds: dict[int, type] = {} if iso else dict.fromkeys(texts_at, object)
    try:
        frame = pd.read_csv(io.BytesIO(text), **options, **dates,
                            dtype=kinds | dict.fromkeys(numbers_at, float))
    except ValueError:
        frame = pd.read_csv(io.BytesIO(text), **options, **dates,
                            dtype=kinds | dict.fromkeys(numbers_at, object))
    times = pd.Series([], dtype=object)
    for at in texts_at:  # a text and a missing one give a missing one
        part = frame[at] if iso or len(texts_at) == 1 else frame[at].str.strip()
        times = part if at == texts_at[0] else times + " " + part
    return times, {at: numbers_of(frame[at], layout) for at in numbers_at}


def missing_codes(layout: Layout) -> tuple[list[str], FloatArray]:
    """Return the codes of a missing reading: the texts, and those that are numbers.

    Examples
    --------
    >>> missing_codes(Layout(missing=["", "NAN", "-99,9"], decimal=",", delimiter=";"))
    (['', 'NAN'], array([-99.9]))
    """
    texts, numbers = [""], []
    for code in map(str.strip, layout.missing):
        if re.fullmatch(_NUMBER, code.replace(layout.decimal, ".")):
            numbers.append(float(code.replace(layout.decimal, ".")))
        else:
            texts.append(code)
    return list(dict.fromkeys(texts)), np.array(numbers, dtype=np.float64)


def numbers_of(column: pd.Series, layout: Layout) -> Numbers:
    """Return what a column of numbers, or of texts, holds; each different text is read once."""
    texts, codes = missing_codes(layout)
    if column.dtype == np.float64:
        values = column.to_numpy()
        unreadable = np.isinf(values)
        missing = unreadable.copy()
        for code in codes:
            missing |= values == code
        return Numbers(np.where(missing, np.nan, values) if missing.any() else values, unreadable)
    code, different = pd.factorize(column.astype(object).where(column.notna(), ""))
    cells = pd.Series(different, dtype=object).str.strip()
    if layout.decimal != ".":
        cells = cells.str.replace(".", "x", regex=False).str.replace(layout.decimal, ".")
    good = cells.str.fullmatch(_NUMBER).to_numpy(dtype=np.bool_)
    text = "\n".join(cells.where(good, "")) + "\n"
    again = pd.read_csv(io.StringIO(text), header=None, names=["value"], dtype=float, sep="\t",
                        skip_blank_lines=False, keep_default_na=False, na_values=[""])
    read = numbers_of(again["value"], layout)
    unreadable = read.unreadable | ~(good | cells.isin(texts).to_numpy())
    return Numbers(read.values[code], unreadable[code])  # noqa: PD011 - not a table


def printed_step(sample: list[list[str]], at: int, layout: Layout) -> float:
    """Return the step of the last digit printed in a column; NaN if no number is."""
    codes, places = set(missing_codes(layout)[1].tolist()), []
    for row in sample:
        text = row[at].strip().replace(layout.decimal, ".")
        found = _PRINTED.fullmatch(text)
        if found and float(text) not in codes:
            places.append(int(found[2] or 0) - len(found[1] or ""))
    return float(f"1e{min(*places, 0)}") if places else float("nan")
