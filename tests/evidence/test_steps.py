"""Corrections one by one: raw to final, switched off, and what a switched-off one leaves."""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import (
    HEADS,
    UNTOUCHED,
    albedo,
    changed,
    changed_column,
    inputs,
    made,
    stand_off,
)
from pass_values import sensitivities
from small_survey import ALBEDO, CERTAIN, CONTACT, NDVI, lines, readings, row, small

from surveykit.physics.bands import band
from surveykit.physics.footprint import rectangle_share, self_shade
from surveykit.physics.shortwave import patch_albedo, zenith_factor
from surveykit.physics.thermal import brightness_without_setting

DISC = {"quantity": "albedo", "height_cm": "12", "length_m": "1"}
WEATHER = {"weather": lines("weather", n=5, step_s=60)}


def steps(estimate):
    return dict(estimate.steps)


def test_albedo_is_corrected_step_by_step(tmp_path):
    """4 m square at 40 cm, head 1.2 cm, .2 in .16: footprint and shade from the physics alone."""
    one = albedo(tmp_path)
    found = steps(one)
    assert list(found) == ["raw", "surroundings", "own shade"]
    share = float(rectangle_share(-2, 2, -2, 2, 0.4))
    shade = float(self_shade(0.012, 0.4, one.zenith_deg, 0.85))
    assert found["surroundings"] == pytest.approx(
        float(patch_albedo(found["raw"], 0.16, share, 0.0)), abs=1e-9)
    assert found["own shade"] == one.value == pytest.approx(
        float(patch_albedo(found["raw"], 0.16, share, shade)), abs=1e-9)


@pytest.mark.parametrize(("switch", "gone", "flag"), [
    ("correct_surroundings", "surroundings", "surroundings not corrected"),
    ("correct_self_shade", "own shade", "own shade not corrected")])
def test_albedo_corrections_can_be_switched_off(tmp_path, switch, gone, flag):
    one = albedo(tmp_path, settings=CERTAIN | {"albedo": {switch: False}})
    assert gone not in steps(one)
    assert flag in one.flags
    kept = albedo(tmp_path / "on")
    assert flag not in kept.flags
    name = {"surroundings": "contamination_error", "own shade": "shade_error"}[gone]
    left = abs(sensitivities("albedo", one.inputs)[name])
    # what is not corrected stays in the budget, whole, as a rectangle
    size = abs(steps(kept)[gone] - list(kept.steps)[list(steps(kept)).index(gone) - 1][1])
    assert left == pytest.approx(size / np.sqrt(3), rel=0.06)


def test_a_large_effect_is_not_corrected_and_a_larger_refused(tmp_path):
    """At 5 cm on a June noon a head of 2 cm shades some 10 %, of 3 cm 21 % (computed table)."""
    cells = DISC | {"height_cm": "5"}
    some = albedo(tmp_path / "a", cells, kit=changed("pair", head_radius_cm=2.4))
    assert any("above 10%: not corrected" in f for f in some.flags)
    assert steps(some).keys() == {"raw"}
    large = albedo(tmp_path / "b", cells, kit=changed("pair", head_radius_cm=5))
    assert "of its view is lit patch" in large.note
    small_one = albedo(tmp_path / "c", DISC, kit=changed("pair", head_radius_cm=2))
    assert not any("not corrected" in f for f in small_one.flags if "swap" not in f)


def test_a_head_of_unstated_radius_may_be_up_to_the_assumed_one(tmp_path):
    """Half of the shade of 4 cm is taken, and as much on either side (rectangle from 0)."""
    one = albedo(tmp_path, kit=changed("pair", head_radius_cm=None))
    whole = float(self_shade(0.04, 0.4, one.zenith_deg, 0.85))
    assert "head radius not stated" in one.flags
    assert inputs(one)["shade_share"].value == pytest.approx(whole / 2, rel=1e-6)
    assert inputs(one)["shade_error"].u == pytest.approx(1 / np.sqrt(3))


@pytest.mark.parametrize(("side", "more"), [("sun", True), ("away", True), ("", False)])
def test_a_rod_takes_its_share(tmp_path, side, more):
    kit = changed("pair", rod_width_cm=1.5)
    one = albedo(tmp_path, ALBEDO | {"rod_side": side}, kit=kit)
    bare = float(self_shade(0.012, 0.4, one.zenith_deg, 0.85))
    assert (inputs(one)["shade_share"].value > bare * 1.01) == more
    assert ("side of the rod not written: its shade is left out" in one.flags) != more


