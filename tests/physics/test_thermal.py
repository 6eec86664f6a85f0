"""Surface temperature from each kind of reading against computed tables and hand arithmetic."""

from __future__ import annotations

import numpy as np
import pytest
from checks import check, names
from hypothesis import given
from hypothesis import strategies as st

from surveykit.physics import bands, surroundings, thermal

WINDOW = bands.band(8.0, 14.0)
ZERO_C = 273.15


def brightness_k(surface_k, emissivity, background):
    """The balance forward: what a stand-off instrument reads."""
    leaving = emissivity * WINDOW.radiance(surface_k) + (1 - emissivity) * background
    return WINDOW.temperature_k(leaving)


# --- stand-off ----------------------------------------------------------------------------------

@pytest.mark.parametrize("name", names("brightness_8_14_"))
def test_brightness_check_values(name):
    one = check(name)
    surface, eps = one.input["Ts_C"] + ZERO_C, one.input["emissivity"]
    sky_k = one.input["Tsky_8_14_C"] + ZERO_C
    read = brightness_k(surface, eps, WINDOW.radiance(sky_k))
    assert read - ZERO_C == pytest.approx(one.expected["Tbrightness_C"], abs=one.tol)
    back = thermal.standoff_temperature_k(WINDOW, read, eps, WINDOW.radiance(sky_k))
    assert back == pytest.approx(surface, abs=1e-4)
    ignored = thermal.standoff_temperature_k(WINDOW, read, eps, 0.0)
    assert ignored - ZERO_C == pytest.approx(one.expected["Ts_if_sky_ignored_C"], abs=one.tol)
    fourth_power = ((read**4 - (1 - eps) * sky_k**4) / eps)**0.25
    assert fourth_power - ZERO_C == pytest.approx(one.expected["Ts_by_T4_law_C"], abs=one.tol)


def golden(brightness_c=47.0, eps=0.95, air_c=30.0, humidity=0.30, sky_factor=1.0):
    sky = sky_factor * surroundings.sky_radiance(WINDOW, np.asarray(air_c) + ZERO_C, humidity)
    return thermal.standoff_temperature_k(WINDOW, np.asarray(brightness_c) + ZERO_C, eps,
                                          sky) - ZERO_C


def test_worked_case_step_by_step():
    # computed by two scripts: T_b 47.0 degC, emissivity .95, air 30 degC, 30 %, open sky
    assert surroundings.vapour_pressure_hpa(303.15, 0.30) == pytest.approx(12.710, abs=6e-4)
    assert surroundings.sky_radiance(WINDOW, 303.15, 0.30) == pytest.approx(24.4704, abs=1e-4)
    assert WINDOW.radiance(320.15) == pytest.approx(73.3733, abs=1e-4)
    assert golden() == pytest.approx(49.567, abs=6e-4)


def test_worked_case_partial_derivatives_and_combined_uncertainty():
    # computed: contribution [K] = partial derivative x u
    rows = [("brightness_c", 47.0, 0.4, 0.413), ("eps", 0.95, 0.01, -0.535),
            ("air_c", 30.0, 1.0, -0.046), ("humidity", 0.30, 0.05, -0.108),
            ("sky_factor", 1.0, 0.15, -0.191)]
    contributions = []
    for name, value, u, expected in rows:
        step = 1e-3 * u
        slope = (golden(**{name: value + step}) - golden(**{name: value - step})) / (2 * step)
        contributions.append(slope * u)
        assert slope * u == pytest.approx(expected, abs=6e-4), name
    assert np.hypot.reduce(contributions) == pytest.approx(0.712, abs=1e-3)


def test_worked_case_monte_carlo_interval():
    # computed with 1e6 normal draws: 95 % [48.20, 50.99] +- .01
    rng = np.random.default_rng(1)
    draws = golden(*(rng.normal(m, u, 200_000) for m, u in
                     [(47, 0.4), (0.95, 0.01), (30, 1), (0.30, 0.05), (1, 0.15)]))
    np.testing.assert_allclose(np.quantile(draws, [0.025, 0.975]), [48.20, 50.99], atol=0.02)


def test_sensitivity_to_emissivity_vanishes_against_an_equally_warm_background():
    # computed [K per .01]: clear sky, background 30 degC, and surface 30 under 28 degC
    sky = surroundings.sky_radiance(WINDOW, 303.15, 0.30)
    warm, warmer = WINDOW.radiance(303.15), WINDOW.radiance(301.15)
    cases = [(50, sky, -0.54), (50, warm, -0.19), (30, warmer, -0.02)]
    for surface_c, background, expected in cases:
        read = brightness_k(surface_c + ZERO_C, 0.95, background)
        got = [thermal.standoff_temperature_k(WINDOW, read, e, background) for e in (0.945, 0.955)]
        assert got[1] - got[0] == pytest.approx(expected, abs=6e-3)


