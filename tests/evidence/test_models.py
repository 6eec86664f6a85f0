"""The measurement models against worked cases.

"Computed" values come from two independent scripts that share no code with this package (stand-off
case: linear propagation and 1e6 Monte Carlo draws of normal inputs), to the digits printed.
"""

from __future__ import annotations

import numpy as np
import pytest
from checks import check, names
from hypothesis import given
from hypothesis import strategies as st
from pass_values import (
    DRAWS,
    NDVI_REST,
    albedo,
    error,
    evaluate,
    inputs,
    kelvin,
    ndvi,
    sensitivities,
)
from uncertainties import ufloat

from surveykit.core import Input
from surveykit.evidence.models import MODELS, deviations
from surveykit.physics.bands import band
from surveykit.physics.surroundings import sky_radiance
from surveykit.physics.thermal import contact_temperature_k
from surveykit.statistics.draws import Result, summarise

ICE = 273.15
CONTACT_REST = ("rim_gap_error=0 head_cooling_error=0 gain_reading=0 gain_error=0 offset_error=0 "
                "body_rate_error=0 body_rate_k_min=0 band_low_um=8 band_high_um=14 air_k=303.15 "
                "relative_humidity=.3 sky_factor=1 bore_emissivity=1")


# ---- stand-off: T_b 47.0 degC, emissivity .95, air 30 degC, humidity 30 %, open sky (computed)

def worked_case():
    return kelvin(
        47.0 + ICE, error("offset_error", 0.4, "reading"),
        Input("emissivity", 0.95, 0.01, "emissivity", ""),
        Input("air_k", 30 + ICE, 1.0, "air", ""),
        Input("relative_humidity", 0.30, 0.05, "humidity", ""),
        Input("sky_factor", 1.0, 0.15, "sky", ""))


def test_stand_off_worked_case_value():
    assert evaluate("stand-off", worked_case()) - ICE == pytest.approx(49.567, abs=0.0005)


@pytest.mark.parametrize(("name", "contribution"), [
    ("offset_error", 0.413), ("emissivity", -0.535), ("air_k", -0.046),
    ("relative_humidity", -0.108), ("sky_factor", -0.191)])
def test_stand_off_worked_case_contributions(name, contribution):
    assert sensitivities("stand-off", worked_case())[name] == pytest.approx(contribution, abs=0.001)


def test_stand_off_worked_case_interval():
    """u_c .712 K; 95 % [48.20, 50.99] degC, by 1e6 draws of another generator (computed)."""
    moved = evaluate("stand-off", worked_case()) + deviations(
        "stand-off", worked_case(), DRAWS, "no pass")
    found = summarise(Result(moved.mean(), moved, moved), 0.95)
    assert found.u == pytest.approx(0.712, rel=0.05)
    assert found.lower - ICE == pytest.approx(48.20, abs=0.02)
    assert found.upper - ICE == pytest.approx(50.99, abs=0.02)
    combined = np.sqrt(sum(c**2 for c in sensitivities("stand-off", worked_case()).values()))
    assert combined == pytest.approx(0.712, rel=0.01)


@pytest.mark.parametrize("name", names("brightness_8_14"))
def test_stand_off_undoes_what_the_sky_adds(name):
    """Computed brightness of a surface below a black sky of one temperature."""
    given, expected = check(name).input, check(name).expected
    sky = next(value for key, value in given.items() if key.startswith("Tsky"))
    x = kelvin(expected["Tbrightness_C"] + ICE, Input("emissivity", given["emissivity"], 0, "", ""))
    x = {i.name: i.value for i in x} | {"sky_view": 0.0, "walls_k": sky + ICE,
                                        "walls_emissivity": 1.0}
    assert MODELS["stand-off"](x) - ICE == pytest.approx(given["Ts_C"], abs=0.002)


