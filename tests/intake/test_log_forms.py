"""Restarts, lines of units, and times in every form: each beside the same records written plainly.

Expected times: Python's datetime, or counted by hand; forms of loggers: common practice, no source.
"""

from __future__ import annotations

import gzip
from datetime import UTC, datetime, timedelta

import numpy as np
import pytest
from invented import CLEAN, THERMAL, instrument, write
from numpy.testing import assert_array_equal

from surveykit.core import InputError
from surveykit.intake import dialect
from surveykit.intake.loggers import NO_TIME_NS, Records, read_logger

START = datetime(2025, 7, 24, 11, 0, 0, tzinfo=UTC)


def read(tmp_path, text, time=None, **changed) -> Records:
    entry = {**THERMAL, "time": {**THERMAL["time"], **(time or {})}}
    return read_logger("thermal", instrument(entry, **changed),
                       [write(tmp_path, "log.csv", text)], tmp_path)


def ns(moment: datetime) -> int:
    step = moment - datetime(1970, 1, 1, tzinfo=UTC)
    return ((step.days * 86400 + step.seconds) * 10**6 + step.microseconds) * 1000


def refusal(tmp_path, text, time=None, **changed) -> str:
    with pytest.raises(InputError) as caught:
        read(tmp_path, text, time, **changed)
    return "\n".join(caught.value.faults)


# ---- the head of the file again

HEADER, *ROWS = CLEAN.splitlines()


@pytest.mark.parametrize(("lines", "layout", "again"), [
    ([HEADER, ROWS[0], HEADER, *ROWS[1:]], {}, 1),
    ([HEADER, HEADER, *ROWS, HEADER], {}, 2),
    ([HEADER, ROWS[0], "\ufeff" + HEADER + " ", *ROWS[1:]], {}, 1),
    ([HEADER, "s,degC,degC", *ROWS], {"unit_lines": 1}, 0),
    ([HEADER, "s,degC,degC", ROWS[0], HEADER, "s,degC,degC", *ROWS[1:]], {"unit_lines": 1}, 2),
    (["logger 7, started", HEADER, "s,degC,degC", "", ROWS[0], "logger 7, started", HEADER,
      "s,degC,degC", *ROWS[1:]], {"skip_lines": 1, "unit_lines": 2}, 3),
])
@pytest.mark.parametrize("block", [30, 1 << 21])
def test_a_restarted_logger_writes_its_head_again(
        tmp_path, monkeypatch, lines, layout, again, block):
    monkeypatch.setattr(dialect, "BLOCK_BYTES", block)
    records = read(tmp_path, "\n".join(lines) + "\n", layout=layout)
    plain = read(tmp_path, CLEAN)
    assert_array_equal(records.time_ns, plain.time_ns)
    for column, values in plain.channels.items():
        assert_array_equal(records.channels[column], values)
    assert not any(marked.any() for marked in records.marks.values())
    assert records.files[0].head_lines == again
    # each record keeps the line it stands in
    assert [lines[line - 1] for line in records.line] == ROWS


def test_a_line_of_units_that_is_not_declared_is_counted(tmp_path):
    records = read(tmp_path, f"{HEADER}\ns,degC,degC\n" + "\n".join(ROWS))
    assert records.marks["unreadable time"].sum() == 1
    assert records.line[records.marks["unreadable time"]].tolist() == [2]


def test_a_changed_header_after_a_restart_is_no_head(tmp_path):
    records = read(tmp_path, "\n".join([HEADER, *ROWS, "time,target,case"]))
    assert records.files[0].head_lines == 0
    assert records.marks["unreadable time"].sum() == 1


def test_a_file_that_ends_before_its_records_is_refused(tmp_path):
    assert "line 1, before its records; got unit_lines 2" in refusal(
        tmp_path, HEADER + "\n", layout={"unit_lines": 2})


# ---- times in several columns

TIMES = [START, START + timedelta(milliseconds=250), START + timedelta(seconds=1)]