@pytest.mark.parametrize(("eps", "surface_c", "raw", "divided", "air", "broadband"), [
    # computed [K]: air 30 degC, 30 %, clear sky
    (0.98, 40, -0.90, 0.53, -0.72, -0.44), (0.95, 25, -1.77, 1.55, -2.14, -1.31),
    (0.95, 60, -2.89, 1.17, -1.60, -0.99), (0.90, 40, -4.58, 2.86, -3.99, -2.44),
    (0.90, 60, -5.83, 2.47, -3.41, -2.09), (0.85, 60, -8.85, 3.90, -5.45, -3.34)])
def test_error_of_each_shortcut(eps, surface_c, raw, divided, air, broadband):
    surface = surface_c + ZERO_C
    read = brightness_k(surface, eps, surroundings.sky_radiance(WINDOW, 303.15, 0.30))
    whole = surroundings.sky_emissivity_full(303.15, surroundings.vapour_pressure_hpa(303.15, 0.30))
    backgrounds = [0.0, WINDOW.radiance(303.15), WINDOW.radiance(303.15 * whole**0.25)]
    got = [read] + [thermal.standoff_temperature_k(WINDOW, read, eps, b) for b in backgrounds]
    np.testing.assert_allclose(np.array(got) - surface, [raw, divided, air, broadband], atol=6e-3)


def test_without_background_a_broadband_reading_is_low_by_the_fourth_root():
    # common practice, no source: 1 - emissivity^(1/4): 1.3 % at .95, 3.8 K at 300 K
    read = thermal.longwave_temperature_k(0.95 * bands.SIGMA.value * 300.0**4, 0.0, 1.0)
    assert 1 - read / 300 == pytest.approx(0.013, abs=5e-4)
    assert 300 - read == pytest.approx(3.8, abs=0.05)


def test_a_setting_in_the_instrument_is_undone():
    # property: correcting with what the instrument had set gives back what it logged
    reflected = WINDOW.radiance(295.0)
    read = thermal.brightness_without_setting(WINDOW, 320.0, 0.95, 295.0)
    assert read < 320.0
    back = thermal.standoff_temperature_k(WINDOW, read, 0.95, reflected)
    assert back == pytest.approx(320.0, abs=1e-4)
    same = thermal.brightness_without_setting(WINDOW, 320.0, 1.0, 250.0)
    assert same == pytest.approx(320.0, abs=1e-5)


@given(st.floats(250, 360), st.floats(0.6, 1.0), st.floats(5.0, 80.0))
def test_standoff_round_trip(surface, eps, background):
    read = brightness_k(surface, eps, background)
    back = thermal.standoff_temperature_k(WINDOW, read, eps, background)
    assert back == pytest.approx(surface, abs=1e-3)


# --- contact ------------------------------------------------------------------------------------

def contact_reading_k(surface, body, eps, bore):
    """Two-surface cavity in closed form: what the pressed instrument reads."""
    leaving = eps * WINDOW.radiance(surface) + (1 - eps) * bore * WINDOW.radiance(body)
    return WINDOW.temperature_k(leaving / (1 - (1 - eps) * (1 - bore)))


@pytest.mark.parametrize(("surface_c", "body_c", "eps", "bore", "effective", "error"), [
    # computed
    (60, 30, 0.95, 0.95, 0.952, -1.28), (60, 30, 0.95, 0.05, 0.997, -0.07),
    (60, 30, 0.85, 0.95, 0.856, -3.90), (60, 55, 0.95, 0.95, 0.952, -0.23),
    (25, 35, 0.95, 0.95, 0.952, 0.50)])
def test_contact_table(surface_c, body_c, eps, bore, effective, error):
    surface, body = surface_c + ZERO_C, body_c + ZERO_C
    assert eps / (1 - (1 - eps) * (1 - bore)) == pytest.approx(effective, abs=6e-4)
    read = contact_reading_k(surface, body, eps, bore)
    assert read - surface == pytest.approx(error, abs=6e-3)
    back = thermal.contact_temperature_k(WINDOW, read, eps, body, bore, 0.0, 0.0)
    assert back == pytest.approx(surface, abs=1e-4)