def test_walls_hide_part_of_a_cold_sky():
    """Emissivity .92, 50 degC, black walls at 45 degC: taken as open sky, the result is 1.2 K too
    high where .7 is sky and 2.4 K where .4 is (computed).
    """
    for view, wrong in ((0.7, 1.2), (0.4, 2.4)):
        x = {i.name: i.value for i in kelvin(320.0)} | {
            "emissivity": 0.92, "walls_k": 45 + ICE, "walls_emissivity": 1.0, "sky_view": view}
        low, high = 310.0, 330.0  # bisection for the reading of a surface at 50 degC
        for _ in range(40):
            x["brightness_k"] = (low + high) / 2
            low, high = ((low, x["brightness_k"]) if MODELS["stand-off"](x) > 50 + ICE
                         else (x["brightness_k"], high))
        open_sky = MODELS["stand-off"](x | {"sky_view": 1.0}) - ICE
        assert open_sky - 50 == pytest.approx(wrong, abs=0.06)


def test_a_gain_error_is_a_share_of_what_the_gain_multiplies():
    """1 % of 47 degC read as degC: .47 K before the surface's own slope, whatever the origin."""
    moved = sensitivities("stand-off", inputs(
        " ".join(f"{i.name}={i.value}" for i in kelvin(47 + ICE) if i.name != "gain_reading"),
        error("gain_error", 0.01, "g"), gain_reading=47.0))
    assert moved["gain_error"] == pytest.approx(0.47, abs=0.001)


# ---- contact

@pytest.mark.parametrize(("surface", "body", "emissivity", "bore", "wrong"), [
    (60, 30, 0.95, 0.95, -1.28), (60, 30, 0.95, 0.05, -0.07), (60, 30, 0.85, 0.95, -3.90),
    (60, 55, 0.95, 0.95, -0.23), (25, 35, 0.95, 0.95, 0.50)])
def test_contact_removes_the_error_of_the_bore(surface, body, emissivity, bore, wrong):
    """Uncorrected errors of a head pressed on the ground, to .01 K (computed)."""
    x = {i.name: i.value for i in inputs(
        CONTACT_REST, brightness_k=surface + wrong + ICE, body_k=body + ICE,
        emissivity=emissivity)} | {"bore_emissivity": bore}
    assert MODELS["contact"](x) - ICE == pytest.approx(surface, abs=0.012)


def test_a_rim_gap_is_never_negative():
    """The other side of the symmetric input is the same gap, its effect mirrored."""
    x = {i.name: i.value for i in inputs(CONTACT_REST, brightness_k=320.0, body_k=305.0,
                                         emissivity=0.9)}
    window = band(8.0, 14.0)
    sky = sky_radiance(window, 303.15, 0.3)
    closed, leaking = (float(contact_temperature_k(window, 320.0, 0.9, 305.0, 1.0, gap, sky))
                       for gap in (0.0, 0.2))
    assert leaking - closed > 0.5  # sky in the bore: the reading is too low
    assert MODELS["contact"](x) == pytest.approx(closed, abs=1e-9)
    both = MODELS["contact"](x | {"rim_gap_error": np.array([0.2, -0.2])})
    assert both == pytest.approx([leaking, 2 * closed - leaking], abs=1e-9)


def test_the_rim_gaps_budget_agrees_with_its_draws():
    gap = Input("rim_gap_error", 0.0, 0.2 / np.sqrt(3), "gap", "", "rectangular")
    these = inputs(CONTACT_REST, gap, brightness_k=320.0, body_k=305.0, emissivity=0.9)
    moved = deviations("contact", these, DRAWS, "no pass")
    assert moved.mean() == pytest.approx(0, abs=0.01)
    assert moved.std() == pytest.approx(abs(sensitivities("contact", these)["rim_gap_error"]),
                                        rel=0.01)


# ---- longwave

def test_longwave_pair():
    """e sigma T^4 + (1 - e) down at 330 K, e .94, down 400 W m-2: 656.11 W m-2 (computed)."""
    x = {"up": 656.11, "down": 400.0, "emissivity_broadband": 0.94} | dict.fromkeys(
        ("up_gain_error", "down_gain_error", "up_offset_error", "down_offset_error"), 0.0)
    assert MODELS["longwave"](x) == pytest.approx(330.0, abs=0.005)


# ---- albedo: sky head 812, ground head 172, darks -4 and 1.5 W m-2, gain ratio 1.012 (computed)

