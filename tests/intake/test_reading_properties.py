"""What must not change the records: order and number of files, unit, dialect, block size."""

from __future__ import annotations

import tempfile
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from invented import THERMAL, instrument, write
from numpy.testing import assert_allclose, assert_array_equal

from surveykit.intake import dialect
from surveykit.intake.loggers import Records, read_logger

HEADER = "time,target,body\n"
ROW = st.tuples(st.integers(0, 40), st.integers(-2000, 8000), st.sampled_from(
    ["30.00", "30.50", "", "NAN", "-9999", "bad", "1,2"]))


def lines_of(rows) -> list[str]:
    return [f"2025-07-24T11:00:{second:02d},{value / 100:.2f},{body}\n"
            for second, value, body in rows]


def read(folder: Path, texts: list[str], entry=THERMAL, **changed) -> Records:
    paths = [write(folder, f"part{i:03d}.csv", HEADER + text) for i, text in enumerate(texts)]
    return read_logger("thermal", instrument(entry, **changed), paths, folder)


def same(one: Records, other: Records) -> None:
    assert_array_equal(one.time_ns, other.time_ns)
    for held, also in ((one.channels, other.channels), (one.unreadable, other.unreadable),
                       (one.marks, other.marks)):
        for name in held:
            if name != "time stepped back":  # is told within a file
                assert_array_equal(held[name], also[name], err_msg=name)


@settings(max_examples=25, deadline=None)
@given(st.lists(ROW, min_size=2, max_size=30), st.integers(1, 29))
def test_cutting_a_file_in_two_changes_nothing(rows, cut):
    lines = lines_of(sorted(rows, key=lambda row: row[0]))
    cut = min(cut, len(lines) - 1)
    good = "2025-07-24T10:00:00,40.00,30.00\n", "2025-07-24T12:00:00,40.00,30.00\n"
    with tempfile.TemporaryDirectory() as folder:
        whole = read(Path(folder), [good[0] + "".join(lines) + good[1]])
        parts = read(Path(folder), [good[0] + "".join(lines[:cut]),
                                    "".join(lines[cut:]) + good[1]])
    same(whole, parts)
    assert len(parts) == len(lines) + 2


@pytest.mark.parametrize("size", [40, 64, 1000])
def test_the_size_of_a_block_changes_nothing(tmp_path, monkeypatch, size):
    rng = np.random.default_rng(5)
    rows = [(i % 60, int(v), ["30.00", "", "bad", "1,2", '"31.5"'][i % 5])
            for i, v in enumerate(rng.integers(0, 8000, 400))]
    text = "".join(lines_of(rows)) + "\n\n2025-07-24T11:00"
    whole = read(tmp_path, [text])
    monkeypatch.setattr(dialect, "BLOCK_BYTES", size)
    blocks = read(tmp_path, [text])
    same(whole, blocks)
    assert_array_equal(whole.line, blocks.line)


@settings(max_examples=25, deadline=None)
@given(st.lists(st.integers(-4000, 9000), min_size=1, max_size=20))
def test_kelvin_and_celsius_logs_agree(hundredths):
    def entry(unit):
        columns = {**THERMAL["columns"],
                   "target": {**THERMAL["columns"]["target"], "unit": unit}}
        return {**THERMAL, "columns": columns}

    celsius = [f"2025-07-24T11:00:{i:02d},{v / 100:.2f},30\n" for i, v in enumerate(hundredths)]
    kelvin = [f"2025-07-24T11:00:{i:02d},{v / 100 + 273.15:.2f},30\n"
              for i, v in enumerate(hundredths)]
    with tempfile.TemporaryDirectory() as folder:
        one = read(Path(folder), ["".join(celsius)], entry("degC"))
        other = read(Path(folder), ["".join(kelvin)], entry("K"))
    assert_allclose(one.channels["target"], other.channels["target"], rtol=0, atol=1e-9)
    assert one.resolution == other.resolution


@settings(max_examples=25, deadline=None)
@given(st.lists(ROW, min_size=1, max_size=20), st.sampled_from([";", "\t", "|"]),
       st.sampled_from([".", ","]), st.sampled_from(["\n", "\r\n"]))
def test_delimiter_and_decimal_mark_change_nothing(rows, delimiter, decimal, end):
    rows = [(i, value, body.replace("1,2", "x")) for i, (_, value, body) in enumerate(rows)]
    plain = "".join(lines_of(rows))
    other = (HEADER + plain).replace(",", delimiter).replace(".", decimal).replace("\n", end)
    with tempfile.TemporaryDirectory() as folder:
        one = read(Path(folder), [plain])
        path = write(Path(folder), "other.csv", other)
        layout = {"delimiter": delimiter, "decimal": decimal}
        two = read_logger("thermal", instrument(layout=layout), [path], Path(folder))
    same(one, two)
