"""Sky and walls in the thermal band against the published forms and computed tables."""

from __future__ import annotations

import numpy as np
import pytest
from checks import check, names
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import dblquad

from surveykit.physics import bands, surroundings, thermal

WINDOW = bands.band(8.0, 14.0)


@pytest.mark.parametrize("name", names("sky_"))
def test_sky_emissivity_check_values(name):
    one = check(name)
    t, e = one.input["Ta_K"], one.input["e_hPa"]
    zenith = surroundings.sky_emissivity_window(t, e)
    assert zenith == pytest.approx(one.expected["idso_8_14_zenith"], abs=one.tol)
    hemi = surroundings.hemispheric_emissivity(zenith)
    assert hemi == pytest.approx(one.expected["8_14_hemispheric"], abs=one.tol)
    whole = surroundings.sky_emissivity_full(t, e)
    assert whole == pytest.approx(one.expected["idso1981_full"], abs=one.tol)


@pytest.mark.parametrize(
    ("air_c", "humidity", "e", "zenith", "hemi", "full", "zenith_c", "hemi_c", "broad_c"), [
        # computed: air [degC], humidity -> e [hPa], emissivities, equivalent sky [degC]
        (10, 0.50, 6.13, 0.285, 0.366, 0.773, -49.6, -39.6, -7.7),
        (20, 0.50, 11.67, 0.353, 0.444, 0.816, -34.2, -23.9, 5.5),
        (30, 0.30, 12.71, 0.336, 0.425, 0.807, -29.7, -18.7, 14.1),
        (30, 0.50, 21.18, 0.505, 0.605, 0.878, -10.0, -0.4, 20.3),
        (30, 0.80, 33.89, 0.920, 0.949, 0.984, 24.5, 26.6, 28.8)])
def test_sky_table(air_c, humidity, e, zenith, hemi, full, zenith_c, hemi_c, broad_c):
    air = air_c + 273.15
    vapour = surroundings.vapour_pressure_hpa(air, humidity)
    assert vapour == pytest.approx(e, abs=6e-3)
    found = surroundings.sky_emissivity_window(air, vapour)
    whole = surroundings.sky_emissivity_full(air, vapour)
    got = [found, surroundings.hemispheric_emissivity(found), whole]
    np.testing.assert_allclose(got, [zenith, hemi, full], atol=6e-4)
    got_c = [WINDOW.temperature_k(found * WINDOW.radiance(air)),
             WINDOW.temperature_k(surroundings.sky_radiance(WINDOW, air, humidity)),
             air * whole**0.25]
    np.testing.assert_allclose(np.array(got_c) - 273.15, [zenith_c, hemi_c, broad_c], atol=0.06)


def test_vapour_pressure_at_20_degrees():
    # WMO-No. 8 / Smithsonian tables (from memory): 23.37-23.39 hPa over water at 20 degC
    assert surroundings.vapour_pressure_hpa(293.15, 1.0) == pytest.approx(23.38, abs=0.06)


def test_idso_constant_belongs_to_hectopascals():
    # trap: 2.98e-8 with hPa, 2.98e-6 with kPa, 2.98e-12 with Pa are one formula (Idso 1981)
    ours = surroundings.sky_emissivity_window(293.15, 15.0)
    for constant, vapour in [(2.98e-6, 1.5), (2.98e-12, 1500.0)]:
        assert ours == pytest.approx(0.24 + constant * vapour**2 * np.exp(3000 / 293.15), abs=1e-12)
    # a vapour pressure handed over in another unit shows at once: all but dry, or above 1
    assert surroundings.sky_emissivity_window(293.15, 1.5) == pytest.approx(0.24, abs=0.002)
    assert surroundings.sky_emissivity_window(293.15, 1500.0) > 1


@given(st.floats(273, 320), st.floats(0.0, 1.0))
def test_sky_is_never_brighter_than_the_air(air, humidity):
    # property: the zenith form runs past 1 above about 35 hPa; the radiance does not
    sky = surroundings.sky_radiance(WINDOW, air, humidity)
    assert 0 < sky <= WINDOW.radiance(air) * (1 + 1e-12)


@pytest.mark.parametrize(("view", "error"), [(0.7, 1.2), (0.4, 2.4)])
def test_open_sky_assumed_between_walls(view, error):
    # computed: emissivity .92, surface 50, black walls 45 degC; sky of air 30 degC, 30 %
    sky = surroundings.sky_radiance(WINDOW, 303.15, 0.30)
    both = surroundings.background_radiance(WINDOW, sky, view, 318.15, 1.0)
    read = WINDOW.temperature_k(0.92 * WINDOW.radiance(323.15) + 0.08 * both)
    wrong = thermal.standoff_temperature_k(WINDOW, read, 0.92, sky)
    assert wrong - 323.15 == pytest.approx(error, abs=0.06)
    right = thermal.standoff_temperature_k(WINDOW, read, 0.92, both)
    assert right == pytest.approx(323.15, abs=1e-4)


@pytest.mark.parametrize(("eps", "error"), [(0.95, 0.15), (0.85, 0.5)])
def test_an_operator_in_view(eps, error):
    # computed: an operator at 34 degC (black) fills 8 % of the view; surface 50 degC
    sky = surroundings.sky_radiance(WINDOW, 303.15, 0.30)
    both = surroundings.background_radiance(WINDOW, sky, 0.92, 307.15, 1.0)
    read = WINDOW.temperature_k(eps * WINDOW.radiance(323.15) + (1 - eps) * both)
    wrong = thermal.standoff_temperature_k(WINDOW, read, eps, sky)
    assert wrong - 323.15 == pytest.approx(error, abs=0.03)


def test_background_limits():
    # analytic limits: an open sky is the sky; mirror walls show sky; black walls fill the view
    assert surroundings.background_radiance(WINDOW, 25.0, 1.0, 310.0, 0.9) == pytest.approx(25.0)
    assert surroundings.background_radiance(WINDOW, 25.0, 0.3, 310.0, 0.0) == pytest.approx(25.0)
    walls = surroundings.background_radiance(WINDOW, 25.0, 0.0, 310.0, 1.0)
    assert walls == pytest.approx(WINDOW.radiance(310.0))


@pytest.mark.parametrize("elevation", [0.0, 20.0, 45.0, 90.0])
def test_sky_view_below_an_even_horizon(elevation):
    """Analytic: a cone of sky around the zenith weighs cos^2 of the horizon's elevation."""
    share = surroundings.sky_view_of_horizon(np.full(8, elevation))
    assert share == pytest.approx(np.cos(np.radians(elevation)) ** 2)


def test_sky_view_beside_a_wall_against_quadrature():
    """Independent: cosine-weighted dblquad over the sky above a wall that takes half the round."""
    def over(azimuth_from, azimuth_to, horizon):
        return dblquad(lambda e, _: np.sin(e) * np.cos(e) / np.pi, azimuth_from, azimuth_to,
                       horizon, np.pi / 2)[0]

    expected = over(0, np.pi, np.radians(35.0)) + over(np.pi, 2 * np.pi, 0.0)
    share = surroundings.sky_view_of_horizon([35, 35, 35, 35, 0, 0, 0, 0])
    assert share == pytest.approx(expected, abs=1e-9)