def measured(*uncertain, **more):
    """Darks taken off by the reading; gain ratio, surroundings and shade by the model."""
    held = {"up": 172 - 1.5, "down": 812 + 4.0, "gain_ratio": 1.012, "footprint_share": 0.9455,
            "shade_share": 0.0215, "around_albedo": 0.10, "surroundings_corrected": 1.0,
            "shade_corrected": 1.0} | more
    for one in uncertain:
        held.pop(one.name, None)
    return inputs(" ".join(f"{i.name}={i.value}" for i in albedo(0.2)
                           if i.name not in (*held, *(u.name for u in uncertain))),
                  *uncertain, **held)


ALBEDO_CONTRIBUTIONS = (
    ("down_zero_error", 2.0, 0.00055), ("up_zero_error", 1.0, 0.0013),
    ("around_error", 0.02, 0.0012), ("footprint_error", 0.01, 0.0013),
    ("shade_error", 0.005 / 0.0215, 0.0012))


def test_albedo_worked_case():
    assert evaluate("albedo", measured(surroundings_corrected=0.0, shade_corrected=0.0)) == \
        pytest.approx(0.206468, abs=1e-6)
    assert evaluate("albedo", measured()) == pytest.approx(0.217552, abs=1e-6)


@pytest.mark.parametrize(("name", "u", "contribution"), ALBEDO_CONTRIBUTIONS)
def test_albedo_worked_case_contributions(name, u, contribution):
    """One at a time, to 5 %; the printed digits allow half a unit of the last."""
    moved = abs(sensitivities("albedo", measured(error(name, u, "a")))[name])
    assert moved == pytest.approx(contribution, rel=0.05)


def test_albedo_worked_case_of_the_gain_ratio():
    ratio = Input("gain_ratio", 1.012, 0.006, "swap", "")
    assert abs(sensitivities("albedo", measured(ratio))["gain_ratio"]) == pytest.approx(
        0.0013, rel=0.05)


def test_albedo_worked_case_combined():
    """G 2, D 1, darks 2 and 1 W m-2, ratio .006, F .01, S .005, surroundings .02: u_c .0032 by
    Monte Carlo (computed).
    """
    these = measured(Input("gain_ratio", 1.012, 0.006, "swap", ""),
                     error("down_zero_error", 2 * np.sqrt(2), "down"),
                     error("up_zero_error", np.sqrt(2), "up"),
                     *(error(name, u, name) for name, u, _ in ALBEDO_CONTRIBUTIONS[2:]))
    moved = deviations("albedo", these, DRAWS, "no pass")
    assert moved.std() == pytest.approx(0.0032, abs=5e-5)


def test_albedo_of_a_head_held_one_centimetre_higher():
    """Disc of .5 m, head at 12 cm, .30 in surroundings of .10: +.002 by the footprint (computed);
    its slope is -2 h R^2 / (R^2 + h^2)^2.
    """
    slope = -2 * 0.12 * 0.25 / (0.25 + 0.0144) ** 2
    these = measured(error("height_error", 0.01, "pass"), up=0.28265, down=1.0, gain_ratio=1.0,
                     footprint_per_m=slope)
    assert evaluate("albedo", these) == pytest.approx(0.3000, abs=5e-5)
    assert sensitivities("albedo", these)["height_error"] == pytest.approx(0.002, abs=0.0005)


def test_albedo_budgets_its_shade_whole():
    """A shade of 2.15 % of a signal of .2 is .0043, rectangular."""
    shade = Input("shade_error", 0.0, 1 / np.sqrt(3), "shade", "", "rectangular")
    these = inputs(" ".join(f"{i.name}={i.value}" for i in albedo(0.2)), shade, shade_share=0.0215)
    moved = deviations("albedo", these, DRAWS, "no pass")
    assert np.abs(moved).max() == pytest.approx(0.0043, rel=0.001)


def test_albedo_law_of_propagation():
    """200 over 1000 with 2 % each: .00566 independent (uncertainties library)."""
    case = check("albedo_u")
    these = albedo(0.2, error("up_gain_error", 0.02, "up"), error("down_gain_error", 0.02, "down"))
    apart = deviations("albedo", these, DRAWS, "no pass").std()
    assert apart == pytest.approx(case.expected["u_independent"], rel=0.01)
    one = albedo(0.2, error("up_gain_error", 0.02, "kit"), error("down_gain_error", 0.02, "kit"))
    shared = deviations("albedo", one, DRAWS, "no pass").std()
    assert shared == pytest.approx(case.expected["u_r1"], abs=1e-12)


