"""Loggers: the raw files of one logger -> records in UTC and SI, every line accounted for."""

from __future__ import annotations

import hashlib
import os
import zlib
from collections.abc import Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from surveykit.core import BoolArray, InputError, IntArray
from surveykit.intake import cells, dialect
from surveykit.intake.counted import counted_times
from surveykit.intake.params.instruments import COUNTED, Channel, Instrument, Layout
from surveykit.intake.params.paths import outside_allowed
from surveykit.intake.records import NO_TIME_NS, FileFacts, Records, in_order, out_of_order
from surveykit.intake.shapes import odd_times, usual_shape
from surveykit.intake.times import NO_OFFSET, read_times, to_utc

SAMPLE_LINES = 200


def expand_files(data_folder: Path, patterns: Sequence[str]) -> list[Path]:
    """Return the files in `data_folder` that match the patterns, each once, sorted by path.

    Raises
    ------
    InputError
        For each pattern that matches no file; the message lists what the folder holds.
    """
    found: set[Path] = set()
    faults = []
    for pattern in patterns:
        matches = _matches(data_folder, pattern)
        found.update(matches)
        if not matches:
            held = sorted(path.name for path in _matches(data_folder, "*"))
            listing = ", ".join(held[:20]) + (", ..." if len(held) > 20 else "")
            state = f"it holds {listing or 'no files'}" if os.path.isdir(data_folder) else \
                "the folder does not exist"
            faults.append(f"{data_folder.name}: no file matches {pattern!r}; {state}")
    if faults:
        raise InputError(*faults)
    return sorted(found, key=lambda path: path.as_posix())


def _matches(folder: Path, pattern: str) -> list[Path]:
    try:
        if (folder / pattern).is_file():  # a name that holds [ or ] is no pattern
            return [folder / pattern]
        return [path for path in folder.glob(pattern) if path.is_file()]
    except (OSError, ValueError, IndexError, NotImplementedError):  # of pathlib, of no name
        return []


def read_logger(name: str, instrument: Instrument, paths: Sequence[Path], root: Path) -> Records:
    """Return all records of one logger.

    Parameters
    ----------
    name : str
        The logger's name in the parameter file.
    instrument : Instrument
        Its entry in the kit: layout, times and columns.
    paths : sequence of Path
        Its raw files in any order; `.gz` is unpacked.
    root : Path
        The project folder; `Records.files` and messages give paths under it.

    Raises
    ------
    InputError
        One sentence for each file that cannot be read: missing or empty, without a declared
        column, not in the declared encoding or format, a time that the zone lacks or has twice.
    """
    channels = instrument.channels(name)
    files: list[Records] = []
    faults: list[str] = []
    for path in sorted(set(paths), key=lambda path: path.as_posix()):
        try:
            files.append(_read_file(name, path, root, instrument, channels))
        except InputError as error:
            faults += error.faults
    if not faults and not any(len(file) for file in files):
        named = ", ".join(file.files[0].path for file in files) or "no file"
        faults.append(f"{named}: logger {name!r} has no records; name its files under "
                      f"loggers.{name}.files")
    if faults:
        raise InputError(*faults)
    return in_order(_joined(files))


def _read_file(name: str, path: Path, root: Path, instrument: Instrument,
               channels: Sequence[Channel]) -> Records:
    """Return the records of one file, as they stand in it."""
    where = path.relative_to(root).as_posix() if path.is_relative_to(root) else path.name
    layout = instrument.layout
    if not (outside_allowed() or path.resolve().is_relative_to(root.resolve())):
        raise InputError(f"{where}: is a link that leads out of the project folder; copy the file")
    try:
        data = dialect.open_bytes(path)
        header = dialect.read_header(data, layout, where)
    except (OSError, EOFError, zlib.error) as error:
        raise InputError(f"{where}: cannot be read ({getattr(error, 'strerror', None) or error}); "
                         "copy it again from the logger") from None
    form = instrument.time
    times_at, numbers_at = _places(header, form.column, [c.column for c in channels], layout, where)
    texts_at, counts_at = ([], times_at) if form.format in COUNTED else (times_at, [])
    fields = len(header.columns)
    sample = dialect.sample_rows(data, header, layout, SAMPLE_LINES)
    iso = form.format == "iso8601"
    shape = usual_shape([" ".join(row[at] for at in times_at) for row in sample]) if iso else ""

    def read(ends: tuple[int, int]) -> tuple[int, int, dict[str, NDArray]]:
        lines = dialect.whole_lines(data[ends[0]:ends[1]], fields, layout, header.head)
        texts, numbers = cells.read_table(
            lines.text, fields, texts_at, [*counts_at, *numbers_at], iso, layout)
        wall_ns, offset_s = read_times(texts, form.format) if texts_at else \
            counted_times([numbers[at].values for at in counts_at], form.format, form.year)
        if iso:
            odd = odd_times(texts, lines.text, fields, times_at, layout.delimiter, shape)
            wall_ns = np.where(odd, NO_TIME_NS, wall_ns)
            offset_s = np.where(odd, NO_OFFSET, offset_s)
        part: dict[str, NDArray] = {
            "line": lines.at, "bad": lines.bad, "wall_ns": wall_ns, "offset_s": offset_s}
        for channel, at in zip(channels, numbers_at, strict=True):
            part[f"value {channel.column}"] = channel.to_si(numbers[at].values)
            part[f"unreadable {channel.column}"] = numbers[at].unreadable
        return lines.physical, lines.again, part

    def digest() -> str:
        packed = isinstance(data, bytes)
        return hashlib.sha256(path.read_bytes() if packed else data).hexdigest()

    with ThreadPoolExecutor(min(4, os.cpu_count() or 1)) as pool:
        sha256 = pool.submit(digest)  # beside the reading: hashing and parsing share the cores
        ends = list(dialect.blocks(data, header.start)) or [(header.start, header.start)]
        blocks = list(pool.map(read, ends))
    dialect.release(data)
    above = header.first
    for physical, _, part in blocks:
        part["line"] += np.int32(above)
        above += physical
    whole = _chained([part for _, _, part in blocks])
    line, bad_line = whole["line"], whole["bad"]

    def locate(rows: BoolArray) -> str:
        return f"{where}, line {line[np.flatnonzero(rows)[0]]}"

    _refuse_unlike(data, header, instrument, where, line, bad_line, whole["wall_ns"], times_at)
    time_ns = to_utc(whole["wall_ns"], whole["offset_s"], instrument.time.zone, locate)
    facts = FileFacts(where, sha256.result(), path.stat().st_size, len(line),
                      sum(again for _, again, _ in blocks))
    return Records(
        logger=name, time_ns=time_ns, file=np.zeros(len(line), dtype=np.int16), line=line,
        channels={c.column: whole[f"value {c.column}"] for c in channels},
        unreadable={c.column: whole[f"unreadable {c.column}"] for c in channels},
        marks={"unreadable line": bad_line,
               "unreadable time": (time_ns == NO_TIME_NS) & ~bad_line,
               "time stepped back": _stepped_back(time_ns)},
        files=(facts,), interval_s=instrument.interval_s or float("nan"),
        resolution={c.column: abs(c.gain.value) * cells.printed_step(sample, at, layout)
                    for c, at in zip(channels, numbers_at, strict=True)})