@pytest.mark.parametrize(("form", "day", "clock", "layout"), [
    ("iso8601", "%Y-%m-%d", "%H:%M:%S.%f", {}),
    ("%d/%m/%Y %H:%M:%S.%f", "%d/%m/%Y", "%H:%M:%S.%f", {}),
    ("%d.%m.%Y %H:%M:%S,%f", "%d.%m.%Y", "%H:%M:%S,%f", {"delimiter": ";"}),
    ("iso8601", "%Y-%m-%d", "%H:%M:%S,%f", {"delimiter": ";", "decimal": ","}),
    ("%y%j %H:%M:%S.%f", "%y%j", "%H:%M:%S.%f", {}),
])
def test_date_and_time_in_columns_of_their_own(tmp_path, form, day, clock, layout):
    mark = layout.get("delimiter", ",")
    lines = [mark.join(["target", "clock", "body", "day"])]
    lines += [mark.join(["40", t.strftime(clock), "30", t.strftime(day)]) for t in TIMES]
    lines += [mark.join(["40", "", "30", TIMES[0].strftime(day)]), mark.join(["40", "x", "30", ""])]
    records = read(tmp_path, "\n".join(lines), {"column": ["day", "clock"], "format": form},
                   layout=layout)
    assert_array_equal(records.time_ns[:3], [ns(t) for t in TIMES])
    assert records.marks["unreadable time"].tolist() == [False] * 3 + [True] * 2


def test_a_missing_column_of_the_time_is_named(tmp_path):
    said = refusal(tmp_path, CLEAN, {"column": ["day", "time"], "format": "iso8601"})
    assert "log.csv, line 1: no column 'day' (time.column)" in said


@pytest.mark.parametrize("fraction", [",25", ".25"])
def test_a_fraction_after_a_comma_is_read_wherever_it_stands_first(tmp_path, fraction):
    text = f"time;target;body\n2025-07-24T11:00:00;1;2\n2025-07-24T11:00:00{fraction};3;4\n"
    records = read(tmp_path, text, layout={"delimiter": ";"})
    assert_array_equal(records.time_ns, [ns(TIMES[0]), ns(TIMES[1])])


# ---- times that are counted

@pytest.mark.parametrize(("cell", "moment"), [
    ("1753354800", START), ("1753354800.25", START + timedelta(milliseconds=250)),
    ("1753354800.000001", START + timedelta(microseconds=1)), ("1.7533548e9", START),
    ("-86400", datetime(1969, 12, 31, tzinfo=UTC)), ("0", datetime(1970, 1, 1, tzinfo=UTC)),
    ("1753354800000", None), ("1e999", None), ("", None), ("x", None), ("NAN", None)])
def test_seconds_since_1970(tmp_path, cell, moment):
    # 1753354800: date -u -d 2025-07-24T11:00:00 +%s
    text = f"time,target,body\n{cell},40,30\n1753354802,40,30\n"
    records = read(tmp_path, text, {"format": "epoch_s"})
    place = int(np.flatnonzero(records.line == 2)[0])
    assert records.time_ns[place] == (NO_TIME_NS if moment is None else ns(moment))
    assert records.marks["unreadable time"][place] == (moment is None)


def test_seconds_since_1970_with_a_decimal_comma(tmp_path):
    text = "time;target;body\n1753354800,25;40,5;30\n"
    records = read(tmp_path, text, {"format": "epoch_s"},
                   layout={"delimiter": ";", "decimal": ","})
    assert records.time_ns[0] == ns(TIMES[1])