# ---- NDVI: sky 100 and 120, ground 4.2 and 55, gain ratios 1.03 and .98 (computed)

def test_ndvi_worked_case():
    x = {i.name: i.value for i in inputs(NDVI_REST, red_up=4.2, red_down=100.0, nir_up=55.0,
                                         nir_down=120.0)}
    assert MODELS["ndvi"](x) == pytest.approx(0.83211, abs=1e-5)
    calibrated = x | {"red_down_gain_error": 0.03, "nir_down_gain_error": -0.02}
    assert MODELS["ndvi"](calibrated) == pytest.approx(0.83961, abs=1e-5)


@pytest.mark.parametrize(("index", "five", "ten"), [
    (0.1, 0.024, 0.047), (0.5, 0.018, 0.036), (0.7, 0.012, 0.024), (0.85, 0.007, 0.013)])
def test_ndvi_moves_with_the_ratio_of_gains(index, five, ten):
    """(1 - N^2) / 2 times the logarithm of a ratio off by 5 or 10 per cent (computed)."""
    for ratio, size in ((1.05, five), (1.10, ten)):
        these = ndvi(1 - index, 1 + index, error("nir_up_gain_error", np.log(ratio), "gain"))
        assert sensitivities("ndvi", these)["nir_up_gain_error"] == pytest.approx(size, abs=5e-4)


@pytest.mark.parametrize(("index", "u"), [(0.1, 0.014), (0.5, 0.011), (0.8, 0.005)])
def test_ndvi_of_two_bands_with_two_per_cent_each(index, u):
    """(1 - N^2) / 2 * sqrt 2 * .02 (computed)."""
    these = ndvi(1 - index, 1 + index, error("nir_up_gain_error", 0.02, "nir"),
                 error("red_up_gain_error", 0.02, "red"))
    assert deviations("ndvi", these, DRAWS, "no pass").std() == pytest.approx(u, abs=5e-4)


@given(st.floats(0.02, 0.9), st.floats(0.02, 0.9), st.floats(0.001, 0.05), st.floats(0.001, 0.05))
def test_ndvi_budget_against_the_uncertainties_library(red, nir, u_red, u_nir):
    r, n = ufloat(red, u_red * red), ufloat(nir, u_nir * nir)
    these = ndvi(red, nir, error("red_up_gain_error", u_red, "red"),
                 error("nir_up_gain_error", u_nir, "nir"))
    moved = sensitivities("ndvi", these).values()
    assert np.hypot(*moved) == pytest.approx(((n - r) / (n + r)).std_dev, rel=3e-3)


@pytest.mark.parametrize(("light", "index"), [(500, 0.822), (100, 0.765), (30, 0.617)])
def test_ndvi_of_turf_with_two_counts_left_in_the_red(light, index):
    """Red .04, near infrared .45; the true index is .837 (computed)."""
    x = {i.name: i.value for i in inputs(NDVI_REST, red_up=0.04 * light, red_down=light,
                                         nir_up=0.45 * light, nir_down=light)}
    assert MODELS["ndvi"](x) == pytest.approx(0.837, abs=0.0005)
    assert MODELS["ndvi"](x | {"red_up_zero_error": 2.0}) == pytest.approx(index, abs=0.0005)


# ---- what all models share

def test_what_belongs_to_the_pass_is_not_drawn():
    these = albedo(0.2, error("levelling_error", 0.02, "yard:pass:C1"),
                   error("up_gain_error", 0.01, "gain"))
    assert deviations("albedo", these, DRAWS, "yard:pass:C1").std() == pytest.approx(
        0.002, rel=0.01)
    assert set(sensitivities("albedo", these)) == {"levelling_error", "up_gain_error"}


def test_certain_inputs_move_nothing():
    assert not deviations("albedo", albedo(0.2), DRAWS, "").any()
