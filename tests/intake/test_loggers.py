"""Raw files to records: values, lines, marks; each refusal beside a file that is read."""

from __future__ import annotations

import csv
import gzip
import hashlib
from datetime import datetime

import numpy as np
import pytest
from checks import DATA
from invented import CLEAN, SHORTWAVE, THERMAL, instrument, write
from numpy.testing import assert_allclose, assert_array_equal

from surveykit.core import InputError
from surveykit.intake.loggers import NO_TIME_NS, Records, expand_files, read_logger

# 2025-07-24T11:00:00Z, by date -u -d ... +%s
START_NS = 1753354800 * 10**9


def read(tmp_path, text, entry=THERMAL, name="thermal.csv", **changed) -> Records:
    return read_logger("thermal", instrument(entry, **changed), [write(tmp_path, name, text)],
                       tmp_path)


def marked(records: Records) -> dict[str, list[int]]:
    """Return reason -> lines of the file, for the reasons that occur."""
    return {reason: sorted(records.line[rows].tolist())
            for reason, rows in records.marks.items() if rows.any()}


# ---- values

def test_a_clean_file_is_read_to_utc_and_si_by_hand(tmp_path):
    records = read(tmp_path, CLEAN)
    assert_array_equal(records.time_ns, START_NS + np.arange(3) * 10**9)
    assert_allclose(records.channels["target"], [313.40, 313.65, 313.90], rtol=1e-12)
    assert_array_equal(records.line, [2, 3, 4])
    assert records.resolution == {"target": 0.01, "body": 0.1}
    assert records.interval_s == 1.0
    assert marked(records) == {}
    assert records.files[0].sha256 == hashlib.sha256(CLEAN.encode()).hexdigest()
    assert (records.files[0].path, records.files[0].size, records.files[0].records) == (
        "thermal.csv", len(CLEAN), 3)


def test_gain_and_offset_worked_by_hand(tmp_path):
    entry = {**SHORTWAVE, "columns": {"sky": {
        "quantity": "shortwave_down", "unit": "mV", "gain": 10.4, "offset": -2.0,
        "u_gain": 0.015}}}
    records = read(tmp_path, "time,sky\n2025-07-24T11:00:00,80.5\n", entry)
    assert_allclose(records.channels["sky"], [835.2])  # -2 + 10.4 x 80.5
    assert_allclose(records.resolution["sky"], 1.04)  # 0.1 mV


def test_a_station_file_reads_as_the_csv_module_reads_it():
    # open data: SURFRAD (NOAA), Alamosa, 2016-01-01; reference: Python's csv and datetime
    folder = DATA / "valley-winter-day"
    path = folder / "valley_winter_day_1min.csv"
    with path.open(newline="") as file:
        rows = list(csv.DictReader(file))
    column = next(iter(rows[0]))
    entry = {"time": {"column": column, "format": "iso8601", "zone": "UTC"}, "time_constant_s": 1,
             "columns": {"ghi": {"quantity": "shortwave_down", "unit": "W m-2", "u_gain": 0.02},
                         "pressure": {"quantity": "air_pressure", "unit": "hPa"}}}
    records = read_logger("station", instrument(entry), [path], folder)
    times = [datetime.fromisoformat(row[column].replace("Z", "+00:00")) for row in rows]
    assert len(records) == len(rows) == 1440
    assert_array_equal(records.time_ns // 10**9, [
        int(time.timestamp()) if time.tzinfo else
        int((time - datetime(1970, 1, 1)).total_seconds()) for time in times])  # noqa: DTZ001
    assert_allclose(records.channels["ghi"], [float(row["ghi"] or "nan") for row in rows])
    assert_allclose(records.channels["pressure"],
                    [100 * float(row["pressure"] or "nan") for row in rows])
    assert records.interval_s == 60


# ---- dialects: the same records whatever way they are written

def columns_of(records: Records) -> list:
    return [records.time_ns, *records.channels.values(), *records.unreadable.values(),
            *records.marks.values()]


def same(one: Records, other: Records) -> None:
    for a, b in zip(columns_of(one), columns_of(other), strict=True):
        assert_array_equal(a, b)
    assert one.resolution == other.resolution
    assert one.interval_s == other.interval_s or np.isnan(one.interval_s)


COMMA = CLEAN.replace(",", ";").replace(".", ",")


