"""Every record of every file is used, excluded by one reason, or outside the passes: a property.

The number of records is counted from the files themselves: their lines less the header.
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from small_survey import ALBEDO, CONTACT, KIT, NDVI, STAND_OFF, lines, row, small

from surveykit.core import InputError

N = 90
SHEET = [row(**ALBEDO, stop="12:01:00"), row(**NDVI, start="12:00:10", stop="12:01:05"),
         row(**CONTACT, start="12:00:05", stop="12:00:45"),
         row(**STAND_OFF, start="12:00:46", stop="12:01:25")]
CLEAN = {name: lines(name, n=N) for name in ("pair", "thermal", "rednir-sky", "rednir-ground")}
CLEAN["weather"] = lines("weather", n=4, step_s=30)


def split(text):
    """One logger's log in two files, as a logger that begins a new one now and then."""
    return [text[: N // 3], [text[0], *text[N // 3:]]]


def blank(log, at, _):
    log[at] = ",".join([log[at].split(",")[0], *[""] * log[at].count(",")])


def garbage(log, at, _):
    log[at] = log[at].rsplit(",", 1)[0] + ",?"


def twice(log, at, _):
    log.insert(at, log[at])


def other(log, at, _):
    log.insert(at, log[at] + "7")


def move(log, at, to):
    log.insert(to, log.pop(at))


def drop(log, at, to):
    del log[min(at, to):max(at, to)]


def no_time(log, at, _):
    log[at] = "later," + log[at].partition(",")[2]


def long(log, at, _):
    log[at] += ",1"


def short(log, at, _):
    log[at] = log[at].rsplit(",", 1)[0]


def spike(log, at, _):
    log[at] = log[at].rsplit(",", 1)[0] + ",5000"


def frozen(log, at, to):
    low, high = sorted((at, to))
    rest = log[at].partition(",")[2]
    log[low:high] = [line.split(",", 1)[0] + "," + rest for line in log[low:high]]


FAULT = st.tuples(
    st.sampled_from([blank, garbage, twice, other, move, drop, no_time, long, short, spike,
                     frozen]),
    st.sampled_from([name for name in CLEAN if name != "weather"]),
    st.floats(0, 1), st.floats(0, 1))


@pytest.mark.filterwarnings("ignore:.*")  # a reader's warning is not this test's matter
@settings(max_examples=20, deadline=None, derandomize=True,
          suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(faults=st.lists(FAULT, max_size=12))
def test_all_records_are_accounted_for(tmp_path_factory, faults):
    logs = {name: list(text) for name, text in CLEAN.items()}
    for change, name, at, to in faults:
        last = len(logs[name]) - 1
        if last > 2 * N // 3:
            change(logs[name], 1 + int(at * (last - 1)), 1 + int(to * (last - 1)))
    logs["thermal"] = split(logs["thermal"])
    try:
        survey = small(tmp_path_factory.mktemp("yard"), SHEET, logs)
    except InputError:  # a file left without a readable number is the user's fault, told as such
        return
    quality = survey.quality()
    ledger = quality.ledger
    for name, text in logs.items():
        for number, file in enumerate(text if isinstance(text[0], list) else [text]):
            mine = ledger[ledger.file == f"data/{name}_{number}.csv"]
            assert mine.records.sum() == len(file) - 1
    falls_as_it_should(quality.waterfall, survey.parameters.kit)
    assert set(ledger.disposition) <= {"used", "excluded", "outside passes"}
    assert (ledger.reason[ledger.disposition == "excluded"] != "").all()
    assert (ledger.reason[ledger.disposition != "excluded"] == "").all()
    for name, chosen in quality.passes.items():
        assert chosen.n_window == chosen.index.size + sum(chosen.reasons.values()) or chosen.refusal
        for column, mask in quality.masks[chosen.logger].items():
            serves = any(column == c.column for p in survey.passes if p.name == name
                         for c in p.channels.values())
            assert not (serves and mask[chosen.index].any())  # a marked record is never used


def falls_as_it_should(waterfall, kit):
    """Raw = used + all that reasons took, per file and channel; each step leaves what it says."""
    records = waterfall.groupby(["logger", "column", "file"]).records.sum()
    for logger, instrument in kit.items():
        assert set(records[logger].index.get_level_values("column")) == set(instrument.columns)
        assert (records[logger].groupby("file").nunique() == 1).all()
    for _, fall in waterfall.groupby(["logger", "column", "file", "pass"], sort=False):
        taken = fall.records.where(fall.disposition != "used", 0)
        assert np.array_equal(fall.remaining, fall.records.sum() - taken.cumsum())
        used = fall[fall.disposition == "used"]
        assert fall.remaining.iloc[-1] == used.records.sum()
        assert len(used) <= 1


def test_the_waterfall_of_each_channel_by_hand(tmp_path):
    """Of 120 records in the pass: 1 blank sky and its ground, 1 unreadable ground and its sky.

    The edges (5 s each) take 10; the blank comes first in order, so 119 are left after it.
    """
    log = lines("pair")
    for i, column, text in ((60, 1, ""), (70, 2, "?")):
        cells = log[i].split(",")
        cells[column] = text
        log[i] = ",".join(cells)
    edges = {"passes": {"sheet_u_s": 5.0}}
    fall = small(tmp_path, [row(**ALBEDO)], {"pair": log}, settings=edges).quality().waterfall
    fall = fall[fall["pass"] == "C1-albedo-1"]
    steps = {column: list(zip(some.reason, some.records, some.remaining, strict=True))
             for column, some in fall.groupby("column")}
    assert steps["sky"] == [("no reading", 1, 119), ("no partner", 1, 118), ("pass edge", 10, 108),
                            ("", 108, 108)]
    assert steps["ground"] == [("unreadable value", 1, 119), ("no partner", 1, 118),
                               ("pass edge", 10, 108), ("", 108, 108)]


def test_a_record_of_two_passes_is_counted_once(tmp_path):
    """Stand-off and albedo walked at once, served by one logger of four heads."""
    survey = small(tmp_path, SHEET[:1], {"pair": CLEAN["pair"]})
    ledger = survey.quality().ledger
    assert ledger.records.sum() == N


def test_a_refused_pass_uses_no_record_and_says_so(tmp_path):
    """Seventy of the hundred and twenty records out of range: more than the limit of .60."""
    log = lines("pair")
    for i in range(25, 105):
        log[i] = log[i].split(",")[0] + ",2500,180"
    survey = small(tmp_path, [row(**ALBEDO)], {"pair": log})
    quality = survey.quality()
    chosen = quality.passes["C1-albedo-1"]
    assert chosen.refusal == "67 % of the records are excluded, most as: out of range"
    assert chosen.index.size == 0
    rows = quality.ledger.set_index("reason").records
    assert rows["out of range"] == 80
    assert rows["pass not evaluated"] == 40
    assert np.isfinite(chosen.zenith_deg)


def test_a_head_that_no_pass_calls_for_is_not_said_to_be_used(tmp_path):
    """An infrared thermometer was carried along and no temperature pass stands on the sheet."""
    quality = small(tmp_path, [row(**ALBEDO)],
                    {"pair": CLEAN["pair"], "thermal": CLEAN["thermal"],
                     "weather": CLEAN["weather"]}).quality()
    for table in (quality.ledger, quality.waterfall):
        found = table.groupby("logger")["disposition"].agg(set)
        assert found["thermal"] == {"outside passes"}
        assert found["weather"] == {"used"}
    assert quality.ledger.groupby("logger").records.sum()["thermal"] == N


def test_a_record_that_two_passes_left_out_counts_under_the_first_reason_in_order(tmp_path):
    """At the edge of the NDVI pass (12:01:02) the sky reading of the albedo pass is 2,500 W m-2."""
    kit = {"heads": {**KIT["rednir-sky"], "head_radius_cm": 1.2, "columns": {
        **KIT["pair"]["columns"], "red": KIT["rednir-sky"]["columns"]["red"],
        "nir": KIT["rednir-sky"]["columns"]["nir"],
        "red_g": KIT["rednir-ground"]["columns"]["red"],
        "nir_g": KIT["rednir-ground"]["columns"]["nir"]}}}
    log = lines("heads", kit=kit, red=70 + np.arange(160) % 7, nir=50 + np.arange(160) % 7,
                red_g=4 + np.arange(160) % 3, nir_g=20 + np.arange(160) % 3)
    cells = log[63].split(",")
    log[63] = ",".join([cells[0], "2500", *cells[2:]])
    sheet = [row(**ALBEDO, stop="12:01:20"), row(**NDVI, start="12:01:00", stop="12:02:10")]
    quality = small(tmp_path, sheet, {"heads": log}, kit=kit,
                    settings={"passes": {"sheet_u_s": 5.0}}).quality()
    rows = quality.ledger[quality.ledger["pass"] == "C1-albedo-1 + C1-ndvi-1"]
    assert dict(zip(rows.reason, rows.records, strict=True)) == {"": 19, "out of range": 1}
    assert quality.ledger.records.sum() == 160
