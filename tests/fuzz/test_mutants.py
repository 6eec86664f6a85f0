"""Spoilt files are read as if clean, accounted for, or refused at their place; never else.

300 mutants by default, SURVEYKIT_MUTANTS=4000 in continuous integration, 5,000 with
SURVEYKIT_FULL=all; the seed stands in the names of the tests.
What a mutant comes to is held against the clean campaign: its numbers are the same, or the ledger,
the checks, the flags or the notes differ; a spoilt parameter file that still loads must say
something else, since what it says is printed with the report. The ledger is held against the lines
of the mutant, counted here.
"""

from __future__ import annotations

import os
import re

import numpy as np
import pytest
import yard
from mutants import CHANGES

from surveykit.core import InputError

SEED = 20250611
FULL = os.environ.get("SURVEYKIT_FULL") == "all"
MUTANTS = 5000 if FULL else int(os.environ.get("SURVEYKIT_MUTANTS", "300"))
BATCHES = 20
CLEAN = yard.clean_files()
STATED = (yard.PARAMETERS, yard.KIT_FILE)
LOCATED = re.compile(r"(params/[\w./-]+|data/[\w./-]+|loggers\.\w+)( line \d+| row \d+|, line \d+)?"
                     r"[:, ]")


@pytest.fixture(scope="module")
def clean(tmp_path_factory):
    root = tmp_path_factory.mktemp("clean")
    yard.write_files(root, CLEAN)
    found = yard.outcome(root)
    assert not isinstance(found, InputError), found
    assert len(found.numbers) == 4
    assert all(np.isfinite(value) for value, _ in found.numbers.values())
    return found


def equal(one, other) -> bool:
    return one.keys() == other.keys() and all(
        np.array_equal(one[key], other[key], equal_nan=True) for key in one)


def lines_of(data: bytes) -> int:
    """Return the lines of a log under its header that hold anything."""
    lines = data.replace(b"\r\n", b"\n").removeprefix(b"\xef\xbb\xbf").split(b"\n")
    return sum(bool(line.strip()) or b"," in line for line in lines[1:])


def verdict(found, clean, name: str, data: bytes) -> str:
    """Return what is wrong with what a mutant came to; "" if nothing is."""
    if isinstance(found, InputError):
        odd = [fault for fault in found.faults if not LOCATED.match(fault) or "\n" in fault]
        return f"not located: {odd[0][:300]}" if odd or not found.faults else ""
    counted = found.ledger.groupby("file")["records"].sum().to_dict()
    if counted != {file: n for file, n in found.read.items() if n}:
        return f"the ledger counts {counted}, read were {found.read}"
    if name in found.read and found.read[name] + found.head_lines != lines_of(data):
        return f"{found.read[name]} records and {found.head_lines} heads of {lines_of(data)} lines"
    if equal(found.numbers, clean.numbers):
        return ""
    if name in STATED:
        return "" if found.declared != clean.declared else "other numbers from the same parameters"
    return "" if found.account != clean.account else f"other numbers, unaccounted: {found.numbers}"


@pytest.mark.parametrize("batch", range(BATCHES), ids=lambda n: f"seed {SEED}, batch {n}")
def test_spoilt_files_are_accounted_for_or_refused_where_they_are(tmp_path, clean, batch):
    print(f"mutants of seed {SEED}: {MUTANTS // BATCHES} from batch {batch}")  # noqa: T201
    yard.write_files(tmp_path, CLEAN)
    wrong = []
    for number in range(batch, MUTANTS, BATCHES):
        rng = np.random.default_rng([SEED, number])
        name = list(CLEAN)[number % len(CLEAN)]
        change = list(CHANGES)[number // len(CLEAN) % len(CHANGES)]
        data = CHANGES[change](CLEAN[name], rng)
        (tmp_path / name).write_bytes(data)
        said = verdict(yard.outcome(tmp_path), clean, name, data)
        if said:
            wrong.append(f"mutant {number} ({change} in {name}): {said}")
        (tmp_path / name).write_bytes(CLEAN[name])
    assert wrong == []


def test_the_oracle_sees_a_silently_different_number(tmp_path, clean):
    name = f"{yard.FOLDER}/pair.csv"
    head, *rows = CLEAN[name].decode().splitlines()
    cells = [row.split(",") for row in rows]
    rows = [f"{time},{sky},{float(ground) * 1.01:.3f}" for time, sky, ground in cells]
    data = ("\n".join([head, *rows]) + "\n").encode()
    yard.write_files(tmp_path, CLEAN | {name: data})
    assert "unaccounted" in verdict(yard.outcome(tmp_path), clean, name, data)
