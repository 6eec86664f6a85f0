"""Logs that are refused, with the sentence; the clean twin is CLEAN, read in test_loggers."""

from __future__ import annotations

import gzip
import os
import sys

import numpy as np
import pytest
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
    (CLEAN.encode("utf-16"), {}, "is UTF-16; save it as UTF-8"),
    (gzip.compress(CLEAN.encode())[:-12], {}, "cannot be read"),
    (CLEAN.replace("1,40.50", "1+02:00,40.50"), {},
     "thermal.csv, line 3: the log writes the offset +0200, but the zone UTC has +0000 then"),
])
def test_a_file_that_cannot_be_read_is_refused_where_it_fails(tmp_path, text, changed, sentence):
    assert sentence in refusal(tmp_path, text, **changed)


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


def test_bytes_of_any_kind_never_end_in_a_traceback(tmp_path):
    rng, told = np.random.default_rng(11), []
    for trial in range(60):
        raw = bytearray(CLEAN.encode() * 3)
        for at in rng.integers(0, len(raw), 1 + trial % 6):
            raw[at] = rng.integers(0, 256)
        try:
            records = read(tmp_path, bytes(raw), name=f"{trial}.csv")
        except InputError as error:
            told.append(f"{trial}.csv" in error.faults[0])
            continue
        body = bytes(raw).replace(b"\r\n", b"\n").split(b"\n")[1:]
        assert len(records) == sum(bool(line.strip()) for line in body)
    assert all(told)
    assert 0 < len(told) < 60


@pytest.mark.skipif(sys.platform == "win32", reason="links need rights there")
def test_a_link_out_of_the_project_is_refused(tmp_path):
    (tmp_path / "root").mkdir()
    link = tmp_path / "root/thermal.csv"
    link.symlink_to(write(tmp_path, "away.csv", CLEAN))
    with pytest.raises(InputError, match="thermal.csv: is a link that leads out"):
        read_logger("thermal", instrument(), [link], tmp_path / "root")