@pytest.mark.parametrize(("text", "layout"), [
    (CLEAN.replace(",", ";"), {"delimiter": ";"}),
    (CLEAN.replace(",", "\t"), {"delimiter": "\t"}),
    (COMMA, {"delimiter": ";", "decimal": ","}),
    (CLEAN.replace("\n", "\r\n"), {}),
    (CLEAN.replace("\n", "\r"), {}),
    (CLEAN.removesuffix("\n"), {}),
    (b"\xef\xbb\xbf" + CLEAN.encode(), {}),
    ("preamble, of\nthree lines\n\n" + CLEAN, {"skip_lines": 3}),
    ('"time","target","body"\n' + CLEAN.split("\n", 1)[1], {}),
    (CLEAN.replace("2025-07-24T11:00:01", '"2025-07-24T11:00:01"'), {}),
    ("\n".join('"' + line.replace(",", '","') + '"' for line in CLEAN.split()) + "\n", {}),
    (CLEAN.replace(",", ", "), {}),
    (CLEAN.replace("T", " "), {}),
    (CLEAN.replace(":00,", ":00Z,").replace(":01,", ":01Z,").replace(":02,", ":02Z,"), {}),
    (gzip.compress(CLEAN.encode()), {}),
], ids=["semicolon", "tab", "decimal comma", "CRLF", "CR", "no last line end", "BOM", "preamble",
        "quoted header", "one quoted cell", "all quoted", "padded", "space for T", "Z", "gzip"])
def test_the_dialect_changes_nothing(tmp_path, text, layout):
    plain = read(tmp_path, CLEAN)
    same(read(tmp_path, text, name="other.csv", layout=layout), plain)


def test_windows_1252_and_odd_column_names(tmp_path):
    text = "time,Ziel [°C] ,\"body, 'inner'\",{x}\n2025-07-24T11:00:00,40.25,30.0,µ\n"
    entry = {**THERMAL, "columns": {"Ziel [°C]": THERMAL["columns"]["target"],
                                    "body, 'inner'": THERMAL["columns"]["body"]}}
    for encoding in ("windows-1252", "latin-1"):
        records = read(tmp_path, text.encode(encoding), entry, layout={"encoding": encoding})
        assert_allclose(records.channels["Ziel [°C]"], [313.4])
    with pytest.raises(InputError, match="byte 0xB0, which is not utf-8"):
        read(tmp_path, text.encode("latin-1"), entry)


def test_missing_codes_count_as_text_and_as_numbers(tmp_path):
    text = ("time,target,body\n2025-07-24T11:00:00,-9999,30\n2025-07-24T11:00:01,-9999.00,\n"
            "2025-07-24T11:00:02,NAN,-9.999e3\n2025-07-24T11:00:03,40,31\n")
    records = read(tmp_path, text)
    assert_allclose(records.channels["target"], [np.nan, np.nan, np.nan, 313.15])
    assert_allclose(records.channels["body"], [303.15, np.nan, np.nan, 304.15])
    assert not any(cells.any() for cells in records.unreadable.values())
    comma = {"delimiter": ";", "decimal": ",", "missing": ["-99,9"]}
    records = read(tmp_path, "time;target;body\n2025-07-24T11:00:00;-99,90;1,5\n", layout=comma)
    assert_allclose([records.channels["target"][0], records.channels["body"][0]],
                    [np.nan, 274.65])


def test_a_point_in_a_log_with_decimal_commas_is_no_number(tmp_path):
    # 1.234 may be meant as one thousand and more: never guessed
    comma = {"delimiter": ";", "decimal": ","}
    text = "time;target;body\n2025-07-24T11:00:00,5;40,25;1.234\n2025-07-24T11:00:01,5;x;30\n"
    records = read(tmp_path, text, layout=comma)
    assert_array_equal(records.unreadable["body"], [True, False])
    assert_array_equal(records.unreadable["target"], [False, True])
    assert_array_equal(records.time_ns, START_NS + np.array([500, 1500]) * 10**6)
    clean = read(tmp_path, text.replace("1.234", "1,234"), layout=comma, name="clean.csv")
    assert_allclose(clean.channels["body"], [274.384, 303.15])
    assert_allclose(clean.channels["target"], [313.4, np.nan])


def test_a_cell_that_is_no_number_is_unreadable_not_missing(tmp_path):
    text = CLEAN.replace("40.50", "4o.50").replace("40.75", "inf").replace("30.2", "1,000")
    records = read(tmp_path, text.replace("1,000", "nan"))
    assert_array_equal(records.unreadable["target"], [False, True, True])
    assert_array_equal(records.unreadable["body"], [False, False, True])
    assert_allclose(records.channels["target"], [313.40, np.nan, np.nan])
    clean = read(tmp_path, CLEAN, name="clean.csv")
    assert not clean.unreadable["target"].any()


def test_numbers_beside_an_unreadable_cell_are_the_same_bit_for_bit(tmp_path):
    rng = np.random.default_rng(3)
    rows = [f"2025-07-24T11:00:{i:02d},{v!r},{v / 3!r}" for i, v in
            enumerate(rng.normal(40, 5, 59).tolist())]
    clean = read(tmp_path, "time,target,body\n" + "\n".join(rows) + "\n")
    spoilt = read(tmp_path, "time,target,body\n" + "\n".join(rows)
                  + "\n2025-07-24T11:00:59,x,1\n", name="spoilt.csv")
    assert_array_equal(spoilt.channels["target"][:59], clean.channels["target"])


# ---- every line is accounted for

