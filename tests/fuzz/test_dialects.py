"""The same campaign in whatever dialect gives the same tables, to 1e-9, up to the surfaces."""

from __future__ import annotations

import tempfile
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import yard
from dialects import FORMS, Dialect, files
from hypothesis import example, given, seed, settings
from hypothesis import strategies as st

from surveykit.core import InputError
from surveykit.intake import dialect as reading

SIX = {
    "comma, ISO, UTC": Dialect(),
    "semicolon, decimal comma, day first, local time": Dialect(
        delimiter=";", decimal=",", form="day first", zone="Europe/Lisbon", preamble=2,
        encoding="windows-1252", end="\r\n", sheet="semicolon"),
    "tab, ISO with offset, packed, several files": Dialect(
        delimiter="\t", form="iso with offset", zone="Asia/Kathmandu", parts=3, reverse=True,
        packed=True, sheet="workbook"),
    "date and time apart, line of units, restarts": Dialect(
        delimiter=";", decimal=",", form="two columns", zone="America/Lima", unit_line=True,
        restarts=2, sheet="tab"),
    "seconds since 1970, kelvin": Dialect(form="epoch_s", kelvin=True, sheet="full times"),
    "day of the year, hhmm and seconds": Dialect(
        delimiter="|", form="day_of_year", zone="Pacific/Auckland", preamble=1, unit_line=True,
        restarts=1, parts=2),
}


def came_to(d: Dialect) -> yard.Outcome:
    with tempfile.TemporaryDirectory() as folder:
        yard.write_files(Path(folder), files(d))
        found = yard.outcome(Path(folder))
    assert not isinstance(found, InputError), found
    return found


@pytest.fixture(scope="module")
def plain() -> yard.Outcome:
    return came_to(Dialect())


def without_files(ledger: pd.DataFrame) -> pd.DataFrame:
    keys = [name for name in ledger.columns if name not in ("file", "records")]
    return ledger.groupby(keys, as_index=False)["records"].sum()


def same_tables(one: yard.Outcome, other: yard.Outcome) -> None:
    assert one.tables.keys() == other.tables.keys()
    for name in one.tables:
        a, b = one.tables[name], other.tables[name]
        if name == "ledger":
            a, b = without_files(a), without_files(b)
        pd.testing.assert_frame_equal(a, b, check_exact=False, rtol=1e-9, atol=1e-12, obj=name)
    for key, numbers in one.numbers.items():
        np.testing.assert_allclose(other.numbers[key], numbers, rtol=1e-9)


@pytest.mark.parametrize("name", SIX)
def test_six_dialects_give_the_same_tables(plain, name):
    found = came_to(SIX[name])
    same_tables(plain, found)
    assert sum(found.read.values()) == sum(plain.read.values())
    assert found.head_lines == len(yard.HEADS) * SIX[name].restarts * (
        1 + SIX[name].unit_line + SIX[name].preamble)


DIALECTS = st.builds(
    Dialect, delimiter=st.sampled_from([";", "\t", "|"]), decimal=st.sampled_from([".", ","]),
    form=st.sampled_from([form for form in FORMS if form != "month first"]),
    zone=st.sampled_from(["UTC", "Europe/Lisbon", "America/Lima", "Asia/Kathmandu"]),
    preamble=st.integers(0, 3), unit_line=st.booleans(), restarts=st.integers(0, 3),
    parts=st.integers(1, 4), reverse=st.booleans(), packed=st.booleans(),
    end=st.sampled_from(["\n", "\r\n"]), kelvin=st.booleans(),
    sheet=st.sampled_from(["plain", "semicolon", "tab", "workbook", "full times"]))


@seed(20250611)
@settings(max_examples=25, deadline=None, derandomize=False, database=None)
@given(d=DIALECTS, block=st.sampled_from([200, 1000, 1 << 21]))
@example(d=Dialect(form="month first", zone="Europe/Lisbon"), block=1 << 21)
def test_order_chunks_zone_unit_and_dialect_change_nothing(plain, d, block):
    if d.form == "epoch_s":
        d = Dialect(**{**d.__dict__, "zone": "UTC"})
    before = reading.BLOCK_BYTES
    reading.BLOCK_BYTES = block
    try:
        found = came_to(d)
    finally:
        reading.BLOCK_BYTES = before
    same_tables(plain, found)
