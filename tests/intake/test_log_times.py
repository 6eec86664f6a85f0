"""Times in logs: formats against datetime.strptime, zones against zoneinfo's published rules."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from invented import THERMAL, instrument, write
from numpy.testing import assert_array_equal

from surveykit.core import InputError
from surveykit.intake.loggers import read_logger
from surveykit.intake.times import NO_OFFSET, NO_TIME_NS, read_times

EPOCH = datetime(1970, 1, 1, tzinfo=UTC)


def ns(moment: datetime) -> int:
    return (moment - EPOCH) // timedelta(microseconds=1) * 1000


def read(tmp_path, times, zone="UTC", form="iso8601"):
    rows = "".join(f'"{time}",40.0,30.0\n' for time in times)
    path = write(tmp_path, "log.csv", "time,target,body\n" + rows)
    entry = {**THERMAL, "time": {"column": "time", "format": form, "zone": zone}}
    return read_logger("thermal", instrument(entry), [path], tmp_path)


FORMATS = ["%d.%m.%Y %H:%M:%S", "%m/%d/%Y %H:%M:%S.%f", "%Y%m%d%H%M%S", "%Y-%m-%d %H:%M:%S,%f",
           "%d-%b-%Y %H:%M:%S", "%d/%m/%y %I:%M:%S %p", "%H:%M:%S %d.%m.%Y"]


@settings(max_examples=30, deadline=None)
@given(st.lists(st.datetimes(datetime(1970, 1, 2), datetime(2199, 1, 1)),  # noqa: DTZ001
                min_size=1, max_size=20), st.sampled_from(FORMATS))
def test_formats_agree_with_strptime(moments, form):
    texts = [moment.strftime(form) for moment in moments]
    expected = [ns(datetime.strptime(text, form).replace(tzinfo=UTC)) for text in texts]
    wall, offsets = read_times(pd.Series(texts, dtype=object), form)
    assert_array_equal(wall, expected)
    assert (offsets == NO_OFFSET).all()


def test_impossible_dates_are_no_times():
    texts = ["29.02.2024 10:00:00", "29.02.2025 10:00:00", "31.04.2025 10:00:00",
             "24.13.2025 10:00:00", "24.07.2025 24:00:00", "24.07.2025 10:60:00",
             "00.07.2025 10:00:00", "24-07-2025 10:00:00", "", "2x.07.2025 10:00:00",
             "24.07.2025 10:00:0", "24.07.2025 10:00:000", "24.07.2025 1é:00:00", np.nan]
    wall, _ = read_times(pd.Series(texts, dtype=object), "%d.%m.%Y %H:%M:%S")
    good = [0, 10]  # strptime takes seconds of one digit
    assert_array_equal(np.flatnonzero(wall != NO_TIME_NS), good)
    assert wall[0] == ns(datetime(2024, 2, 29, 10, tzinfo=UTC))


def test_times_without_leading_zeros_are_read():
    wall, _ = read_times(pd.Series(["4.7.2025 9:05:00", "14.07.2025 19:05:00"], dtype=object),
                         "%d.%m.%Y %H:%M:%S")
    assert_array_equal(wall, [ns(datetime(2025, 7, 4, 9, 5, tzinfo=UTC)),
                              ns(datetime(2025, 7, 14, 19, 5, tzinfo=UTC))])


def test_iso_with_a_comma_fraction(tmp_path):
    records = read(tmp_path, ["2025-07-24 11:00:00,500", "2025-07-24 11:00:01,000"])
    assert_array_equal(records.time_ns % 10**10, [500_000_000, 1_000_000_000])


def test_format_with_offsets_agrees_with_strptime(tmp_path):
    form = "%d.%m.%Y %H:%M:%S %z"
    texts = ["24.07.2025 12:00:00 +0100", "24.12.2025 12:00:00 +0000"]
    records = read(tmp_path, texts, "Europe/Lisbon", form)
    assert_array_equal(records.time_ns, [
        ns(datetime.strptime(text, form)) for text in texts])  # noqa: DTZ007 - form has %z


def test_a_line_without_a_time_beside_times_with_offsets(tmp_path):
    form = "%d.%m.%Y %H:%M:%S %z"
    records = read(tmp_path, ["24.07.2025 12:00:00 +0100", "", "x", "24.07.2025 12:00:01 +0100"],
                   "Europe/Lisbon", form)
    first = ns(datetime(2025, 7, 24, 11, tzinfo=UTC))
    assert_array_equal(records.time_ns, [first, first + 10**9, NO_TIME_NS, NO_TIME_NS])
    assert_array_equal(records.line[records.marks["unreadable time"]], [3, 4])


# ---- zones. European Union: clocks go forward at 01:00 UTC on the last Sunday of March, back at
# 01:00 UTC on the last Sunday of October (Directive 2000/84/EC, from memory).

def test_local_time_becomes_utc(tmp_path):
    records = read(tmp_path, ["2025-07-24T12:00:00", "2025-12-24T12:00:00"], "Europe/Lisbon")
    assert_array_equal(records.time_ns, [ns(datetime(2025, 7, 24, 11, tzinfo=UTC)),
                                         ns(datetime(2025, 12, 24, 12, tzinfo=UTC))])


@pytest.mark.parametrize(("time", "what"), [
    ("2025-03-30T02:30:00", "does not exist (clocks go forward)"),
    ("2025-10-26T02:30:00", "occurs twice (clocks go back)")])
def test_gap_and_fold_are_refused_at_their_first_line(tmp_path, time, what):
    near = ["2025-03-30T01:59:59", "2025-10-26T03:00:00"]
    with pytest.raises(InputError) as caught:
        read(tmp_path, [*near, time, time], "Europe/Berlin")
    assert f"log.csv, line 4: the time {time.replace('T', ' ')} {what} in Europe/Berlin" \
        in caught.value.faults[0]
    assert len(read(tmp_path, near, "Europe/Berlin")) == 2


def test_an_offset_tells_the_two_hours_of_a_fold_apart(tmp_path):
    records = read(tmp_path, ["2025-10-26T02:30:00+02:00", "2025-10-26T02:30:00+01:00"],
                   "Europe/Berlin")
    assert_array_equal(np.diff(records.time_ns), [3600 * 10**9])
    assert not records.marks["conflicting records"].any()


def test_an_offset_must_be_the_zones(tmp_path):
    assert read(tmp_path, ["2025-07-24T12:00:00+01:00"], "Europe/Lisbon").time_ns[0] \
        == ns(datetime(2025, 7, 24, 11, tzinfo=UTC))
    with pytest.raises(InputError, match=r"offset \+0200, but the zone Europe/Lisbon has \+0100"):
        read(tmp_path, ["2025-07-24T12:00:00+02:00"], "Europe/Lisbon")


def test_some_lines_with_an_offset_some_without(tmp_path):
    records = read(tmp_path, ["2025-07-24T12:00:00", "2025-07-24T12:00:01+01:00", "noon"],
                   "Europe/Lisbon")
    assert_array_equal(np.diff(records.time_ns[:2]), [10**9])
    assert records.marks["unreadable time"].sum() == 1


@pytest.mark.parametrize(("form", "good", "far"), [
    ("iso8601", "2025-07-24T12:00:00", "0001-01-01T00:00:00"),
    ("iso8601", "2025-07-24T12:00:00", "2925-07-24T12:00:00"),
    ("iso8601", "2025-07-24T12:00:00+01:00", "2925-07-24T12:00:00"),
    ("%d.%m.%Y %H:%M", "24.07.2025 12:00", "24.07.2925 12:00"),
    ("%d/%m/%Y %H:%M:%S", "24/07/2025 12:00:00", "24/07/0925 12:00:00"),
    ("%d-%b-%Y %H:%M:%S", "24-Jul-2025 12:00:00", "24-Jul-2925 12:00:00")])
def test_a_year_that_cannot_be_meant_is_no_time(tmp_path, form, good, far):
    records = read(tmp_path, [good, far], "Europe/Lisbon", form)
    assert_array_equal(records.time_ns, [ns(datetime(2025, 7, 24, 11, tzinfo=UTC)), NO_TIME_NS])
