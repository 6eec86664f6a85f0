"""A first instruments file, written from sample logs: every guess marked to be confirmed."""

from __future__ import annotations

import json
import re
from collections.abc import Collection, Iterable, Sequence
from pathlib import Path

from surveykit.intake.params.quantities import MAIN, PHYSICAL_UNITS, RAW_UNITS
from surveykit.intake.params.scalars import plain_reading
from surveykit.intake.sniffing import ColumnGuess, Guess, look_at

CONFIRM, FILL_IN = "# CONFIRM", "# FILL IN"
HEAD = """\
# yaml-language-server: $schema=instruments.schema.json
# A first guess from {files}.
# CONFIRM: read off the file; compare it with the logger's program. FILL IN: from the calibration
# certificate and the data sheet. Then: surveykit check params/{name}-instruments.yml
"""


def sketch(name: str, paths: Sequence[Path]) -> tuple[str, dict[str, list[str]]]:
    """Return the text of a first instruments file, and the files of each of its entries.

    Files written alike (header, layout and time) are taken for one logger's.

    Parameters
    ----------
    name : str
        The campaign's name.
    paths : sequence of Path
        Sample files of its loggers.

    Raises
    ------
    InputError
        If a file does not look like a log.
    """
    found: dict[tuple[object, ...], tuple[Guess, list[Path]]] = {}
    for path in paths:
        guess = look_at(path)
        key = (guess.header, guess.layout.delimiter, guess.layout.decimal, guess.time.columns,
               guess.time.format)
        found.setdefault(key, (guess, []))[1].append(path)
    files: dict[str, list[str]] = {}
    for _, some in found.values():
        names = [path.name for path in some]
        files[_entry_name(names, files)] = names
    text = HEAD.format(name=name, files=", ".join(
        path.name if path.name.isprintable() else repr(path.name) for path in paths))
    for entry, (guess, _) in zip(files, found.values(), strict=True):
        text += "\n" + "\n".join(_entry(entry, guess)) + "\n"
    return text, files


def is_sheet(path: Path) -> bool:
    """Return whether a file begins as a field sheet does; False where it cannot be read."""
    try:
        with path.open("rb") as file:
            head = file.readline(2000).decode("utf-8-sig", "replace")
    except OSError:
        return False
    return {"entry", "surface", "patch"} <= {*re.split(r"[\s,;\"]+", head.casefold())}


def _entry_name(files: Sequence[str], taken: Collection[str]) -> str:
    """Return a name that no other entry has and that every YAML reader takes for text."""
    stem = files[0].split(".")[0].lower()
    if len(files) > 1:
        stem = re.sub(r"[-_ ]*\d+$", "", stem)
    name = re.sub(r"[^a-z0-9]+", "-", stem).strip("-")[:40] or "logger"
    if plain_reading(name) != (name, None):
        name = f"logger-{name}"
    return next(one for one in (name, *(f"{name}-{n}" for n in range(2, len(taken) + 2)))
                if one not in taken)


def _quoted(text: str) -> str:
    return json.dumps(text, ensure_ascii=False)


def _entry(name: str, guess: Guess) -> Iterable[str]:
    layout, time = guess.layout, guess.time
    yield f"{name}:"
    yield f'  serial: "..."  {FILL_IN}: as engraved on the instrument'
    yield "  layout:"
    yield (f"    delimiter: {_quoted(layout.delimiter)}  {CONFIRM}: {guess.share:.0%} of the lines "
           f"then have {len(guess.header)} fields")
    yield f"    decimal: {_quoted(layout.decimal)}  {CONFIRM}"
    yield f"    skip_lines: {layout.skip_lines}  {CONFIRM}: lines above the header"
    yield f"    unit_lines: {layout.unit_lines}  {CONFIRM}: lines between header and records"
    yield f"    encoding: {layout.encoding}  {CONFIRM}"
    yield (f"    missing: [{', '.join(map(_quoted, layout.missing))}]  "
           f"{CONFIRM}: codes of a missing reading")
    yield "  time:"
    columns = [_quoted(column) for column in time.columns]
    yield (f"    column: {columns[0] if len(columns) == 1 else '[' + ', '.join(columns) + ']'}  "
           f"{CONFIRM}: the first record says {time.example[:60]!r}")
    also = f"; {' and '.join(map(_quoted, time.others))} would fit as well: day or month first?" \
        if time.others else ""
    yield f"    format: {_quoted(time.format)}  {CONFIRM}{also}"
    why = "the times carry their offset" if time.offsets and time.format != "epoch_s" else \
        "epoch_s counts in UTC" if time.format == "epoch_s" else \
        "the file does not say; UTC, or a zone such as Europe/Lisbon"
    yield f"    zone: UTC  {CONFIRM}: {why}"
    if time.format == "day_of_year" and len(time.columns) < 3:
        yield f"    year:  {FILL_IN}: no column holds it"
    guessed = any(column.quantity for column in guess.columns)
    yield "  columns:" + ("" if guessed else f"  {FILL_IN}: no header says what its column holds")
    seen: set[str] = set()
    for column in guess.columns:
        yield from _column(column, seen)
    if seen & {"brightness_temperature"}:
        yield f"  band_um: [8, 14]  {CONFIRM}"
        yield "  # view_angle_deg: 30  where the head looks aslant, from straight down"
    if seen & set(MAIN):
        yield f"  time_constant_s:  {FILL_IN}: time to 63 % of a step"
        yield f"  half_angle_deg:  {FILL_IN}: half of the field of view, 90 for a hemisphere"
        yield '  # calibration: {id: ..., date: "YYYY-MM-DD", valid_days: 730}  ' + FILL_IN


def _column(column: ColumnGuess, seen: set[str]) -> Iterable[str]:
    """Yield the lines of one column; commented out where its name says nothing or says it twice."""
    span = f"from {column.low:g} to {column.high:g}, typically {column.median:g}"
    if not column.quantity or column.quantity in seen:
        why = "no guess of its quantity" if not column.quantity else \
            f"{column.quantity} is taken by the column above"
        yield f"    # {_quoted(column.header)}: left out, {why}; {span}"
        return
    seen.add(column.quantity)
    unit = column.unit
    known = PHYSICAL_UNITS[column.quantity]
    if unit not in (*known, *RAW_UNITS):
        unit = next(iter(known))
    yield f"    {_quoted(column.header)}:  # {span}"
    yield f"      quantity: {column.quantity}  {CONFIRM}"
    yield f"      unit: {_quoted(unit)}  {CONFIRM}: unit as logged"
    if unit in RAW_UNITS:
        yield f"      gain:  {FILL_IN}: {next(iter(known))} for one {unit}"
        yield f"      offset: 0.0  {CONFIRM}"
    if column.quantity in MAIN:
        yield f"      u_gain:  {FILL_IN}: relative standard uncertainty, 0.015 for 1.5 %"
        yield f"      u_offset:  {FILL_IN}: standard uncertainty in {next(iter(known))}"
