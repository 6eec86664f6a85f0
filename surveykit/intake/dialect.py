"""Delimited text at the level of bytes: the header, blocks of whole lines, well-formed or not."""

from __future__ import annotations

import csv
import gzip
import mmap
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from surveykit.core import BoolArray, InputError
from surveykit.intake.params.instruments import Layout

BLOCK_BYTES = 1 << 21  # fits a processor's cache; measured best of 1 to 8 MB
MIN_PREAMBLE = 4  # a shorter line of the preamble may as well be a record
HUGE = 100_000  # bytes of a line; a cell of more is no CSV to Python's reader
_BOM = b"\xef\xbb\xbf"

Data = bytes | mmap.mmap


@dataclass(frozen=True)
class Header:
    """The names of the columns, the line they stand in (1 = first), where the records begin.

    `start` is the byte and `first` the line where they do. `head` holds the lines above, blank
    ones left out: a logger that restarts writes them again.
    """

    columns: tuple[str, ...]
    line: int
    start: int
    first: int
    head: frozenset[bytes]


@dataclass(frozen=True)
class Lines:
    """The lines of a block that are not blank, ready for the table reader.

    `text` is UTF-8 and holds one well-formed line each; where `bad`, the line was none and stands
    as an empty one. `at` is its place in the block (0 = first line), `physical` the number of
    lines in the block, blank ones included, `again` the number of lines that repeat the file's
    head and are no records.
    """

    text: bytes
    at: NDArray[np.int32]
    bad: BoolArray
    physical: int
    again: int = 0


def open_bytes(path: Path) -> Data:
    """Return the bytes of a file, unpacked if it is a gzip file.

    Raises
    ------
    OSError, EOFError
        If the file cannot be read or unpacked.
    """
    with path.open("rb") as file:
        packed = file.read(2) == b"\x1f\x8b"
        data: Data = b""
        if packed:
            file.seek(0)
            data = gzip.decompress(file.read())
        elif path.stat().st_size:
            data = mmap.mmap(file.fileno(), 0, access=mmap.ACCESS_READ)
    if data and data.find(b"\n") < 0 <= data.find(b"\r"):
        return bytes(data).replace(b"\r", b"\n")
    return data


def release(data: Data) -> None:
    """Give back the memory of a mapped file's pages; they can still be read."""
    if isinstance(data, mmap.mmap) and hasattr(mmap, "MADV_DONTNEED"):
        data.madvise(mmap.MADV_DONTNEED)


def read_header(data: Data, layout: Layout, where: str) -> Header:
    """Return the header of a file.

    Raises
    ------
    InputError
        If the file is empty, ends before its header, or the header cannot be decoded.
    """
    if not len(data):
        raise InputError(f"{where}: the file is empty; copy it again from the logger, "
                         "or take it out of the logger's files")
    if data[:2] in (b"\xff\xfe", b"\xfe\xff"):
        raise InputError(f"{where}: the file is UTF-16; save it as UTF-8")
    start = len(_BOM) if data[: len(_BOM)] == _BOM else 0
    above: list[bytes] = []
    for number in range(layout.skip_lines + 1 + layout.unit_lines):
        if start >= len(data):
            what, key = ("its header", "skip_lines") if number <= layout.skip_lines else \
                ("its records", "unit_lines")
            raise InputError(f"{where}: the file ends at line {number}, before {what}; "
                             f"got {key} {getattr(layout, key)}, check layout.{key}")
        end = data.find(b"\n", start)
        end = len(data) if end < 0 else end
        above.append(data[start:end])
        start = end + 1
    line = above[layout.skip_lines]
    try:
        text = line.decode(layout.encoding).strip("\r\n")
    except UnicodeDecodeError as error:
        raise InputError(
            f"{where}, line {layout.skip_lines + 1}: the header holds the byte "
            f"0x{line[error.start]:02X}, which is not {layout.encoding}; "
            "write the file's encoding under layout.encoding (windows-1252 or latin-1)") from None
    head = frozenset(line.strip() for number, line in enumerate(above)
                     if len(line.strip()) >= (MIN_PREAMBLE if number < layout.skip_lines else 1))
    return Header(tuple(cells_of(text, layout)), layout.skip_lines + 1,
                  min(start, len(data)), len(above) + 1, head)


def blocks(data: Data, start: int) -> Iterator[tuple[int, int]]:
    """Yield the ends of consecutive blocks of whole lines, about `BLOCK_BYTES` each."""
    while start < len(data):
        end = start + BLOCK_BYTES
        if end < len(data):
            cut = data.rfind(b"\n", start, end)
            cut = data.find(b"\n", end) if cut < 0 else cut
            end = len(data) if cut < 0 else cut + 1
        yield start, min(end, len(data))
        start = end


