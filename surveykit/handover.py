"""What stages hand to one another on disk: tables and arrays as .npz, facts as JSON.

Every file is written beside its place and moved there whole, so that a stopped run leaves the
old file or the new one, never half of one. No pickle: what is read back cannot run code.
"""

from __future__ import annotations

import hashlib
import json
import os
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any, BinaryIO

import numpy as np
import pandas as pd
from numpy.typing import NDArray

_TIME = pd.DatetimeTZDtype("ns", "UTC")


def save_whole(path: Path, write: Callable[[BinaryIO], Any]) -> None:
    """Have `write` write a file, which takes the place of an old one once it is whole."""
    path.parent.mkdir(parents=True, exist_ok=True)
    beside = path.with_name(f".{path.name}.{os.getpid()}.new")
    try:
        with beside.open("wb") as file:
            write(file)
        os.replace(beside, path)
    finally:
        beside.unlink(missing_ok=True)


def save_text(path: Path, text: str) -> None:
    """Write a text in UTF-8, whole, its line ends as they are."""
    save_whole(path, lambda file: file.write(text.encode("utf-8")))


def sha256(path: Path) -> str:
    """Return the SHA-256 of a file in hexadecimal."""
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def save_arrays(path: Path, arrays: Mapping[str, NDArray[Any]]) -> None:
    """Write named arrays of numbers, truth values, times or fixed-width text as one .npz file.

    Parameters
    ----------
    path : Path
        The file, its name as given; folders that lack are made.
    arrays : mapping of str to ndarray
        Arrays of any shape, in an order that is kept; any name.

    Raises
    ------
    TypeError
        If an array holds Python objects.
    """
    for name, array in arrays.items():
        if np.asarray(array).dtype.hasobject:
            raise TypeError(f"{path.name}: array {name!r} holds Python objects, "
                            "which are not handed over")
    names = _texts(path, "names of arrays", list(arrays))
    save_whole(path, lambda file: np.savez(file, names, *arrays.values()))


def load_arrays(path: Path) -> dict[str, NDArray[Any]]:
    """Return the arrays that `save_arrays` wrote, in their order.

    Raises
    ------
    FileNotFoundError
        If there is no such file.
    """
    with np.load(path, allow_pickle=False) as held:
        names = held["arr_0"].tolist()
        return {name: held[f"arr_{place}"] for place, name in enumerate(names, start=1)}


def save_table(path: Path, frame: pd.DataFrame) -> None:
    """Write a table as one .npz file: times as int64 ns UTC, text as codes into a vocabulary.

    Parameters
    ----------
    path : Path
        The file, its name as given; folders that lack are made.
    frame : DataFrame
        Columns of numbers, truth values, datetime64[ns, UTC] or text without a missing one; rows
        numbered from 0.

    Raises
    ------
    TypeError
        If a column is of another kind, or text holds something else (a missing value among it).
    ValueError
        If two columns share a name or the rows are not numbered from 0.
    """
    if not frame.columns.is_unique or not frame.index.equals(pd.RangeIndex(len(frame))):
        raise ValueError(f"{path.name}: a table needs column names that differ and rows numbered "
                         "from 0")
    columns = [str(name) for name in frame.columns]
    arrays: dict[str, NDArray[Any]] = {"columns": _texts(path, "names of columns", columns)}
    for name in columns:
        column = frame[name]
        if isinstance(column.dtype, np.dtype) and column.dtype.kind in "biuf":
            arrays[f"plain {name}"] = column.to_numpy()
        elif column.dtype == _TIME:
            arrays[f"time {name}"] = column.to_numpy(dtype="datetime64[ns]").view(np.int64)
        elif pd.api.types.infer_dtype(column, skipna=False) in ("string", "empty"):
            codes, words = pd.factorize(column.to_numpy(dtype=object))
            arrays[f"codes {name}"] = codes.astype(np.int32)
            arrays[f"words {name}"] = _texts(path, f"column {name!r}", list(words))
        else:
            raise TypeError(f"{path.name}: column {name!r} of kind {column.dtype} holds what is "
                            "not handed over: numbers, truth values, UTC times in ns or text "
                            "without a missing one are")
    save_arrays(path, arrays)


def load_table(path: Path) -> pd.DataFrame:
    """Return the table that `save_table` wrote; text comes as object columns.

    Raises
    ------
    FileNotFoundError
        If there is no such file.
    """
    arrays = load_arrays(path)
    columns = {name: _column(arrays, name) for name in arrays["columns"].tolist()}
    return pd.DataFrame(columns)


def save_facts(path: Path, facts: Mapping[str, Any]) -> None:
    """Write facts as JSON with sorted keys: the same facts give the same bytes.

    Parameters
    ----------
    path : Path
        The file, its name as given; folders that lack are made.
    facts : mapping of str
        Plain JSON data: text, finite numbers, truth values, None, lists, mappings with text keys.

    Raises
    ------
    TypeError
        If something is not JSON data.
    ValueError
        If a number is NaN or infinite.
    """
    text = json.dumps(facts, sort_keys=True, indent=1, ensure_ascii=False, allow_nan=False)
    save_text(path, f"{text}\n")


def load_facts(path: Path) -> dict[str, Any]:
    """Return the facts that `save_facts` wrote.

    Raises
    ------
    FileNotFoundError
        If there is no such file.
    """
    facts: dict[str, Any] = json.loads(path.read_text(encoding="utf-8"))
    return facts


def _column(arrays: Mapping[str, NDArray[Any]], name: str) -> pd.Series:
    if f"plain {name}" in arrays:
        return pd.Series(arrays[f"plain {name}"])
    if f"time {name}" in arrays:
        return pd.Series(arrays[f"time {name}"].view("datetime64[ns]")).dt.tz_localize("UTC")
    words = arrays[f"words {name}"].astype(object)
    return pd.Series(words[arrays[f"codes {name}"]], dtype=object)


def _texts(path: Path, what: str, texts: list[str]) -> NDArray[np.str_]:
    held = np.array(texts, dtype=np.str_)
    if held.tolist() != texts:  # numpy drops trailing NUL characters
        raise TypeError(f"{path.name}: {what}: a text ends with a NUL character")
    return held