def test_an_albedo_can_be_normalised_to_one_height_of_the_sun(tmp_path):
    settings = CERTAIN | {"albedo": {"normalise_zenith": True, "normalise_zenith_deg": 60.0,
                                     **UNTOUCHED["albedo"]}}
    one = albedo(tmp_path, settings=settings)
    raw = steps(one)["raw"]
    assert one.value == pytest.approx(raw / float(zenith_factor(one.zenith_deg, 0.1)), rel=1e-9)
    assert inputs(one)["zenith_dependence"].u == 0.1


def test_classes_add_their_limits(tmp_path):
    """ISO 9060 class C against class A: directional 30 against 10 W m-2 (from memory)."""
    made = {c: inputs(albedo(tmp_path / c, kit=changed("pair", class_terms=c))) for c in "AC"}
    assert made["C"]["directional_error"].u == pytest.approx(3 * made["A"]["directional_error"].u)
    assert made["C"]["up_class_error"].u > made["A"]["up_class_error"].u > 0
    assert made["C"]["down_zero_error"].u > made["A"]["down_zero_error"].u
    stated = inputs(albedo(tmp_path / "own", kit=changed("pair", class_terms={
        "directional_w_m2": 10.0, "zero_offset_w_m2": 3.0, "gain": 0.02})))
    assert stated["up_class_error"].u == pytest.approx(0.02 / np.sqrt(3))
    assert "up_class_error" not in inputs(albedo(tmp_path / "none"))


def test_a_response_that_is_not_flat_is_budgeted(tmp_path):
    one = albedo(tmp_path, kit=changed("pair", spectrally_flat=False))
    assert sensitivities("albedo", one.inputs)["spectral_error"] == pytest.approx(
        0.05 * one.value, rel=0.04)
    assert "spectral_error" not in inputs(albedo(tmp_path / "flat"))


# ---- infrared

def test_stand_off_steps_and_switch(tmp_path):
    one = stand_off(tmp_path / "on")
    assert list(steps(one)) == ["raw", "emissivity", "reflected surroundings"]
    off = stand_off(tmp_path / "off", settings=CERTAIN | {
        "temperature": {"correct_emissivity": False}})
    assert off.value == pytest.approx(one.value_raw, abs=1e-6)
    left = sensitivities("stand-off", off.inputs)["correct_emissivity_left"]
    assert left == pytest.approx((one.value - one.value_raw) / np.sqrt(3), rel=0.01)


def test_emissivity_and_what_is_reflected_are_two_steps(tmp_path):
    """47 degC, emissivity .95: divided by it alone, and less 5 % of the sky (by the physics)."""
    one = stand_off(tmp_path, logs=WEATHER | {"thermal": lines("thermal", target=np.full(
        160, 47.0) + np.resize([0.01, -0.01], 160))})
    window = band(8.0, 14.0)
    alone = float(window.temperature_k(window.radiance(47 + 273.15) / 0.95))
    assert steps(one)["emissivity"] == pytest.approx(alone, abs=0.002)
    assert steps(one)["reflected surroundings"] == pytest.approx(49.567 + 273.15, abs=0.01)


def test_an_emissivity_set_in_the_instrument_is_undone(tmp_path):
    """Logged with .95 against a reflected 20 degC: the brightness behind it, by the physics."""
    kit = changed_column("thermal", "target", emissivity_setting=0.95, reflected_setting_degC=20.0)
    one = stand_off(tmp_path, kit=kit)
    window = band(8.0, 14.0)
    want = float(brightness_without_setting(window, one.value_raw, 0.95, 293.15))
    assert steps(one)["emissivity setting undone"] == pytest.approx(want, abs=0.01)
    assert one.value_raw - want == pytest.approx(1.25, abs=0.2)  # 5 % of 27 K, a little more


def test_the_reflected_setting_is_the_housings_where_none_is_stated(tmp_path):
    one = stand_off(tmp_path, kit=changed_column("thermal", "target", emissivity_setting=0.95))
    assert inputs(one)["reflected_k"].value == pytest.approx(303.15, abs=0.05)


def test_contact_steps(tmp_path):
    one = stand_off(tmp_path, CONTACT)
    assert list(steps(one)) == ["raw", "emissivity", "reflected bore", "rim gap",
                                "cooling under the head"]
    flag = "rim gap not corrected"
    off = stand_off(tmp_path / "off", CONTACT, settings=CERTAIN | {
        "temperature": {"correct_rim_gap": False}})
    assert flag in off.flags
    assert flag not in one.flags
    assert "rim gap" not in steps(off)


def placements(rate, n=160):
    """Three placements of 40 s that cool by `rate` sqrt(t); lifted for 8 s in between."""
    target = readings("target", n, 1) * 0.02 + 47 * 0.98
    for start in (12, 60, 108):
        since = np.arange(40)
        target[start:start + 40] -= rate * np.sqrt(since)
        target[start - 8:start] -= 15 * np.sin(np.pi * (np.arange(8) + 0.5) / 8)
    target[148:] -= 15.0  # lifted for good
    return lines("thermal", target=target)