def whole_lines(block: bytes, fields: int, layout: Layout,
                head: frozenset[bytes] = frozenset()) -> Lines:
    r"""Return the lines of a block that are not blank, the malformed ones emptied and named.

    Lines equal to one of `head` are left out and counted.

    A line is malformed if it has not `fields` fields, an open quote, a NUL byte, or bytes that are
    not in the layout's encoding. Separators alone decide: with every other byte deleted, the lines
    of a regular block are equal, which one comparison shows.

    Examples
    --------
    >>> lines = whole_lines(b"12:00,1.5\n\n12:01\n", 2, Layout())
    >>> lines.text, lines.at.tolist(), lines.bad.tolist()
    (b'12:00,1.5\n,\n', [0, 2], [False, True])
    """
    if b"\r" in block:
        block = block.replace(b"\r\n", b"\n").removesuffix(b"\r")
    if not block.endswith(b"\n"):
        block += b"\n"
    delimiter = layout.delimiter.encode()
    separators = block.translate(None, _others(delimiter))
    row = separators[: separators.find(b"\n") + 1]
    count = len(separators) // len(row)
    again = any(line in block for line in head)
    if (not again and separators == row * count and _well_formed(row[:-1], fields, layout)
            and (b'"' not in row or _quotes_enclose(block, delimiter))
            and _decodes(block, layout.encoding)):
        at, bad = np.arange(count, dtype=np.int32), np.zeros(count, dtype=np.bool_)
        return Lines(_utf8(block, layout.encoding), at, bad, count)
    return _one_by_one(block, separators, fields, layout, head if again else frozenset())


def _one_by_one(block: bytes, separators: bytes, fields: int, layout: Layout,
                head: frozenset[bytes]) -> Lines:
    filler = layout.delimiter.encode() * (fields - 1)
    known: dict[bytes, bool] = {}
    text, at, bad = [], [], []
    again = 0
    lines = block.split(b"\n")[:-1]
    for number, (line, shape) in enumerate(zip(lines, separators.split(b"\n"), strict=False)):
        if head and line.removeprefix(_BOM).strip() in head:
            again += 1
            continue
        good = known.get(shape)
        if good is None:
            good = _well_formed(line, fields, layout)
            if b'"' not in shape:
                known[shape] = good
        if not good and not line.strip() and layout.delimiter.encode() not in line:
            continue
        good = good and _decodes(line, layout.encoding)
        text.append((_requoted(line, layout) if b'"' in shape else line) if good else filler)
        at.append(number)
        bad.append(not good)
    joined = b"".join(line + b"\n" for line in text)
    return Lines(_utf8(joined, layout.encoding), np.array(at, dtype=np.int32),
                 np.array(bad, dtype=np.bool_), len(lines), again)


def _requoted(line: bytes, layout: Layout) -> bytes:
    cells = cells_of(line.decode("latin-1"), layout)
    quoted = ('"' + cell.replace('"', '""') + '"' for cell in cells)
    return layout.delimiter.join(quoted).encode("latin-1")


def _others(delimiter: bytes) -> bytes:
    return bytes(set(range(256)) - set(delimiter + b'\n\r"\0'))


def _well_formed(line: bytes, fields: int, layout: Layout) -> bool:
    if b"\0" in line or b"\r" in line or line.count(b'"') % 2:
        return False
    return len(cells_of(line.decode("latin-1"), layout)) == fields


def _quotes_enclose(block: bytes, delimiter: bytes) -> bool:
    quotes = block.count(b'"')
    opening = block.count(delimiter + b'"') + block.count(b'\n"') + block.startswith(b'"')
    return quotes == 2 * opening == 2 * (block.count(b'"' + delimiter) + block.count(b'"\n'))


def _decodes(text: bytes, encoding: str) -> bool:
    if text.isascii():
        return True
    try:
        text.decode(encoding)
    except UnicodeDecodeError:
        return False
    return True


def _utf8(text: bytes, encoding: str) -> bytes:
    return text if encoding == "utf-8" or text.isascii() else text.decode(encoding).encode()


def line_text(data: Data, header: Header, number: int, encoding: str) -> str:
    """Return one line after the header as text, for a message; its beginning if it is huge."""
    start = header.start
    for _ in range(number - header.first):
        start = data.find(b"\n", start) + 1
    text = data[start:start + HUGE].partition(b"\n")[0]
    return text.decode(encoding, "replace").strip("\r")


def sample_rows(data: Data, header: Header, layout: Layout, lines: int) -> list[list[str]]:
    """Return the cells of the first well-formed lines after the header."""
    start = header.start
    texts: list[str] = []
    while start < len(data) and len(texts) < lines:
        end = data.find(b"\n", start)
        end = len(data) if end < 0 else end
        texts.append(data[start:end].decode(layout.encoding, "replace"))
        start = end + 1
    rows = (cells_of(text, layout) for text in texts)
    return [row for row in rows if len(row) == len(header.columns)]


def cells_of(line: str, layout: Layout) -> list[str]:
    """Return the cells of one line, blanks around them taken off; none if it is no CSV."""
    try:
        cells = next(csv.reader([line.replace("\r", "")], delimiter=layout.delimiter,
                                skipinitialspace=layout.delimiter != " ", strict=True), [])
    except csv.Error:
        return []
    return [cell.strip() for cell in cells]
