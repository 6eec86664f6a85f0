"""Gain ratios by swapping, over a panel and from a certificate."""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import DAY_SCOPE, HEADS, UNTOUCHED, changed, inputs
from small_survey import ALBEDO, CERTAIN, KIT, NDVI, lines, readings, row, small

N = 700
PASS = {"start": "12:00:05", "stop": "12:02:00"}
SETTINGS = CERTAIN | UNTOUCHED
KAPPA = 1.04


def turned(n_pairs, *, scatter=0.0, albedo=0.2, kappa=KAPPA, each=62):
    """A pair whose ground head reads `kappa` times too much, turned over after the pass."""
    sky, ground = readings("sky", N, 1), albedo * readings("sky", N, 1)
    up, down = sky.copy(), kappa * ground
    rows = []
    for pair in range(n_pairs):
        at = 140 + 140 * pair
        wobble = 1 + scatter * (pair - 1)
        down[at:at + 65] *= wobble
        up[at + 70:at + 135], down[at + 70:at + 135] = (
            ground[at + 70:at + 135], kappa * sky[at + 70:at + 135])
        for word, start in (("normal", at), ("inverted", at + 70)):
            rows.append(row(entry="swap", surface="court", patch="C1", instrument="pair",
                            start=clock(start + 1), stop=clock(start + 1 + each), reading=word))
    return {"pair": lines("pair", n=N, sky=up, ground=down)}, rows


def clock(second):
    return f"12:{second // 60:02d}:{second % 60:02d}"


def swapped(root, n_pairs=3, **more):
    settings = more.pop("settings", SETTINGS)
    logs, rows = turned(n_pairs, **more)
    (one,) = small(root, [row(**(ALBEDO | PASS)), *rows], logs, settings=settings).estimates()
    return one


def test_three_swaps_find_the_gain_ratio(tmp_path):
    """.208 becomes .200; the gains' own u of 1.5 % each no longer counts."""
    one = swapped(tmp_path)
    assert dict(one.steps)["raw"] == pytest.approx(0.208, rel=2e-3)
    assert one.value == dict(one.steps)["gain ratio"] == pytest.approx(0.200, rel=1e-3)
    found = inputs(one)["gain_ratio"]
    assert found.value == pytest.approx(KAPPA, rel=1e-3)
    assert 0 < found.u < 0.002
    assert found.scope == f"{DAY_SCOPE}:pair:ground:gain_ratio"  # one error for all of the day
    assert inputs(one)["up_gain_error"].u == inputs(one)["down_gain_error"].u == 0
    assert not any("swap" in f for f in one.flags)


def test_the_zeros_of_the_heads_move_the_ratio(tmp_path):
    """Half of 1/ground + 3/sky for the ground head, of 1/sky + 1/(3 ground) for the sky head."""
    i = inputs(swapped(tmp_path))
    assert i["ratio_per_up_zero"].value == pytest.approx(
        (1 / (KAPPA * 180) + 3 / (KAPPA * 900)) / 2, rel=0.01)
    assert i["ratio_per_down_zero"].value == pytest.approx(-(1 / 900 + 1 / 3 / 180) / 2, rel=0.01)


@pytest.mark.parametrize(("pairs", "flag"), [
    (0, "gain ratio not checked by swapping"), (2, "fewer or shorter swaps than recommended"),
    (3, None)])
def test_few_swaps_are_flagged(tmp_path, pairs, flag):
    flags = swapped(tmp_path, pairs).flags
    assert (flag in flags) if flag else not any("swap" in f for f in flags)


@pytest.mark.parametrize(("each", "flagged"), [(59, True), (61, False)])
def test_short_swaps_are_flagged(tmp_path, each, flagged):
    """Three swaps, a minute each way asked for (engineering default)."""
    flags = swapped(tmp_path, each=each).flags
    assert ("fewer or shorter swaps than recommended" in flags) == flagged


def test_swaps_that_disagree_are_not_used(tmp_path):
    """Normal readings off by 6 %: ratios off by 3 %, above the 1 % accepted."""
    one = swapped(tmp_path, scatter=0.06)
    assert any(f.startswith("swaps not used: their ratios scatter") for f in one.flags)
    assert inputs(one)["gain_ratio"].value == 1.0
    assert inputs(one)["up_gain_error"].u == 0.015


def test_the_ratio_can_be_switched_off(tmp_path):
    off = CERTAIN | {"albedo": UNTOUCHED["albedo"] | {"correct_gain_ratio": False}}
    one = swapped(tmp_path, settings=off)
    assert one.value == pytest.approx(0.208, rel=2e-3)
    assert any("correct_gain_ratio is off" in f for f in one.flags)


# ---- red and near infrared: the golden case's ratios 1.03 and .98 (computed: .83961)

UP = {"red": 4.2, "nir": 55.0}
DOWN = {"red": 100.0, "nir": 120.0}
RATIO = {"red": 1.03, "nir": 0.98}


def bands(root, rows=(), panel=None, kit=KIT):
    at = np.arange(N)
    logs = {}
    for name, level in (("rednir-sky", DOWN), ("rednir-ground", UP)):
        columns = {}
        for band, value in level.items():
            series = np.full(N, value)
            if panel and name == "rednir-ground":
                series[(at >= 200) & (at < 300)] = panel * RATIO[band] * DOWN[band]
            columns[band] = series * (1 + 1e-3 * np.random.default_rng(len(band)
                                      + len(name)).standard_normal(N))
        logs[name] = lines(name, n=N, kit=kit, **columns)
    (one,) = small(root, [row(**(NDVI | PASS)), *rows], logs, kit=kit).estimates()
    return one


PANEL = row(entry="panel", instrument="rednir-ground", start="12:03:25", stop="12:04:55",
            reading="0.5", reading_u="0.02")


def test_a_panel_gives_both_ratios(tmp_path):
    one = bands(tmp_path, [PANEL], panel=0.5)
    assert inputs(one)["red_ratio"].value == pytest.approx(1.03, rel=1e-3)
    assert inputs(one)["nir_ratio"].value == pytest.approx(0.98, rel=1e-3)
    assert one.value == pytest.approx(0.83961, abs=5e-4)
    assert dict(one.steps)["raw"] == pytest.approx(0.83211, abs=5e-4)
    # what the panel reflects is common to the bands and drops out of the index
    assert inputs(one)["panel_error"].u == pytest.approx(0.04)


def test_without_panel_swap_or_certificate_it_is_said(tmp_path):
    one = bands(tmp_path)
    assert "gain ratio not checked by panel or swap" in one.flags
    assert one.value == pytest.approx(0.83211, abs=5e-4)


def test_a_certificate_gives_the_ratio_of_the_bands(tmp_path):
    """Only nir over red matters: .98 / 1.03."""
    kit = changed("rednir-ground", band_ratio={
        "value": 0.98 / 1.03, "u": 0.01, "source": "certificate, invented"})
    one = bands(tmp_path, kit=kit)
    assert one.value == pytest.approx(0.83961, abs=5e-4)
    assert inputs(one)["nir_ratio"].u == 0.01
    assert "gain ratio not checked by panel or swap" not in one.flags


def test_heads_of_different_views_cannot_be_swapped(tmp_path):
    kit = changed("rednir-ground", half_angle_deg=30)
    rows = [row(entry="swap", surface="court", patch="C1", instrument="rednir-ground",
                start=clock(s), stop=clock(s + 60), reading=word)
            for word, s in (("normal", 200), ("inverted", 300))]
    assert "swaps not used: the heads have different views" in bands(tmp_path, rows, kit=kit).flags
    assert HEADS == ("rednir-sky", "rednir-ground")