def test_lines_of_another_shape_are_kept_and_marked(tmp_path):
    lines = ["time,target,body", "2025-07-24T11:00:00,40.1,30", "2025-07-24T11:00:01,40.2",
             "", "2025-07-24T11:00:02,40.3,30,9", "   ", '2025-07-24T11:00:03,"40.4,30',
             "2025-07-24T11:00:04,40.5,30\0", "24.7.25 11:00,40.6,30",
             "2025-07-24T11:00:06,40.7,30", "2025-07-24T11:0"]
    records = read(tmp_path, "\n".join(lines))
    assert len(records) == records.files[0].records == 8  # eleven lines: header, two blank
    assert marked(records) == {"unreadable line": [3, 5, 7, 8, 11], "unreadable time": [9]}
    timed = records.time_ns != NO_TIME_NS
    assert_array_equal(records.line[timed], [2, 10])
    assert_array_equal(records.line[~timed], [3, 5, 7, 8, 9, 11])
    assert records.n_timed == 2
    assert_allclose(records.channels["target"][:2], [313.25, 313.85])


def test_a_line_in_another_encoding_is_marked(tmp_path):
    text = CLEAN.encode() + b"2025-07-24T11:00:03,40.9,3\xb01\n"
    assert marked(read(tmp_path, text)) == {"unreadable line": [5]}


def test_repeated_and_conflicting_records(tmp_path):
    text = ("time,target,body\n"
            "2025-07-24T11:00:00,40.1,30\n2025-07-24T11:00:00,40.10,30\n"  # the same record
            "2025-07-24T11:00:01,40.2,\n2025-07-24T11:00:01,40.2,-9999\n"  # both without body
            "2025-07-24T11:00:02,40.3,30\n2025-07-24T11:00:02,40.4,30\n"
            "2025-07-24T11:00:02,40.3,30\n"
            "2025-07-24T11:00:03,40.5,30\n2025-07-24T11:00:03,x,30\n")
    assert marked(read(tmp_path, text)) == {
        "repeated record": [3, 5], "conflicting records": [6, 7, 8, 9, 10]}
    assert marked(read(tmp_path, CLEAN, name="clean.csv")) == {}


@pytest.mark.parametrize(("times", "order", "marks"), [
    # one line out of place, later or earlier than both neighbours: the others are in order
    ("00 05 01 x 04 05 06", [2, 4, 6, 3, 7, 8, 5], {"time stepped back": [3],
                                                    "unreadable time": [5]}),
    ("00 01 02 00 x 03 04", [2, 5, 3, 4, 7, 8, 6], {"time stepped back": [5],
                                                    "unreadable time": [6]}),
    # the clock was set back: what comes before the latest time so far is earlier than it
    ("00 04 05 01 02 06 07", [2, 5, 6, 3, 4, 7, 8], {"time stepped back": [5, 6]})])
def test_a_time_that_steps_back_is_marked_and_sorted(tmp_path, times, order, marks):
    text = "time,target,body\n" + "".join(
        f"2025-07-24T11:00:{time},{40 + i},30\n" for i, time in enumerate(times.split()))
    records = read(tmp_path, text)
    assert marked(records) == marks
    assert_array_equal(records.line, order)


# ---- several files

def test_several_files_in_any_order(tmp_path):
    first = write(tmp_path, "a.csv", CLEAN)
    second = write(tmp_path, "b.csv", CLEAN.replace("T11:", "T10:"))
    one = read_logger("thermal", instrument(), [first, second], tmp_path)
    other = read_logger("thermal", instrument(), [second, first], tmp_path)
    same(one, other)
    assert [file.path for file in one.files] == ["a.csv", "b.csv"]
    assert_array_equal(one.file, [1, 1, 1, 0, 0, 0])
    assert (np.diff(one.time_ns) > 0).all()


def test_patterns_find_each_file_once_sorted(tmp_path):
    for name in ("t2.csv", "t1.csv", "other.txt"):
        write(tmp_path, name, CLEAN)
    assert [path.name for path in expand_files(tmp_path, ("t*.csv", "t1.csv"))] == [
        "t1.csv", "t2.csv"]
    write(tmp_path, "a[1].csv", CLEAN)
    assert [path.name for path in expand_files(tmp_path, ("a[1].csv",))] == ["a[1].csv"]
    (tmp_path / "a[1].csv").unlink()
    with pytest.raises(InputError, match=r"no file matches 'x\*'; it holds other.txt, t1.csv"):
        expand_files(tmp_path, ("x*",))
    with pytest.raises(InputError, match="the folder does not exist"):
        expand_files(tmp_path / "none", ("x*",))


@pytest.mark.parametrize("pattern", [".", "..", "*/", "[", "**", "x" * 300, "a\0b"])
def test_a_pattern_that_can_match_no_file_is_told_as_such(tmp_path, pattern):
    write(tmp_path, "t.csv", CLEAN)
    with pytest.raises(InputError, match="no file matches"):
        expand_files(tmp_path, (pattern,))
    with pytest.raises(InputError, match="the folder does not exist"):
        expand_files(tmp_path / ("x" * 300), ("*.csv",))