def _stepped_back(time_ns: IntArray) -> BoolArray:
    """Mark single times out of place in their file, and times earlier than any other before."""
    marked = np.zeros(len(time_ns), dtype=np.bool_)
    if (time_ns[1:] < time_ns[:-1]).any():
        timed = np.flatnonzero(time_ns != NO_TIME_NS)
        odd = out_of_order(time_ns[timed])
        latest = np.maximum.accumulate(np.where(odd, NO_TIME_NS, time_ns[timed]))
        marked[timed] = odd | (time_ns[timed] < latest)
    return marked


def _chained(parts: list[dict[str, NDArray]]) -> dict[str, NDArray]:
    """Join each array of the parts, taking it out of them so that memory is held once."""
    return {name: _chain([part.pop(name) for part in parts]) for name in list(parts[0])}


def _chain(parts: list[NDArray]) -> NDArray:
    return parts[0] if len(parts) == 1 else np.concatenate(parts)


def _places(header: dialect.Header, times: Sequence[str], values: Sequence[str], layout: Layout,
            where: str) -> tuple[list[int], list[int]]:
    """Return where the columns of the time and those of readings stand."""
    faults: list[str] = []
    for key, column in ([("time.column", name) for name in times]
                        + [(f"columns.{name}", name) for name in values]):
        count = header.columns.count(column)
        if count == 0:
            names = ", ".join(repr(name) for name in header.columns)
            faults.append(
                f"{where}, line {header.line}: no column {column!r} ({key}); the header with "
                f"delimiter {layout.delimiter!r} has {names[:300] or 'nothing'}; check {key}, "
                "layout.delimiter and layout.skip_lines")
        elif count > 1:
            faults.append(f"{where}, line {header.line}: {count} columns are named {column!r} "
                          f"({key}); give each its own name in the logger's program")
    if faults:
        raise InputError(*faults)
    return ([header.columns.index(column) for column in times],
            [header.columns.index(column) for column in values])


def _refuse_unlike(data: dialect.Data, header: dialect.Header, instrument: Instrument, where: str,
                   line: NDArray[np.int32], bad_line: BoolArray, wall_ns: IntArray,
                   times_at: Sequence[int]) -> None:
    """Refuse a file none of whose lines is as declared: then the declaration is at fault."""
    unread = bad_line.all()
    if not len(line) or not (unread or (wall_ns == NO_TIME_NS).all()):
        return
    layout = instrument.layout
    number = int(line[0] if unread else line[~bad_line][0])
    text = dialect.line_text(data, header, number, layout.encoding)
    fields = dialect.cells_of(text, layout)
    if unread:
        what = (f"{len(fields)} fields where the header has {len(header.columns)}"
                if len(fields) != len(header.columns) else
                f"bytes that are not {layout.encoding}" if "\ufffd" in text else "stray bytes")
        raise InputError(
            f"{where}, line {number}: no line of the file can be read, this first one has {what}; "
            "check layout.delimiter, layout.decimal, layout.encoding and layout.skip_lines")
    cell = " ".join(fields[at] for at in times_at if at < len(fields))[:60]
    raise InputError(
        f"{where}, line {number}: no time of the file can be read, the first is {cell!r}; got "
        f"time.format {instrument.time.format!r}, write iso8601 or the format the logger uses")


def _joined(files: list[Records]) -> Records:
    """Return the records of all files, one after the other."""
    def joined(held: str) -> dict[str, NDArray]:
        columns = [getattr(file, held) for file in files]
        return {name: _chain([part[name] for part in columns]) for name in columns[0]}

    finest = {name: np.array([file.resolution[name] for file in files])
              for name in files[0].resolution}
    return replace(
        files[0], time_ns=_chain([file.time_ns for file in files]),
        file=np.repeat(np.arange(len(files), dtype=np.int16), [len(file) for file in files]),
        line=_chain([file.line for file in files]), channels=joined("channels"),
        unreadable=joined("unreadable"), marks=joined("marks"),
        files=tuple(facts for file in files for facts in file.files),
        resolution={name: float(np.nanmin(steps)) if np.isfinite(steps).any() else float("nan")
                    for name, steps in finest.items()})
