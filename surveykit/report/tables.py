"""The published tables as a reader wants them: rounded by the page rule, labelled, captioned.

Each function takes a table of `core.TABLES` and returns `Html`; `show` displays it in a notebook.
`labels` maps a surface's name to the label that the user gave it.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import pandas as pd
from IPython.display import display

from . import wording as w
from .markup import Html, bullets, table
from .tables_records import (  # noqa: F401 - imported to be called from here
    check_table,
    clock_table,
    inputs_table,
    instrument_table,
    ledger_table,
    settings_table,
)
from .tables_results import (  # noqa: F401
    change_table,
    derived_table,
    difference_table,
    geometry_table,
    pass_table,
    surface_overview,
    surface_table,
    trend_table,
)


def show(item: Html | pd.DataFrame | Sequence[str], caption: str = "",
         columns: Sequence[str] | None = None) -> None:
    """Display a finished table, a frame under a caption, or sentences as a list.

    Parameters
    ----------
    item : Html, DataFrame or sequence of str
        What the functions of this module return, any frame, or what `sentences` returns.
    caption : str
        Needed with a frame; with sentences, what is said where there is none.
    columns : sequence of str, optional
        The frame's columns to show, in order; all by default.
    """
    if isinstance(item, pd.DataFrame):
        item = frame_table(item, caption, columns)
    elif not isinstance(item, Html):
        item = bullets(item, empty=caption or "There is none.")
    display(item)


def frame_table(frame: pd.DataFrame, caption: str, columns: Sequence[str] | None = None) -> Html:
    """Return any frame as a table, numbers to four significant digits, underscores as spaces."""
    shown = frame if columns is None else frame[[*columns]]
    heads = {_heading(str(name)): "number" if pd.api.types.is_numeric_dtype(kind) else "text"
             for name, kind in shown.dtypes.items()}
    rows = [[_any_text(value) for value in row]
            for row in shown.itertuples(index=False, name=None)]
    return table(caption, heads, rows, empty=f"{caption.rstrip('.')}: no rows.")


def _heading(name: str) -> str:
    quantity, _, kind = name.partition(" ")
    if quantity in w.QUANTITIES:
        return w.quantity_text(quantity, kind)
    return w.sentence_case(name.replace("_", " "))[:-1]


def _any_text(value: Any) -> str:
    if isinstance(value, float):
        return "" if pd.isna(value) else w.plain(float(f"{value:.4g}"))
    if isinstance(value, pd.Timestamp):
        return f"{value:%Y-%m-%d %H:%M:%S}" + (" UTC" if str(value.tz) == "UTC" else "")
    if value is None or value is pd.NaT:
        return ""
    if isinstance(value, int) and not isinstance(value, bool):
        return w.count(value)
    return w.plain(value)