# 24 July is day 205 of 2025: 31+28+31+30+31+30+24
@pytest.mark.parametrize(("columns", "cells", "expected"), [
    (["y", "d", "c"], "2025,205,1100", START),
    (["y", "d", "c"], "2025,204,2400", datetime(2025, 7, 24, tzinfo=UTC)),
    (["y", "d", "c"], "2025,1,5", datetime(2025, 1, 1, 0, 5, tzinfo=UTC)),
    (["y", "d", "c"], "2024,366,2359", datetime(2024, 12, 31, 23, 59, tzinfo=UTC)),
    (["y", "d", "c", "s"], "2025,205,1100,0.25", TIMES[1]),
    (["d", "c"], "2025,205,1100", START),
    (["d"], "2025,205.5,", datetime(2025, 7, 24, 12, tzinfo=UTC)),
    (["y", "d", "c"], "2025,366,0", None), (["y", "d", "c"], "2025,0,0", None),
    (["y", "d", "c"], "2025,205,1160", None), (["y", "d", "c"], "2025,205,2401", None),
    (["y", "d", "c"], "2025,205.5,0", None), (["y", "d", "c"], "2025.5,205,0", None),
    (["y", "d", "c", "s"], "2025,205,1100,60", None),
    (["y", "d", "c", "s"], "2025,205,2400,1", None),
    (["y", "d", "c"], "25,205,1100", None), (["y", "d", "c"], "2025,,1100", None)])
def test_day_of_the_year(tmp_path, columns, cells, expected):
    year = {"year": 2025} if len(columns) < 3 else {}
    good = "2025,200,1200"
    names = ["y", "d", "c", "s"]
    text = ",".join([*names, "target", "body"]) + "\n" + "".join(
        ",".join([*(row.split(",") + ["0"])[:4], "40", "30"]) + "\n" for row in (cells, good))
    records = read(tmp_path, text, {"column": columns, "format": "day_of_year", **year})
    place = int(np.flatnonzero(records.line == 2)[0])
    assert records.time_ns[place] == (NO_TIME_NS if expected is None else ns(expected))


# ---- zones: Lisbon 2025, clocks forward 30 March 01:00, back 26 October 02:00 (tz database)

def at(*times: str) -> str:
    return "time,target,body\n" + "".join(f"{time},40,30\n" for time in times)


LISBON = {"zone": "Europe/Lisbon"}


def test_the_lost_hour_is_refused_unless_an_offset_is_given(tmp_path):
    said = refusal(tmp_path, at("2025-03-30T00:59:59", "2025-03-30T01:30:00"), LISBON)
    assert "log.csv, line 3: the time 2025-03-30 01:30:00 does not exist" in said
    assert "Etc/GMT-1" in said
    fixed = read(tmp_path, at("2025-03-30T01:30:00"), {"zone": "Etc/GMT-1"})
    assert fixed.time_ns[0] == ns(datetime(2025, 3, 30, 0, 30, tzinfo=UTC))


def test_the_repeated_hour_is_refused_unless_an_offset_is_given(tmp_path):
    said = refusal(tmp_path, at("2025-10-26T00:30:00", "2025-10-26T01:30:00"), LISBON)
    assert "log.csv, line 3: the time 2025-10-26 01:30:00 occurs twice" in said
    both = read(tmp_path, at("2025-10-26T01:30:00+01:00", "2025-10-26T01:30:00+00:00",
                             "2025-10-26T02:30:00"), LISBON)
    assert_array_equal(both.time_ns, [ns(datetime(2025, 10, 26, h, 30, tzinfo=UTC))
                                      for h in (0, 1, 2)])


def test_an_offset_the_zone_does_not_have_is_refused(tmp_path):
    said = refusal(tmp_path, at("2025-07-24T11:00:00+01:00", "2025-07-24T11:00:01+02:00"), LISBON)
    assert "log.csv, line 3: the log writes the offset +0200" in said


def test_packed_and_plain_files_in_any_order_are_one_log(tmp_path):
    one = write(tmp_path, "b.csv", CLEAN)
    two = write(tmp_path, "a.csv.gz", gzip.compress(CLEAN.replace("T11", "T10").encode()))
    first, second = (read_logger("thermal", instrument(), paths, tmp_path)
                     for paths in ([one, two], [two, one]))
    assert_array_equal(first.time_ns, second.time_ns)
    assert first.time_ns[0] == ns(START) - 3600 * 10**9
    assert len(first) == 6
