"""Flags of a pass that no other file raises: each with its fault and its clean twin."""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import (
    HEADS,
    UNTOUCHED,
    WEATHER,
    albedo,
    changed,
    inputs,
    made,
    stand_off,
)
from small_survey import ALBEDO, CERTAIN, CONTACT, NDVI, STAND_OFF, lines, readings, row, small

SUN = {"pair": lines("pair")}
LONG = CONTACT | {"start": "12:00:01", "stop": "12:02:38"}


@pytest.mark.parametrize(("share", "flagged"), [(0.021, True), (0.03, False)])
def test_darker_than_any_ground(tmp_path, share, flagged):
    """Read .021 between grounds of .16, of which 1.5 % is in view: less than .02 is left."""
    log = {"pair": lines("pair", ground=share * readings("sky", 160, 1))}
    one = albedo(tmp_path, ALBEDO | {"height_cm": "30"}, logs=log, settings=CERTAIN | {
        "albedo": {"max_shade_contamination": 0.5, "max_corrected": 0.4}})
    assert one.evaluated, one.note
    assert ("darker than any ground" in one.flags) == flagged
    assert (one.value < 0.02) == flagged


def placements(rate):
    """Three placements of 40 s that cool by `rate` sqrt(t); lifted for 8 s in between."""
    target = readings("target", 160, 1) * 0.02 + 47 * 0.98
    for start in (12, 60, 108):
        target[start:start + 40] -= rate * np.sqrt(np.arange(40))
        target[start - 8:start] -= 15 * np.sin(np.pi * (np.arange(8) + 0.5) / 8)
    target[148:] -= 15.0  # lifted for good
    return {"thermal": lines("thermal", target=target)}


@pytest.mark.parametrize(("rate", "flagged"), [(-0.3, True), (0.3, False)])
def test_ground_that_warms_under_the_head(tmp_path, rate, flagged):
    one = stand_off(tmp_path, LONG, logs=WEATHER | SUN | placements(rate))
    assert one.evaluated, one.note
    flag = "the ground warms under the head: the law of cooling does not hold"
    assert (flag in one.flags) == flagged


def mixed(root, soil):
    """Half of the records over turf (.04, .45), half over soil: .30 and .36, or turf as well."""
    half = np.arange(160) < 80
    red, nir = (np.where(half & soil, a, b) for a, b in ((0.30, 0.04), (0.36, 0.45)))
    ground = {"red": 70 * red, "nir": 50 * nir}
    sky = {"red": np.full(160, 70.0), "nir": np.full(160, 50.0)}
    wobble = 1 + 1e-3 * np.random.default_rng(1).standard_normal(160)
    return made(root, NDVI, *HEADS, logs={
        "rednir-sky": lines("rednir-sky", **{k: v * wobble for k, v in sky.items()}),
        "rednir-ground": lines("rednir-ground", **{k: v * wobble for k, v in ground.items()})},
        settings=CERTAIN | {"quality": {"spike_mad": 1000.0}})


def test_the_records_mean_index_answers_another_question(tmp_path):
    """Mean of ratios .464, ratio of sums .409 (computed)."""
    one = mixed(tmp_path / "a", np.ones(160, dtype=bool))
    assert one.value == pytest.approx(0.409, abs=0.006)  # 60 records of one, 60 of the other
    assert "mean of the records' indices 0.464: bright and green parts mix" in one.flags
    twin = mixed(tmp_path / "b", np.zeros(160, dtype=bool))
    assert not any(f.startswith("mean of the records") for f in twin.flags)


def test_a_spot_of_two_kinds_is_its_mean_temperature(tmp_path):
    """Two thirds at 35 and a third at 55 degC: the mean of the temperatures is 41.7 degC; that of
    the radiances would be 42.0 (computed).
    """
    third = (np.arange(160) % 3 == 0)
    log = {"thermal": lines("thermal", target=np.where(third, 55.0, 35.0))}
    lax = CERTAIN | {"quality": {"spike_mad": 1e6, "flatline_max_repeat": 0.999}}
    black = {"court": {"label": "Court", "emissivity": {"value": 1.0, "u": 0.0,
                                                        "source": "black, invented"}}}
    one = stand_off(tmp_path, logs=WEATHER | log, settings=lax, surfaces=black)
    assert one.value - 273.15 == pytest.approx(41.67, abs=0.02)


@pytest.mark.parametrize(("flat", "flagged"), [(False, True), (True, False), (None, False)])
def test_heads_whose_response_is_not_flat(tmp_path, flat, flagged):
    kit = changed("pair", spectrally_flat=flat)
    one = albedo(tmp_path, kit=kit)
    flag = "response of the heads is not flat: do not compare green with grey ground"
    assert (flag in one.flags) == flagged


@pytest.mark.parametrize(("height", "view", "flagged"), [
    ("600", None, True), ("250", None, False), ("250", 50, True), ("100", 50, False)])
def test_a_spot_wider_than_its_patch(tmp_path, height, view, flagged):
    """22 degrees: 2 h tan 22 is 4.8 m from 6 m, 2.0 m from 2.5 m; the patch is 4 m. Tilted by 50
    degrees the spot is h (tan 72 - tan 28) long: 6.4 m from 2.5 m, 2.5 m from 1 m.
    """
    one = stand_off(tmp_path, STAND_OFF | {"height_cm": height}, kit=changed(
        "thermal", half_angle_deg=22, view_angle_deg=view))
    assert ("the spot is wider than the patch" in one.flags) == flagged


@pytest.mark.parametrize(("zero_up", "zero_down", "light", "share", "reads"), [
    (3, -5, 900, 0.08, 0.004), (3, -5, 300, 0.08, 0.0115), (3, -5, 900, 0.30, 0.005),
    (3, -5, 300, 0.30, 0.015)])
def test_a_zero_that_is_left_in(tmp_path, zero_up, zero_down, light, share, reads):
    """Sky head -5, ground head +3 W m-2: what it adds to an albedo (computed); darks take it off.
    """
    capped = np.arange(160) < 15
    sky = np.where(capped, 0, light + (readings("sky", 160, 1) - 900) * 0.1) + zero_down
    ground = np.where(capped, 0, light * share + 0.1 * (
        readings("ground", 160, 1) - 180)) + zero_up
    dark = row(entry="dark", instrument="pair", start="12:00:02", stop="12:00:12")
    (one,) = small(tmp_path, [row(**ALBEDO), dark], {"pair": lines("pair", sky=sky, ground=ground)},
                   settings=CERTAIN | UNTOUCHED).estimates()
    assert one.value_raw - share == pytest.approx(reads, abs=6e-4)
    assert one.value == pytest.approx(share, abs=3e-4)
    assert inputs(one)["up"].value == pytest.approx(light * share, abs=0.1)


@pytest.mark.parametrize(("distance", "flagged"), [(1.2, True), (1.5, False)])
def test_an_operator_who_stands_near(tmp_path, distance, flagged):
    """At 1.5 m an operator hides 1.3 % of the sky and 1.4 % of the ground (computed)."""
    one = albedo(tmp_path, settings=CERTAIN | {"albedo": {"operator_distance_m": distance}})
    assert ("the operator stood nearer than 1.5 m" in one.flags) == flagged
