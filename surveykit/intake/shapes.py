"""The shape of ISO 8601 times: a time cut short would still be read, as another time."""

from __future__ import annotations

import io
import re
from collections.abc import Sequence

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from surveykit.core import BoolArray

TEMPLATES = 8  # shapes looked for at once; the rest is looked at one by one
_WHOLE = re.compile(rb'["\s]*(\d{4}-?\d\d-?\d\d)(?:[T ]\s*\d\d:?\d\d(:?\d\d(?:[.,]\d+)?)?)?\s*'
                    rb'(?:Z|[+-]\d\d(?::?\d\d)?)?["\s]*')
Shape = str


def shape_of(cell: bytes) -> Shape:
    """Return the shape of a time: "day", "minute", "second", or "" if it is none.

    Examples
    --------
    >>> [shape_of(t) for t in (b"2025-07-24T11:00:30.5Z", b"2025-07-24 11:00", b"2025-07-24T11:0")]
    ['second', 'minute', '']
    """
    found = _WHOLE.fullmatch(cell)
    if not found:
        return ""
    return "second" if found[2] else "minute" if b":" in cell or b"T" in cell else "day"


def usual_shape(cells: list[str]) -> Shape:
    """Return the finest shape among some times of a file."""
    shapes = {shape_of(cell.encode()) for cell in cells}
    return next((shape for shape in ("second", "minute", "day") if shape in shapes), "")


def odd_times(times: pd.Series, text: bytes, fields: int, at: Sequence[int], delimiter: str,
              usual: Shape) -> BoolArray:
    """Mark times that are not of the usual shape.

    Parameters
    ----------
    times : Series, shape (n,)
        What the reader made of them: texts, or times whose texts are lost.
    text : bytes
        The n well-formed lines of `fields` fields they were read from, the time in fields `at`.
    delimiter : str
        What separates the fields.
    usual : str
        From `usual_shape`.
    """
    if times.dtype.kind != "M":
        return np.array([isinstance(cell, str) and shape_of(cell.encode()) != usual
                         for cell in times], dtype=np.bool_)
    return _odd(text, fields, at[0], delimiter.encode(), usual)


def _odd(text: bytes, fields: int, at: int, delimiter: bytes, usual: Shape) -> BoolArray:
    r"""Mark the lines whose time is not of the usual shape.

    Examples
    --------
    >>> _odd(b"2025-07-24 11:00:30,1\n2025-07-24 11:00:3,2\n", 2, 0, b",", "second").tolist()
    [False, True]
    """
    data = np.frombuffer(text, dtype=np.uint8)
    if at and b'"' in text:
        cells = pd.read_csv(io.BytesIO(text), header=None, usecols=[at], dtype=str,
                            sep=delimiter.decode(), keep_default_na=False,
                            skip_blank_lines=False)[at]
        return np.array([shape_of(cell.encode()) != usual for cell in cells], dtype=np.bool_)
    if at:
        marks = np.flatnonzero((data == delimiter[0]) | (data == 10)).reshape(-1, fields)
        starts = marks[:, at - 1] + 1
    else:
        ends = np.flatnonzero(data == 10)
        starts = np.concatenate([[0], ends[:-1] + 1])
    odd = np.zeros(len(starts), dtype=np.bool_)
    rest = np.arange(len(starts))
    for _ in range(TEMPLATES):
        if not rest.size:
            return odd
        cell = _cell(text, int(starts[rest[0]]), delimiter)
        fit = _fits(data, starts[rest], cell, delimiter)
        fit[0] = True
        if shape_of(cell) != usual:
            odd[rest[fit]] = True
        rest = rest[~fit]
    for row in rest:
        odd[row] = shape_of(_cell(text, int(starts[row]), delimiter)) != usual
    return odd


def _cell(text: bytes, start: int, delimiter: bytes) -> bytes:
    line = text[start: text.find(b"\n", start)]
    return line.split(delimiter, 1)[0]


def _fits(data: NDArray[np.uint8], starts: NDArray[np.int64], cell: bytes,
          delimiter: bytes) -> BoolArray:
    """Return which cells have the same length and the same signs between their digits.

    They were read as times: digits stand between the signs, and only those after the last sign
    must be looked at, where a shorter cell would have ended.
    """
    signs = [place for place, sign in enumerate(cell) if not 48 <= sign < 58]
    fit = np.ones(len(starts), dtype=np.bool_)
    for place in (*signs, *range(signs[-1] + 1 if signs else 0, len(cell))):
        there = data.take(starts + place, mode="clip")
        fit &= there == cell[place] if place in signs else there - np.uint8(48) < 10
    end = data.take(starts + len(cell), mode="clip")
    fit &= (end == delimiter[0]) | (end == 10)
    return fit
