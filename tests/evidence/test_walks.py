"""Passes walked over lanes: records near the edge, a leaning head, a slow one, who stood where."""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import albedo, changed, inputs
from pass_values import sensitivities
from small_survey import ALBEDO, CERTAIN, lines, readings, row, small

from surveykit.physics.footprint import rectangle_share, upright_share
from surveykit.physics.shortwave import levelling_error

AT = np.arange(160) - 20  # seconds since the walk began
LANE = np.clip(AT // 30, 0, 3)  # four lanes of 30 s
BIG = {"width_m": "60", "length_m": "60", "lanes": "4"}
ANYWHERE = CERTAIN | {"albedo": {"min_footprint": 0.1}}


def test_records_that_see_too_much_beyond_the_patch_are_left_out_one_by_one(tmp_path):
    """One lane along the middle of 4 m in 120 s, head at 40 cm: by the view factors alone."""
    survey = small(tmp_path, [row(**ALBEDO, lanes="1")], {"pair": lines("pair")})
    x = 4.0 * np.arange(120) / 120
    share = rectangle_share(-x, 4 - x, -2.0, 2.0, 0.4)
    quality = survey.quality()
    chosen = quality.passes["C1-albedo-1"]
    assert chosen.index - 20 == pytest.approx(np.flatnonzero(share >= 0.90))
    assert chosen.reasons == {"foreign ground in view": int((share < 0.90).sum())}
    (one,) = survey.estimates()
    assert inputs(one)["footprint_share"].value == pytest.approx(share[share >= 0.90].mean())
    assert "small footprint share" not in one.flags
    ledger = quality.ledger.set_index("reason").records
    assert ledger["foreign ground in view"] == (share < 0.90).sum()
    assert quality.ledger.records.sum() == 160  # nothing lost uncounted
    told = quality.checks[quality.checks.check == "foreign ground in view"]
    assert told.severity.tolist() == ["flag"] * int((share < 0.90).mean() > 0.3)


def test_a_head_held_lower_keeps_more_of_its_walk(tmp_path):
    kept = [small(tmp_path / height, [row(**ALBEDO | {"height_cm": height}, lanes="1")],
                  {"pair": lines("pair")}).quality().passes["C1-albedo-1"].index.size
            for height in ("40", "20", "10")]
    assert kept[0] < kept[1] < kept[2]


def test_where_no_record_sees_enough_of_its_patch_the_pass_is_refused(tmp_path):
    one = albedo(tmp_path, ALBEDO | {"height_cm": "90", "lanes": "1"})
    assert one.note.startswith("nowhere on its lanes does the patch fill enough of the view")


def walk(root, effect=0.0, cells=BIG, **more):
    """Sky of 900 W m-2 that the upper head reads `effect` too high on the even lanes."""
    way = np.where(LANE % 2 == 0, 1.0, -1.0)
    log = {"pair": lines("pair", sky=readings("sky", 160, 1) * (1 + effect * way))}
    return albedo(root, ALBEDO | cells, logs=log, **more)


def leaning(estimate):
    return [f for f in estimate.flags if f.startswith("the upper head leans")]


@pytest.mark.parametrize(("effect", "flagged"), [(0.013, True), (-0.013, True), (0.005, False)])
def test_a_head_that_leans_with_the_lanes(tmp_path, effect, flagged):
    """1 % is flagged (engineering default), with the tilt that gives it."""
    found = leaning(walk(tmp_path, effect))
    assert bool(found) == flagged
    if flagged:
        tilt = float(found[0].split("by ")[1].split(" degrees")[0])
        zenith = walk(tmp_path / "again").zenith_deg
        there, back = levelling_error(zenith, tilt, np.array([0.0, 180.0]), 0.85)
        assert (there - back) / 2 == pytest.approx(0.013, rel=0.04)  # a tenth of a degree of 2.6


def test_a_slow_change_of_the_sun_is_no_lean(tmp_path):
    """4 % over the pass, the same on lanes there and back."""
    log = {"pair": lines("pair", sky=readings("sky", 160, 1) * (1 + 4e-4 * AT),
                         ground=readings("ground", 160, 1) * (1 + 4e-4 * AT))}
    assert leaning(albedo(tmp_path, ALBEDO | BIG, logs=log)) == []


@pytest.mark.parametrize(("lanes", "flagged"), [("3", True), ("4", False), ("1", False)])
def test_an_odd_number_of_lanes_lets_a_lean_stand(tmp_path, lanes, flagged):
    one = walk(tmp_path, cells=BIG | {"lanes": lanes})
    assert ("odd number of lanes: a lean of the upper head does not cancel" in one.flags) == flagged


@pytest.mark.parametrize(("tau", "flagged"), [(9.0, True), (7.0, False)])
def test_a_head_too_slow_for_the_walk(tmp_path, tau, flagged):
    """4 lanes in 120 s: a quarter of a lane takes 7.5 s."""
    settings = ANYWHERE | {"passes": {"sheet_u_s": 0.0, "settle_time_constants": 1.0,
                                      "exclude_turns": False}}
    one = walk(tmp_path, kit=changed("pair", time_constant_s=tau), settings=settings)
    assert ("heads too slow for the walk" in one.flags) == flagged


@pytest.mark.parametrize(("side", "flagged"), [("sun", True), ("across", True), ("away", False),
                                               ("", False)])
def test_where_the_operator_stood(tmp_path, side, flagged):
    one = albedo(tmp_path, ALBEDO | {"operator_side": side})
    assert ("operator_error" in inputs(one)) == bool(side)
    assert ("the operator stood beside or towards the sun" in one.flags) == flagged


def test_the_operator_is_in_the_budget(tmp_path):
    """At .6 m from a head 12 cm up: 11 % of the sky, 15 % of it diffuse, and .5 % of the ground
    in view (the plate's view factors), rectangular; at 1.5 m far less.
    """
    cells = ALBEDO | {"operator_side": "away", "height_cm": "12"}
    near = albedo(tmp_path / "a", cells, settings=CERTAIN | {"albedo": {
        "operator_distance_m": 0.6}})
    sky, ground = upright_share(0.5, [1.63, 0.12], 0.6)
    want = np.hypot(0.15 * sky, ground) / np.sqrt(3)
    assert sky == pytest.approx(0.11, abs=0.005)
    assert sensitivities("albedo", near.inputs)["operator_error"] == pytest.approx(
        want * near.value, rel=0.05)
    far = inputs(albedo(tmp_path / "b", cells))["operator_error"]
    assert far.u < 0.4 * inputs(near)["operator_error"].u
