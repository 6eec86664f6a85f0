"""What the records say of passes: edges, gaps, placements; the walk over a patch."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose
from small_survey import CONTACT, STAND_OFF, lines, row, small

from surveykit.intake.aligning import align, read_logs
from surveykit.intake.paths import serpentine, walk
from surveykit.intake.placements import find_dwells

SHEET_5S = {"passes": {"sheet_u_s": 5.0}}


def brought(root, rows, target, *, n=600, drop=slice(0, 0), **sections):
    """Read an infrared log of n seconds from 12:00:00 with the given target readings [degC]."""
    text = lines("thermal", n=n, target=target)
    del text[1 + drop.start:1 + drop.stop]
    sections = {"settings": SHEET_5S} | sections
    parameters = small(root, rows, {"thermal": text}, **sections).parameters
    return align(parameters, *read_logs(parameters)).passes


def walked(start_s, stop_s, n=600):
    """Return readings that change by 15 K where the head comes over the patch and leaves it."""
    time = np.arange(n)
    level = np.where((time >= start_s) & (time < stop_s), 48.0, 33.0)
    return level + 0.4 * np.random.default_rng(1).standard_normal(n)


# ---- edges

@pytest.mark.parametrize(("start_s", "stop_s", "words"), [
    (120, 240, ()),  # as written
    (131, 229, ()),  # within 3 u = 15 s of written times
    (150, 240, ("edge disagrees (start +30 s)",)),
    (120, 212, ("edge disagrees (stop -28 s)",)),
    (90, 268, ("edge disagrees (start -30 s)", "edge disagrees (stop +28 s)"))])
def test_edges_are_compared_and_never_moved(tmp_path, start_s, stop_s, words):
    rows = [row(**STAND_OFF, start="12:02:00", stop="12:04:00")]
    (this,) = brought(tmp_path, rows, walked(start_s, stop_s))
    assert this.notes == words
    assert (this.stop_ns - this.start_ns) == 120 * 10**9
    assert this.trim_s == 5.0


def test_ground_that_looks_alike_on_both_sides_says_nothing(tmp_path):
    rows = [row(**STAND_OFF, start="12:02:00", stop="12:04:00")]
    (this,) = brought(tmp_path, rows, walked(0, 600))
    assert this.notes == ()


def test_the_next_patch_is_not_taken_for_an_edge(tmp_path):
    rows = [row(**STAND_OFF, start="12:02:00", stop="12:04:00"),
            row(**STAND_OFF | {"width_m": "", "length_m": ""}, start="12:04:20", stop="12:06:00",
                patch="C2")]
    readings = walked(0, 260)  # the second patch is the colder one, from its own start on
    for this in brought(tmp_path, rows, readings):
        assert this.notes == ()


# ---- gaps

def test_a_pass_without_a_record_is_refused_with_its_row_and_the_gap(tmp_path):
    rows = [row(**STAND_OFF, start="12:01:00", stop="12:02:00"),
            row(**STAND_OFF, start="12:04:00", stop="12:06:00")]
    clean = brought(tmp_path / "clean", rows, walked(0, 600))
    assert [this.refusal for this in clean] == ["", ""]
    one, two = brought(tmp_path / "gap", rows, walked(0, 600), drop=slice(230, 370))
    assert one.refusal == ""
    assert two.refusal == (
        "data/sheet.csv row 3: thermal holds no record during the pass; the last before it at "
        "2025-06-11 12:03:49 UTC and the next at 2025-06-11 12:06:10 UTC")


# ---- placements

def pressed(dwells, *, rate_hz=2.0, end_s=72.0, tau_s=0.3, noise_k=0.08, seed=4):
    """Return time [s] and readings [K] of a head lifted between placements, as heads respond."""
    rng, fine = np.random.default_rng(seed), np.arange(0, end_s, 0.1)
    seen, last = np.full(fine.size, 320.0), 0.0
    for start, stop in dwells:
        lifted = (fine >= last) & (fine < start)
        phase = (fine[lifted] - last) / max(start - last, 0.1)
        seen[lifted] -= rng.uniform(10, 24) * np.sin(np.pi * phase)
        seen[fine >= start] = 320 + 0.8 * rng.standard_normal()
        last = stop
    value, memory = np.empty(fine.size), np.exp(-0.1 / tau_s)
    value[0] = seen[0]
    for k in range(1, fine.size):
        value[k] = seen[k] + (value[k - 1] - seen[k]) * memory
    time_s = np.arange(0, end_s - 0.5, 1 / rate_hz)
    return time_s, np.interp(time_s, fine, value) + noise_k * rng.standard_normal(time_s.size)


def placed(seed):
    rng, since, dwells = np.random.default_rng(seed), 0.0, []
    while since + 8 < 72:
        dwells.append((since, since + rng.uniform(6, 7.5)))
        since = dwells[-1][1] + rng.uniform(1.3, 1.7)
    return dwells


def test_placements_of_six_seconds_are_found_and_none_while_lifted():
    held = found_of = 0
    for seed in range(40):
        dwells = placed(seed)
        time_s, values = pressed(dwells, seed=seed, end_s=dwells[-1][1])
        found = find_dwells(time_s, values, settle_s=0.0, min_s=3.0, max_rate_k_s=0.5)
        spans = [(time_s[part.start], time_s[part.stop - 1]) for part in found]
        held += len(dwells)
        found_of += sum(any(a < stop and b > start for a, b in spans) for start, stop in dwells)
        for (_, before), (after, _) in zip(dwells, dwells[1:], strict=False):
            middle = (before + after) / 2  # the top of a lift is in no placement
            assert not any(a <= middle <= b for a, b in spans)
    assert found_of >= 0.9 * held


def test_ground_that_cools_under_a_noisy_head_is_one_placement():
    """Lawn in full sun falls by about .3 K/s: its noise of .08 K makes .6 K/s of single steps."""
    time_s = np.arange(0, 6, 0.5)
    held = split = 0
    for seed in range(200):
        rng = np.random.default_rng(seed)
        values = 315 - 0.3 * time_s + 0.08 * rng.standard_normal(time_s.size)
        found = find_dwells(time_s, values, settle_s=0.0, min_s=3.0, max_rate_k_s=0.5)
        held += len(found) == 1 and found[0].stop - found[0].start >= 10
        split += len(found) > 1
    assert held >= 180
    assert split == 0


def test_the_number_of_placements_is_held_against_the_sheet(tmp_path):
    time_s, values = pressed([(0, 20), (21.5, 41), (42.5, 62), (63.5, 90)], rate_hz=1, end_s=91)
    target = np.full(600, 40.0) + 0.05 * np.random.default_rng(0).standard_normal(600)
    target[60:60 + time_s.size] = values - 273.15
    right, wrong = (brought(tmp_path / str(n), [row(
        **CONTACT, start="12:01:00", stop="12:02:30", reading=str(n))], target) for n in (4, 7))
    assert right[0].notes == ()
    assert wrong[0].notes == ("4 placements found, 7 on the sheet",)


# ---- the walk

def test_lanes_by_hand():
    # three lanes of 12 m over 6 m in 60 s: 20 s a lane, 0.6 m/s; rows 1, 3, 5 m from the edge
    time_s = np.array([-1.0, 5, 15, 25, 35, 45, 55, 61])
    path = serpentine(time_s, duration_s=60, length_m=12, width_m=6, lanes=3, lag_s=0, turn_s=1,
                      u_time_s=0, pace_u=0.05)
    assert_allclose(path.x_m[1:-1], [3, 9, 9, 3, 3, 9])
    assert_allclose(path.y_m[1:-1], [1, 1, 3, 3, 5, 5])
    assert_allclose(path.u_x_m[1:-1], 0.05 * path.x_m[1:-1])
    assert np.isnan(path.x_m[[0, -1]]).all()
    assert path.turning[[0, -1]].all()
    assert not path.turning[1:-1].any()


def test_a_slow_head_lies_behind_the_walker_both_ways():
    # .5 m/s, lag 1 s: half a metre back along the way, out and home
    at = {"duration_s": 40, "length_m": 10, "width_m": 4, "lanes": 2, "turn_s": 1, "u_time_s": 2,
          "pace_u": 0}
    quick, slow = (serpentine(np.array([10.0, 30.0]), lag_s=lag, **at) for lag in (0.0, 1.0))
    assert_allclose(quick.x_m - slow.x_m, [0.5, -0.5])
    assert_allclose(slow.u_x_m, 2 * 0.5)


def test_turns_are_left_out():
    time_s = np.arange(0, 60, 0.5)
    path = serpentine(time_s, duration_s=60, length_m=12, width_m=6, lanes=3, lag_s=1, turn_s=4,
                      u_time_s=0, pace_u=0)
    away = np.abs(time_s[:, None] - [20, 40]).min(axis=1)  # the ends are edges, no turns
    assert (path.turning == (away <= 4)).all()
    with pytest.raises(ValueError, match="needs a lane and a time"):
        serpentine(time_s, duration_s=60, length_m=12, width_m=6, lanes=0, lag_s=0, turn_s=0,
                   u_time_s=0, pace_u=0)


@given(st.integers(1, 12), st.floats(10, 600), st.floats(0.5, 40), st.floats(0.5, 40))
def test_a_walk_stays_on_its_patch_and_covers_it(lanes, duration_s, length_m, width_m):
    time_s = np.linspace(0, duration_s, 500)
    path = serpentine(time_s, duration_s=duration_s, length_m=length_m, width_m=width_m,
                      lanes=lanes, lag_s=0, turn_s=1, u_time_s=1, pace_u=0.05)
    assert ((path.x_m >= -1e-9) & (path.x_m <= length_m * (1 + 1e-9))).all()
    assert len(np.unique(path.y_m)) == lanes
    assert_allclose(path.y_m.mean(), width_m / 2, atol=width_m * 0.02)


def test_a_walk_from_the_sheet(tmp_path):
    rows = [row(**STAND_OFF, start="12:01:00", stop="12:02:00", lanes="4"),
            row(**CONTACT, start="12:03:00", stop="12:05:00")]
    root = tmp_path
    parameters = small(root, rows, {"thermal": lines("thermal", n=600)}).parameters
    one, contact = align(parameters, *read_logs(parameters)).passes
    path = walk(one, np.array([one.start_ns + 7_500_000_000]), parameters)
    assert_allclose([path.x_m[0], path.y_m[0]], [2.0, 0.5])  # half of the first of four lanes
    assert walk(contact, np.array([contact.start_ns]), parameters) is None
