"""Red and near-infrared heads turned over: the worked index by its gain ratios, and twins of flags.

Worked index (computed by two independent scripts): sky 100 and 120, ground 4.2 and 55, ratios 1.03
and .98: .83961, uncalibrated .83211.
"""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import DAY_SCOPE, HEADS, changed, inputs
from small_survey import CERTAIN, KIT, NDVI, STAND_OFF, lines, row, small

N = 700
DOWN, UP = {"red": 100.0, "nir": 120.0}, {"red": 4.2, "nir": 55.0}  # as the two heads read them
RATIO = {"red": 1.03, "nir": 0.98}


def clock(second):
    return f"12:{second // 60:02d}:{second % 60:02d}"


def turned(root, pairs=3, *, scatter=0.0, kit=KIT):
    """A pass, then so many swaps; `scatter` moves the first and the last pair apart."""
    over, wobble, rows = np.zeros(N, dtype=bool), np.ones(N), []
    for pair in range(pairs):
        at = 140 + 150 * pair
        over[at + 72:at + 145] = True
        wobble[at:at + 70] += scatter * (pair - 1)
        rows += [row(entry="swap", surface="court", patch="C1", instrument="rednir-ground",
                     start=clock(at + first), stop=clock(at + first + 64), reading=word)
                 for word, first in (("normal", 2), ("inverted", 76))]
    logs = {}
    for name in HEADS:
        ground = name == "rednir-ground"
        columns = {b: (RATIO[b] * wobble if ground else 1.0) * np.where(
            over == ground, DOWN[b], UP[b] / RATIO[b]) for b in DOWN}
        logs[name] = lines(name, n=N, kit=kit, **{b: level * (
            1 + 1e-3 * np.random.default_rng([len(name), len(b)]).standard_normal(N))
            for b, level in columns.items()})
    first = row(**NDVI | {"start": "12:00:05", "stop": "12:02:00"})
    (one,) = small(root, [first, *rows], logs, kit=kit, settings=CERTAIN).estimates()
    return one


def test_swapped_heads_give_both_ratios(tmp_path):
    one = turned(tmp_path)
    assert one.evaluated, one.note
    for b, ratio in RATIO.items():
        found = inputs(one)[f"{b}_ratio"]
        assert found.value == pytest.approx(ratio, rel=1e-3)
        assert 0 < found.u < 0.002
        assert found.scope == f"{DAY_SCOPE}:rednir-ground:{b}:{b}_ratio"
        assert inputs(one)[f"{b}_up_gain_error"].u == inputs(one)[f"{b}_down_gain_error"].u == 0
    assert dict(one.steps)["raw"] == pytest.approx(0.83211, abs=5e-4)
    assert one.value == dict(one.steps)["gain ratio"] == pytest.approx(0.83961, abs=5e-4)
    assert not any("swap" in f for f in one.flags)


@pytest.mark.parametrize(("more", "told"), [
    ({"pairs": 0}, "gain ratio not checked by panel or swap"),
    ({"pairs": 2}, "fewer or shorter swaps than recommended"),
    ({"scatter": 0.06}, "swaps not used: their ratios scatter by more than 1%"),
    ({"kit": changed("rednir-ground", half_angle_deg=30)},
     "swaps not used: the heads have different views")])
def test_each_fault_of_the_swaps_is_told_and_no_other(tmp_path, more, told):
    """The twin is the survey above: three swaps that agree, of heads alike."""
    one = turned(tmp_path, **more)
    assert one.evaluated, one.note
    assert [f for f in one.flags if "swap" in f] == [told]
    used = "gain ratio" in dict(one.steps)
    assert used == (more == {"pairs": 2})


@pytest.mark.parametrize(("read_c", "below"), [(-60.0, True), (-30.0, False)])
def test_a_sky_within_the_range_of_its_head(tmp_path, read_c, below):
    """The range ends at -40 degC (engineering default)."""
    target = np.full(400, 47.0) + np.resize([0.01, -0.01], 400)
    target[200:240] = read_c + np.resize([0.01, -0.01], 40)
    sky = row(entry="sky", instrument="thermal", start="12:03:20", stop="12:04:00")
    logs = {"thermal": lines("thermal", n=400, target=target),
            "weather": lines("weather", n=8, step_s=60)}
    (one,) = small(tmp_path, [row(**STAND_OFF), sky], logs).estimates()
    assert ("sky reading below the instrument's range" in one.flags) == below
    assert (inputs(one)["sky_factor"].source == "sky radiance measured at the zenith") != below
