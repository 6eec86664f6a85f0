"""Logs that are refused, with the sentence; the clean twin is CLEAN, read in test_loggers."""

from __future__ import annotations

import gzip
import os
import sys
import tempfile
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from invented import CLEAN, THERMAL, instrument, write

from surveykit.core import InputError
from surveykit.intake.loggers import Records, read_logger


def read(tmp_path, text, name="thermal.csv", **changed) -> Records:
    return read_logger("thermal", instrument(THERMAL, **changed),
                       [write(tmp_path, name, text)], tmp_path)


def refusal(tmp_path, text, **changed) -> str:
    with pytest.raises(InputError) as caught:
        read(tmp_path, text, **changed)
    return "\n".join(caught.value.faults)


@pytest.mark.parametrize(("text", "changed", "sentence"), [
    ("", {}, "thermal.csv: the file is empty"),
    ("time,target,body\n", {}, "logger 'thermal' has no records"),
    (CLEAN, {"layout": {"skip_lines": 9}}, "ends at line 4, before its header; got skip_lines 9"),
    (CLEAN.replace("target", "ziel"), {},
     "line 1: no column 'target' (columns.target); the header with delimiter ',' has 'time', "
     "'ziel', 'body'"),
    (CLEAN.replace("time,", "Zeit,"), {}, "no column 'time' (time.column)"),
    (CLEAN, {"layout": {"delimiter": ";"}}, "has 'time,target,body'"),
    (CLEAN.replace("body", "target"), {}, "2 columns are named 'target'"),
    (CLEAN.replace(",body", ""), {"columns": {"target": THERMAL["columns"]["target"]}},
     "line 2: no line of the file can be read, this first one has 3 fields where the header has "
     "2"),
    (CLEAN.replace("2025-07-24T", "24.07.2025 "), {},
     "line 2: no time of the file can be read, the first is '24.07.2025 11:00:00'; got "
     "time.format 'iso8601'"),
    ("time,target,body\n" + "x" * 200_000 + ",40,30\n", {},  # longer than a cell may be
     "line 2: no time of the file can be read, the first is 'xxx"),
    (CLEAN.encode("utf-16"), {}, "is UTF-16; save it as UTF-8"),
    (gzip.compress(CLEAN.encode())[:-12], {}, "cannot be read"),
    (CLEAN.replace("1,40.50", "1+02:00,40.50"), {},
     "thermal.csv, line 3: the log writes the offset +0200, but the zone UTC has +0000 then"),
])
def test_a_file_that_cannot_be_read_is_refused_where_it_fails(tmp_path, text, changed, sentence):
    said = refusal(tmp_path, text, **changed)
    assert sentence in said
    assert max(map(len, said.split("\n"))) < 500


@pytest.mark.skipif(sys.platform == "win32" or os.geteuid() == 0, reason="root reads everything")
def test_a_file_without_permission_is_refused(tmp_path):
    path = write(tmp_path, "thermal.csv", CLEAN)
    path.chmod(0)
    with pytest.raises(InputError, match="cannot be read"):
        read_logger("thermal", instrument(), [path], tmp_path)


def test_faults_of_all_files_come_together(tmp_path):
    paths = [write(tmp_path, "a.csv", ""), write(tmp_path, "b.csv", "x\n"),
             write(tmp_path, "c.csv", CLEAN)]
    with pytest.raises(InputError) as caught:
        read_logger("thermal", instrument(), paths, tmp_path)
    assert [fault[:5] for fault in caught.value.faults] == ["a.csv", *["b.csv"] * 3]


ODD = ['"', ",", "\n", "\r", "\0", "\xe9", " ", "-", ".", ":", "x", '""', '",', ',"', "+02:00", "Z",
       "nan", "inf", "True", "e5", "-9999", "2025-07-24T11:00:05"]


@settings(max_examples=150, deadline=None)
@given(st.lists(st.tuples(st.integers(len("time,target,body\n"), 2 * len(CLEAN)),
                          st.sampled_from(ODD)), min_size=1, max_size=8),
       st.sampled_from(["utf-8", "latin-1"]))
def test_whatever_a_file_holds_each_line_counts_or_the_file_is_refused(changes, encoding):
    text = list(CLEAN + CLEAN)
    for place, piece in changes:
        text.insert(place, piece)
    raw = "".join(text).encode(encoding)
    lines = raw.replace(b"\r\n", b"\n").split(b"\n")[1:]
    with tempfile.TemporaryDirectory() as folder:
        try:
            records = read(Path(folder), raw)
        except InputError as error:
            told = error.faults
        else:
            told = ()
            assert len(records) + records.files[0].head_lines == sum(
                bool(line.strip()) or b"," in line for line in lines)
    assert all(fault.startswith("thermal.csv") for fault in told)


def test_a_gzip_file_with_a_broken_middle_is_refused(tmp_path):
    packed = bytearray(gzip.compress(CLEAN.encode() * 50))
    packed[30:40] = b"\xff" * 10
    assert "cannot be read" in refusal(tmp_path, bytes(packed))


@pytest.mark.skipif(sys.platform == "win32", reason="links need rights there")
def test_a_link_out_of_the_project_is_refused(tmp_path):
    (tmp_path / "root").mkdir()
    link = tmp_path / "root/thermal.csv"
    link.symlink_to(write(tmp_path, "away.csv", CLEAN))
    with pytest.raises(InputError, match="thermal.csv: is a link that leads out"):
        read_logger("thermal", instrument(), [link], tmp_path / "root")
