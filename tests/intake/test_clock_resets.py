"""A logger's clock set anew in the middle of its records, and single records out of place."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_array_equal
from under_sky import COVERS, log, sheet, survey

from surveykit.intake.clocks import REFUSED

GOOD = {"offset_s": 0, "u_s": 0.1}
FOUND = {"cover_events": True}


def clock(found, name):
    return next(one for one in found.clocks if one.logger == name)


SIX = (*COVERS[:1], (500.2, 511.0), (900.1, 911.4), (1300.6, 1311.2), (2000.3, 2010.9), COVERS[2])


def reset(covers, back_s=400.0, at=1100):
    """Return one file whose clock was set back in the middle."""
    first = log("pair", covers=covers, n=at)
    later = log("pair", covers=covers, n=2700 - at, first_s=at - back_s, offset_s=back_s)
    return first + later[1:]


def test_a_reset_with_covers_on_both_sides_is_two_stretches(tmp_path):
    found = survey(tmp_path, {"pair": reset(SIX)}, {"pair": {**FOUND, "search_s": 600}},
                   rows=sheet(SIX, ndvi=False))
    one = clock(found, "pair")
    assert one.status == "ok"
    assert [round(piece.line.offset_s) for piece in one.pieces] == [0, 400]
    log_ = found.records["pair"]
    assert (np.diff(log_.time_ns) > 0).all()
    assert not log_.marks["time stepped back"].any()
    assert not any(this.refusal for this in found.passes)


def test_a_reset_with_one_cover_after_it_refuses_what_came_after(tmp_path):
    found = survey(tmp_path, {"pair": reset((*SIX[:3], SIX[5]))},
                   {"pair": {**FOUND, "search_s": 600}},
                   rows=sheet((*SIX[:3], SIX[5]), ndvi=False))
    one = clock(found, "pair")
    assert one.status == "qualified"
    assert "1 of 2 stretches between resets refused: 1 of 4 covers show" in one.note
    assert [bool(piece.refusal) for piece in one.pieces] == [False, True]
    assert any(this.refusal for this in found.passes)


def test_a_declared_clock_that_steps_back_holds_for_what_came_before(tmp_path):
    found = survey(tmp_path, {"pair": reset((), back_s=50.0)}, {"pair": GOOD},
                   rows=sheet((), ndvi=False))
    one = clock(found, "pair")
    assert one.status == "qualified"
    assert "steps back to 2025-06-11 12:17:30 UTC" in one.note
    assert [bool(this.refusal) for this in found.passes] == [False, False, True, True]
    whole = survey(tmp_path / "clean", {"pair": log("pair")}, {"pair": GOOD})
    assert clock(whole, "pair").status == "ok"


def test_a_block_written_twice_is_no_reset(tmp_path):
    lines = log("pair")
    lines[901:901] = lines[800:901]
    found = survey(tmp_path, {"pair": lines}, {"pair": FOUND})
    assert (clock(found, "pair").status, len(clock(found, "pair").pieces)) == ("ok", 1)
    assert not any(this.refusal for this in found.passes)


def test_a_lunch_that_one_line_bridges_is_no_reset(tmp_path):
    lines = log("pair")
    del lines[700:1100]
    settings = {"clocks": {"jump_s": 300.0}, "passes": {"sheet_u_s": 0.0}}
    found = survey(tmp_path, {"pair": lines}, {"pair": FOUND}, settings=settings)
    assert len(clock(found, "pair").pieces) == 1
    leap = log("pair", n=700) + log("pair", n=1400, first_s=1300 + 90, offset_s=-90)[1:]
    found = survey(tmp_path / "leap", {"pair": leap}, {"pair": FOUND}, settings=settings)
    assert clock(found, "pair").status != "ok"  # one cover before the leap, two after


# ---- overlapping times: the same time of a clock that was set back is two moments

def unmarked(log_, lines):
    """Assert that no record of these lines is marked."""
    for reason, marked in log_.marks.items():
        assert not marked[np.isin(log_.line, lines)].any(), reason


def test_covers_in_overlapping_times_still_set_the_clock(tmp_path):
    four = (COVERS[0], (900.1, 911.4), (1300.6, 1311.2), COVERS[2])  # both read 900 s on it
    found = survey(tmp_path, {"pair": reset(four)}, {"pair": {**FOUND, "search_s": 600}},
                   rows=sheet(four, ndvi=False))
    one = clock(found, "pair")
    assert (one.status, [round(piece.line.offset_s) for piece in one.pieces]) == ("ok", [0, 400])
    unmarked(found.records["pair"], range(2, 2702))


@pytest.mark.parametrize("stated", [GOOD, {**FOUND, "search_s": 600}])
def test_what_came_before_a_reset_is_kept_whole(tmp_path, stated):
    covers = SIX[:3]  # none after the reset: what follows is refused either way
    found = survey(tmp_path, {"pair": reset(covers)}, {"pair": stated},
                   rows=sheet(covers, ndvi=False))
    log_ = found.records["pair"]
    unmarked(log_, range(2, 1102))
    assert_array_equal(np.sort(log_.line[log_.marks[REFUSED]]), np.arange(1102, 2702))
    assert [bool(this.refusal) for this in found.passes] == [False, False, True, True]


def test_a_refused_stretch_takes_no_pass_from_the_stretch_that_was_found(tmp_path):
    covers = SIX[3:]  # all after the clock, 400 s ahead, was set right
    lines = log("pair", covers=covers, n=1100, first_s=400, offset_s=-400)
    lines += log("pair", covers=covers, n=1600, first_s=1100)[1:]
    found = survey(tmp_path, {"pair": lines}, {"pair": FOUND},
                   rows=sheet(covers, ((600, 720), (1400, 1480), (1800, 1920)), ndvi=False))
    assert [bool(piece.refusal) for piece in clock(found, "pair").pieces] == [True, False]
    unmarked(found.records["pair"], range(1102, 2702))
    assert [bool(this.refusal) for this in found.passes] == [True, False, False]


def test_a_reset_between_two_files_keeps_the_first_whole(tmp_path):
    lines = reset(())
    files = [lines[:1101], [lines[0], *lines[1101:]]]
    found = survey(tmp_path, {"pair": files}, {"pair": GOOD}, rows=sheet((), ndvi=False))
    log_ = found.records["pair"]
    marked = np.logical_or.reduce([*log_.marks.values()])
    assert_array_equal(marked, log_.file == 1)
    assert "(data/pair_1.csv, line 2)" in clock(found, "pair").note
    assert [bool(this.refusal) for this in found.passes] == [False, False, True, True]


def test_a_reset_is_told_with_its_line_and_what_to_do(tmp_path):
    found = survey(tmp_path, {"pair": reset(())}, {"pair": GOOD}, rows=sheet((), ndvi=False))
    note = clock(found, "pair").note
    assert "steps back to 2025-06-11 12:11:40 UTC of its own (data/pair_0.csv, line 1102)" in note
    assert "cover_events" in note


# ---- one record out of place is no reset

@pytest.mark.parametrize("stated", [GOOD, FOUND, None])
@pytest.mark.parametrize("wrong", ["2099-01-01", "1970-01-01"])
@pytest.mark.parametrize("at", [1, 900])
def test_one_wrong_time_costs_one_record(tmp_path, stated, wrong, at):
    lines = log("pair")
    lines[at] = lines[at].replace("2025-06-11", wrong)
    found = survey(tmp_path, {"pair": lines}, {"pair": stated})
    log_ = found.records["pair"]
    if (wrong[:4], at) != ("1970", 1):  # which is in order: a stretch of its own
        assert log_.line[log_.marks["time stepped back"]].tolist() == [at + 1]
        assert len(clock(found, "pair").pieces) < 2
    unmarked(log_, np.delete(np.arange(2, 2702), at - 1))
    assert not any(this.refusal for this in found.passes)


def test_two_lines_in_each_others_place_cost_two_records(tmp_path):
    lines = log("pair")
    lines[700], lines[1000] = lines[1000], lines[700]
    log_ = survey(tmp_path, {"pair": lines}, {"pair": GOOD}).records["pair"]
    assert sorted(log_.line[log_.marks["time stepped back"]]) == [701, 1001]
    unmarked(log_, np.delete(np.arange(2, 2702), [699, 999]))


def test_a_wrong_time_in_a_file_does_not_put_it_first(tmp_path):
    first, second = log("pair", n=1200), log("pair", n=1500, first_s=1200)
    second[5] = second[5].replace("2025-06-11", "1970-01-01")
    log_ = survey(tmp_path, {"pair": [first, second]}, {"pair": GOOD}).records["pair"]
    assert np.count_nonzero(np.logical_or.reduce([*log_.marks.values()])) == 1


@pytest.mark.parametrize("stated", [GOOD, FOUND])
def test_lines_in_no_order_are_told_as_such(tmp_path, stated):
    head, *lines = log("pair", n=600)
    np.random.default_rng(1).shuffle(lines)
    one = clock(survey(tmp_path, {"pair": [head, *lines]}, {"pair": stated}), "pair")
    assert one.status == "refused"
    assert "times: the lines of its files are out of order" in one.refusal
    assert len(one.pieces) == 0