@pytest.mark.parametrize(("eps", "sky_on_contact", "body_on_standoff"),
                         [(0.95, 1.6, -1.6), (0.90, 3.3, -3.4), (0.85, 5.3, -5.5)])
def test_the_wrong_mode_costs_kelvins(eps, sky_on_contact, body_on_standoff):
    # computed: surface 60, body 30 degC, black bore; sky of air 30 degC, 30 %
    surface, body = 60 + ZERO_C, 30 + ZERO_C
    sky = surroundings.sky_radiance(WINDOW, 303.15, 0.30)
    pressed = contact_reading_k(surface, body, eps, 1.0)
    got = thermal.standoff_temperature_k(WINDOW, pressed, eps, sky)
    assert got - surface == pytest.approx(sky_on_contact, abs=0.06)
    apart = brightness_k(surface, eps, sky)
    got = thermal.contact_temperature_k(WINDOW, apart, eps, body, 1.0, 0.0, sky)
    assert got - surface == pytest.approx(body_on_standoff, abs=0.06)


@given(st.floats(260, 350), st.floats(260, 330), st.floats(0.6, 1.0), st.floats(0.05, 1.0),
       st.floats(0.0, 1.0))
def test_contact_with_a_gap_solves_the_cavity(surface, body, eps, bore, gap):
    # property: the radiosity found by iterating reflections between surface, bore and gap
    sky, leaving = 25.0, 0.0
    for _ in range(60):
        received = ((1 - gap) * (bore * WINDOW.radiance(body) + (1 - bore) * leaving) + gap * sky)
        leaving = eps * WINDOW.radiance(surface) + (1 - eps) * received
    read = WINDOW.temperature_k(leaving)
    back = thermal.contact_temperature_k(WINDOW, read, eps, body, bore, gap, sky)
    assert back == pytest.approx(surface, abs=1e-3)


def test_contact_held_open_is_the_standoff_balance():
    # analytic limit: a rim open all round sees the sky only
    got = thermal.contact_temperature_k(WINDOW, 320.0, 0.9, 300.0, 0.95, 1.0, 25.0)
    assert got == pytest.approx(thermal.standoff_temperature_k(WINDOW, 320.0, 0.9, 25.0), abs=1e-9)


@pytest.mark.parametrize(("effusivity", "cooling"), [
    # Carslaw & Jaeger (from memory), computed [K at 1, 5, 10, 30 s] for 600 W m-2
    (2000, [0.34, 0.76, 1.1, 1.9]), (1600, [0.42, 0.95, 1.3, 2.3]), (1300, [0.52, 1.2, 1.7, 2.9]),
    (600, [1.1, 2.5, 3.6, 6.2]), (250, [2.7, 6.1, 8.6, 15])])
def test_cooling_table(effusivity, cooling):
    got = thermal.head_cooling_k(600.0, [1.0, 5.0, 10.0, 30.0], effusivity)
    np.testing.assert_allclose(got, cooling, rtol=0.04)


def test_cooling_against_a_finite_difference_slab():
    # independent: explicit heat equation, conductivity = capacity = flux = 1 (effusivity 1)
    step, slab = 0.02, np.zeros(300)
    for _ in range(round(1.0 / (0.4 * step**2))):
        slab[1:-1] += 0.4 * (slab[2:] - 2 * slab[1:-1] + slab[:-2])
        slab[0] = (4 * slab[1] - slab[2] + 2 * step) / 3  # unit flux, second order
    assert thermal.head_cooling_k(1.0, 1.0, 1.0) == pytest.approx(slab[0], rel=2e-3)


def test_cooling_under_a_passing_cloud():
    # the same law: 60 s at -500 W m-2 cool asphalt by 3.4 K, dry fibre by 17 K (computed)
    np.testing.assert_allclose(thermal.head_cooling_k(500.0, 60.0, [1300.0, 250.0]), [3.4, 17.5],
                               atol=0.06)


# --- longwave -----------------------------------------------------------------------------------

def test_longwave_worked_by_hand():
    # computed: 330 K, emissivity .94, 400 W m-2 down -> 656.11 W m-2 up; 7.7 W m-2 per K
    assert thermal.longwave_temperature_k(656.11, 400.0, 0.94) == pytest.approx(330, abs=1e-3)
    assert thermal.longwave_temperature_k(656.11 + 7.7, 400.0, 0.94) == pytest.approx(331, abs=0.02)
    assert np.isnan(thermal.longwave_temperature_k([10.0, np.nan], 400.0, 0.94)).all()