SUN = {"pair": lines("pair")}
LONG = CONTACT | {"start": "12:00:01", "stop": "12:02:38"}


def test_ground_that_cools_under_the_head_is_led_back(tmp_path):
    """.4 K s-1/2 from 47 degC: what stood before the touch, not the mean."""
    logs = WEATHER | SUN | {"thermal": placements(0.4)}
    one = stand_off(tmp_path / "a", LONG, logs=logs)
    flat = stand_off(tmp_path / "b", LONG, logs=WEATHER | SUN | {"thermal": placements(0.0)})
    assert one.value == pytest.approx(flat.value, abs=0.35)  # half a step before the touch: .28 K
    assert steps(one)["cooling under the head"] - steps(one)["rim gap"] == pytest.approx(
        0.4 * np.sqrt(40) * 2 / 3, abs=0.3)
    assert inputs(one)["head_cooling_error"].u == 0.3
    assert inputs(one)["fit_left"].u < 0.2


def test_without_the_fit_much_cooling_is_refused(tmp_path):
    """900 W m-2 for 40 s: 2 q sqrt(t / pi) / 1000 is 4.5 K half-way; in 2 s it is less than 2."""
    off = CERTAIN | {"temperature": {"correct_head_cooling": False}}
    logs = WEATHER | SUN | {"thermal": placements(0.4)}
    one = stand_off(tmp_path / "a", LONG, logs=logs, settings=off)
    assert "under the head, more than 2 without the fit" in one.note
    shade = stand_off(tmp_path / "b", LONG, settings=off, logs=WEATHER | {
        "thermal": placements(0.0), "pair": lines("pair", sky=readings("sky", 160, 1) / 30)})
    assert shade.evaluated
    assert "cooling under the head" not in steps(shade)


def test_a_fit_that_is_too_uncertain_is_refused(tmp_path):
    rng = np.random.default_rng(6)
    logs = WEATHER | SUN | {"thermal": lines("thermal", target=47 + rng.normal(0, 1.5, 160))}
    strict = CERTAIN | {"temperature": {"head_cooling_fit_max_u_k": 0.05,
                                        "dwell_max_rate_k_s": 3.0}}
    one = stand_off(tmp_path, LONG, logs=logs, settings=strict)
    assert "the fit of the cooling under the head leaves" in one.note


@pytest.mark.parametrize(("known", "drift"), [("46.1", True), ("46.9", False)])
def test_check_readings_show_a_drift(tmp_path, known, drift):
    """Read 47.0 of a plate of 46.1 degC: .9 K, rectangular."""
    sheet = [row(**(LONG | {"mode": "stand-off", "height_cm": "40", "width_m": "4",
                            "length_m": "4", "start": "12:00:40"})),
             row(entry="check", instrument="thermal", start="12:00:02", stop="12:00:30",
                 reading=known)]
    (one,) = small(tmp_path, sheet, {"thermal": lines("thermal")} | WEATHER).estimates()
    assert ("check reading off by more than 0.5 K" in one.flags) == drift
    assert inputs(one)["check_error"].u == pytest.approx(
        0.9 / np.sqrt(3) if drift else 0.0, abs=0.02)


def test_scatter_within_a_pass_is_that_of_the_corrected_albedo(tmp_path):
    """Independent: the scatter of the raw ratio times the slope of the closed form 1 / (F - S)."""
    one = albedo(tmp_path / "a", DISC)
    raw = albedo(tmp_path / "b", DISC, settings=CERTAIN | UNTOUCHED)
    found = inputs(one)
    assert found["footprint_share"].value < 0.99
    lit = found["footprint_share"].value - found["shade_share"].value
    assert one.u_within == pytest.approx(raw.u_within / lit, rel=1e-6)


def test_scatter_within_a_pass_follows_the_gain_ratio_of_an_index(tmp_path):
    """Analytic: N = (n - r) / (n + r) of n over its gain ratio k moves by 2 r k / (n + r k)^2."""
    def read(name, **certificate):
        return made(tmp_path / name, NDVI, *HEADS, kit=changed("rednir-ground", **certificate),
                    settings=CERTAIN)

    plain = read("a")
    held = {name: i.value for name, i in inputs(plain).items()}
    r, n = (held[f"{b}_up"] / held[f"{b}_down"] for b in ("red", "nir"))
    k = 1.25
    one = read("b", band_ratio={"value": k, "u": 0.0, "source": "invented"})
    # relative scatter is alike in both bands, so both slopes scale by the same factor
    scaled = k * ((n + r) / (n + r * k)) ** 2
    assert one.u_within / plain.u_within == pytest.approx(scaled, rel=1e-6)
