"""Clocks found from covers or from shared light, each refusal with its clean twin; checks."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose
from under_sky import COVERS, NS, PASSES, START, log, sheet, survey, written

from surveykit.core import InputError
from surveykit.intake.aligning import align, read_logs
from surveykit.intake.clocks import REFUSED
from surveykit.intake.clocks.evidence import frames

GOOD = {"offset_s": 0, "u_s": 0.1}
FOUND = {"cover_events": True}
OTHER = {"align_with": "rednir-sky"}


def clock(found, name):
    return next(one for one in found.clocks if one.logger == name)


def ndvi_logs(**ground):
    return {"rednir-sky": log("rednir-sky", cloudy=ground.get("cloudy", False)),
            "rednir-ground": log("rednir-ground", **ground)}


def only_ndvi(covers=COVERS):
    rows = sheet(covers)
    return [one for one in rows if one.get("quantity") != "albedo"]


# ---- found

def test_covers_against_the_sheet_find_offset_and_drift(tmp_path):
    found = survey(tmp_path, {"pair": log("pair", offset_s=41.3, drift_ppm=80)}, {"pair": FOUND})
    one = clock(found, "pair")
    assert (one.method, one.status, one.to_watch) == ("cover events", "ok", True)
    piece = one.pieces[0]
    # 41.3 s and 80 ppm: at the middle of the covers, 1226 s, 41.3 + .1 s
    assert one.offset_s == pytest.approx(41.4, abs=2 * one.u_s)
    assert one.u_at(piece.at_ns) == pytest.approx(np.sqrt(1 + 1 / 12) / np.sqrt(6), rel=1e-6)
    assert one.u_at(piece.at_ns + 1000 * NS) > one.u_at(piece.at_ns)
    assert len(one.events) == 6
    assert frames(found.clocks)["events"]["residual_s"].abs().max() < 1.5


def test_a_cover_against_another_logger_is_better_than_the_written_times(tmp_path):
    logs = ndvi_logs(offset_s=-33.7)
    found = survey(tmp_path, logs, {"rednir-sky": GOOD, "rednir-ground": OTHER},
                   rows=only_ndvi())
    one = clock(found, "rednir-ground")
    assert (one.method, one.status) == ("aligned with rednir-sky, by covers", "ok")
    assert_allclose(one.offset_s, -33.7, atol=0.5)
    assert one.u_s < 0.5
    sky, ground = (found.records[name] for name in ("rednir-sky", "rednir-ground"))
    dark = [log.time_ns[log.channels["nir"] < 0.2] / NS for log in (sky, ground)]
    assert_allclose(dark[0].mean(), dark[1].mean(), atol=0.6)  # both under cover together


@pytest.mark.parametrize("start", [0, -30])
def test_shared_light_aligns_where_no_cover_was_made(tmp_path, start):
    logs = {"rednir-sky": log("rednir-sky", covers=(), cloudy=True),
            "rednir-ground": log("rednir-ground", covers=(), cloudy=True, offset_s=-57.2)}
    found = survey(tmp_path, logs, {"rednir-sky": GOOD,
                                    "rednir-ground": {**OTHER, "offset_s": start}},
                   rows=only_ndvi(()))
    one = clock(found, "rednir-ground")
    assert one.method == "aligned with rednir-sky, by correlation"
    assert_allclose(one.offset_s, -57.2, atol=0.5)
    assert one.lag.peak > 0.3
    assert not frames(found.clocks)["lags"].empty


def test_positive_means_slow_by_either_way(tmp_path):
    # what the logger writes at 12:00:00 happened at 12:00:20: it is slow, 20 s are added
    for clocks in ({"pair": FOUND}, {"pair": {"offset_s": 20, "u_s": 1}}):
        found = survey(tmp_path, {"pair": log("pair", offset_s=20)}, clocks)
        log_ = found.records["pair"]
        assert_allclose((log_.time_ns[0] - START) / NS, 20, atol=1.0)


def test_trim_takes_u_at_the_time_of_the_pass(tmp_path):
    found = survey(tmp_path, {"pair": log("pair", offset_s=10)}, {"pair": FOUND},
                   watch={"offset_s": 0, "u_s": 3.0})
    one = clock(found, "pair")
    for this in found.passes:  # sheet 0, tau 0; found from the sheet: no u of the watch
        assert this.trim_s == pytest.approx(max(one.u_at(this.start_ns), one.u_at(this.stop_ns)))
        assert this.trim_s < 1
    assert one.u_s > 3  # against UTC it does


def test_a_pass_beyond_the_events_is_flagged(tmp_path):
    covers = COVERS[:2]
    logs = {"pair": log("pair", covers=covers)}
    found = survey(tmp_path, logs, {"pair": FOUND}, rows=sheet(covers, ndvi=False))
    flagged = ["clock extrapolated" in this.notes for this in found.passes]
    assert flagged == [False, False, True, True]  # the second cover ends at 1211 s, +10 % at 1326 s
    clean = survey(tmp_path / "clean", {"pair": log("pair")}, {"pair": FOUND})
    assert not any("clock extrapolated" in this.notes for this in clean.passes)


# ---- refused: one fault each, and only that clock

MOVED = (COVERS[0], (COVERS[1][0] + 9, COVERS[1][1] + 9), COVERS[2])
FAULTS = {
    "an event off the line": (
        {"covers": MOVED}, FOUND, {}, "a cover lies 9.0 s off", "the line"),
    "drift": ({"drift_ppm": 800}, OTHER, {}, "beyond 200 ppm", "its drift of +"),
    "too few covers": ({"covers": COVERS[:1]}, FOUND, {}, "1 of 3 covers show", "2 are needed"),
    "beyond the search": ({"offset_s": 300}, FOUND, {}, "0 of 3 covers show", "2 are needed"),
    "nothing to correlate on a clear day": (
        {"covers": ()}, {"align_with": "pair"}, {}, "0 of 3 covers show",
        "peak of the correlation"),
}


@pytest.mark.parametrize("name", FAULTS)
def test_a_clock_is_refused_for_one_reason_and_its_twin_is_not(tmp_path, name):
    spoiled, stated, more, *words = FAULTS[name]
    logs = {"pair": log("pair"), "rednir-sky": log("rednir-sky"),
            "rednir-ground": log("rednir-ground")}
    clocks = {"pair": GOOD, "rednir-sky": GOOD, "rednir-ground": stated}
    clean = survey(tmp_path / "clean", logs, clocks, **more)
    assert [one.status for one in clean.clocks] == ["ok"] * 3
    assert not any(this.refusal for this in clean.passes)
    found = survey(tmp_path / "faulty", logs | {"rednir-ground": log("rednir-ground", **spoiled)},
                   clocks, **more)
    assert [one.status for one in found.clocks] == ["ok", "ok", "refused"]
    for word in words:
        assert word in clock(found, "rednir-ground").refusal
    for this in found.passes:  # only what needs it; the passes stay
        assert bool(this.refusal) == (this.quantity == "ndvi")
    assert len(found.passes) == len(clean.passes) == 2 * len(PASSES)
    assert found.records["rednir-ground"].marks[REFUSED].all()
    assert REFUSED not in found.records["pair"].marks


def test_a_declared_drift_beyond_what_is_credible(tmp_path):
    """Offsets beyond it, and covers that one logger alone shows: tests/data/broken/time."""
    logs = {"pair": log("pair"), "rednir-ground": log("rednir-ground"),
            "rednir-sky": log("rednir-sky")}
    stated = {"offset_s": 0, "u_s": 1, "drift_ppm": 900, "drift_from": "2025-06-11T12:00:00Z"}
    found = survey(tmp_path, logs, dict.fromkeys(logs, GOOD) | {"rednir-ground": stated})
    assert "its drift of +900 ppm is beyond 200 ppm" in clock(found, "rednir-ground").refusal
    assert {one.logger for one in found.clocks if one.status != "ok"} == {"rednir-ground"}


def test_two_offsets_that_fit_alike_are_not_guessed_between(tmp_path):
    again = tuple((a + 60, b + 60) for a, b in COVERS)
    logs = {"pair": log("pair", covers=(*COVERS, *again))}
    with_both = survey(tmp_path, logs, {"pair": FOUND})
    assert "the covers fit two offsets" in clock(with_both, "pair").refusal
    near = survey(tmp_path / "near", logs, {"pair": {**FOUND, "search_s": 30}})
    assert clock(near, "pair").status == "ok"


def test_what_hangs_on_a_refused_clock_is_refused_with_it(tmp_path):
    logs = ndvi_logs()
    logs["rednir-sky"] = log("rednir-sky", covers=())
    found = survey(tmp_path, logs, {"rednir-sky": FOUND, "rednir-ground": OTHER}, rows=only_ndvi())
    assert "it is set by that of rednir-sky, which is refused itself" in clock(
        found, "rednir-ground").refusal
    assert all(this.refusal for this in found.passes)


def test_the_sheet_is_needed_only_by_what_it_sets(tmp_path):
    parameters = written(tmp_path, {"pair": log("pair")}, {"pair": FOUND})
    parameters.sheet_path.unlink()
    with pytest.raises(InputError) as caught:
        align(parameters, *read_logs(parameters))
    assert all("field_sheet" in fault for fault in caught.value.faults)
