"""Ways in which files get spoilt: each takes the bytes of a file and a generator of chances."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

Change = Callable[[bytes, np.random.Generator], bytes]
HUGE = 200_000


def _lines(data: bytes) -> list[bytes]:
    return data.splitlines(keepends=True)


def _run(data: bytes, rng: np.random.Generator) -> tuple[list[bytes], int, int]:
    lines = _lines(data)
    first = int(rng.integers(0, len(lines)))
    return lines, first, int(rng.integers(first + 1, min(len(lines), first + 40) + 1))


def truncate(data: bytes, rng: np.random.Generator) -> bytes:
    return data[: int(rng.integers(0, len(data)))]


def duplicate(data: bytes, rng: np.random.Generator) -> bytes:
    lines, first, last = _run(data, rng)
    at = int(rng.integers(0, len(lines) + 1))
    return b"".join([*lines[:at], *lines[first:last], *lines[at:]])


def duplicate_all(data: bytes, rng: np.random.Generator) -> bytes:
    return data + data


def shuffle(data: bytes, rng: np.random.Generator) -> bytes:
    lines, first, last = _run(data, rng)
    some = lines[first:last]
    rng.shuffle(some)  # type: ignore[arg-type]
    return b"".join([*lines[:first], *some, *lines[last:]])


def swap_lines(data: bytes, rng: np.random.Generator) -> bytes:
    lines = _lines(data)
    one, other = rng.integers(0, len(lines), 2)
    lines[one], lines[other] = lines[other], lines[one]
    return b"".join(lines)


def swap_columns(data: bytes, rng: np.random.Generator) -> bytes:
    """Swap two columns with their headers; in a file without columns, two lines."""
    rows = [line.rstrip(b"\n").split(b",") for line in _lines(data)]
    if len({len(row) for row in rows}) > 1 or len(rows[0]) < 2:
        return swap_lines(data, rng)
    one, other = rng.choice(len(rows[0]), 2, replace=False)
    for row in rows:
        row[one], row[other] = row[other], row[one]
    return b"".join(b",".join(row) + b"\n" for row in rows)


def drop_lines(data: bytes, rng: np.random.Generator) -> bytes:
    lines, first, last = _run(data, rng)
    return b"".join(lines[:first] + lines[last:])


def _inserted(piece: bytes) -> Change:
    def change(data: bytes, rng: np.random.Generator) -> bytes:
        at = int(rng.integers(0, len(data) + 1))
        return data[:at] + piece + data[at:]
    return change


def not_utf8(data: bytes, rng: np.random.Generator) -> bytes:
    return _inserted(bytes([int(rng.integers(0x80, 0x100))]))(data, rng)


def _in_a_cell(new: Callable[[bytes], bytes]) -> Change:
    """Replace one cell: of a table, or the value of a key."""
    def change(data: bytes, rng: np.random.Generator) -> bytes:
        lines = _lines(data)
        at = int(rng.integers(0, len(lines)))
        line = lines[at].rstrip(b"\n")
        if b"," in line and b": " not in line:
            cells = line.split(b",")
            place = int(rng.integers(0, len(cells)))
            cells[place] = new(cells[place])
            lines[at] = b",".join(cells) + b"\n"
        elif b": " in line:
            key, value = line.split(b": ", 1)
            lines[at] = key + b": " + new(value) + b"\n"
        else:
            lines[at] = line + new(b"") + b"\n"
        return b"".join(lines)
    return change


CHANGES: dict[str, Change] = {
    "truncate": truncate, "duplicate lines": duplicate, "duplicate the file": duplicate_all,
    "shuffle lines": shuffle, "swap lines": swap_lines, "swap columns": swap_columns,
    "drop lines": drop_lines, "NUL": _inserted(b"\0"), "not UTF-8": not_utf8,
    "huge digits": _in_a_cell(lambda cell: b"9" * HUGE),
    "huge text": _in_a_cell(lambda cell: b"x" * HUGE),
    "1e999": _in_a_cell(lambda cell: b"1e999"), "-1e999": _in_a_cell(lambda cell: b"-1e999"),
    "#REF!": _in_a_cell(lambda cell: b"#REF!"),
    "unicode minus": _in_a_cell(lambda cell: "\u2212".encode() + cell),
    "formula": _in_a_cell(lambda cell: b"=" + cell), "quote": _inserted(b'"'),
    "line end": _inserted(b"\n"), "blank cell": _in_a_cell(lambda cell: b""),
}
