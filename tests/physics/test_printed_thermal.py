"""Numbers of the thermal methods to their printed digits: those no other file holds so closely.

All are computed by two independent scripts that share no code with this package, unless a line says
otherwise. Clear sky: air at 30 degC, 30 % humidity, hemispheric form.
"""

from __future__ import annotations

import numpy as np
import pytest

from surveykit.intake.params.settings import Settings
from surveykit.physics.bands import SIGMA, band
from surveykit.physics.cooling import fit_placements, root_time
from surveykit.physics.emissivity import emissivity_of_pair
from surveykit.physics.surroundings import (
    background_radiance,
    sky_emissivity_full,
    sky_radiance,
    vapour_pressure_hpa,
)
from surveykit.physics.thermal import (
    head_cooling_k,
    longwave_temperature_k,
    standoff_temperature_k,
)

B = band(8.0, 14.0)
ICE = 273.15
SKY = float(sky_radiance(B, 303.15, 0.30))


def seen_k(surface_c, emissivity, around=SKY):
    """What a stand-off instrument reads: the balance forward."""
    return float(B.temperature_k(emissivity * B.radiance(surface_c + ICE)
                                 + (1 - emissivity) * around))


def error_k(surface_c, emissivity, wrong, around=SKY):
    """What a wrong background does to a surface temperature."""
    read = seen_k(surface_c, emissivity, around)
    return float(standoff_temperature_k(B, read, emissivity, wrong)) - surface_c - ICE


# ---- stand-off

@pytest.mark.parametrize(("emissivity", "surface_c", "least", "most"), [
    (0.95, 40, 0.03, 0.11), (0.95, 50, 0.03, 0.11), (0.95, 60, 0.03, 0.11),
    (0.85, 40, 0.0, 0.3), (0.85, 50, 0.0, 0.3), (0.85, 60, 0.0, 0.3)])
def test_a_fourth_root_in_place_of_the_band_is_not_the_main_error(
        emissivity, surface_c, least, most):
    """.03 to .11 K at emissivity .95, up to .3 K at .85."""
    read, sky_k = seen_k(surface_c, emissivity), float(B.temperature_k(SKY))
    up, down = SIGMA.value * read**4, SIGMA.value * sky_k**4
    off = abs(float(longwave_temperature_k(up, down, emissivity)) - surface_c - ICE)
    assert least - 0.005 <= off <= most + (0.05 if most == 0.3 else 0.005)


@pytest.mark.parametrize(("emissivity", "kelvins"), [(0.95, 0.19), (0.90, 0.40)])
def test_what_the_u_of_a_modelled_sky_costs(emissivity, kelvins):
    """15 % of the sky's radiance, surface at 50 degC."""
    moved = [error_k(50, emissivity, SKY * share) for share in (0.85, 1.15)]
    assert (moved[0] - moved[1]) / 2 == pytest.approx(kelvins, abs=0.005)


@pytest.mark.parametrize(("emissivity", "surface_c", "kelvins"), [
    (0.95, 60, -1.0), (0.95, 25, -1.3), (0.90, 60, -2.1), (0.90, 25, -2.8)])
def test_a_broadband_sky_in_the_band(emissivity, surface_c, kelvins):
    """-1.0 to -1.3 K at emissivity .95, -2.1 to -2.8 K at .90 (surface 60 to 25 degC)."""
    whole = sky_emissivity_full(303.15, vapour_pressure_hpa(303.15, 0.30))
    broadband = B.radiance(303.15 * whole**0.25)
    assert error_k(surface_c, emissivity, broadband) == pytest.approx(kelvins, abs=0.05)


@pytest.mark.parametrize(("emissivity", "kelvins", "digit"), [
    (0.95, 0.15, 0.005), (0.85, 0.5, 0.05)])
def test_an_operator_over_the_ground(emissivity, kelvins, digit):
    """At 34 degC, over 8 % of the view, surface at 50 degC: taken for sky."""
    both = float(background_radiance(B, SKY, 0.92, 34 + ICE, 1.0))
    assert error_k(50, emissivity, SKY, around=both) == pytest.approx(kelvins, abs=digit)


@pytest.mark.parametrize(("surface_c", "around", "by_reading", "by_background"), [
    (50, SKY, 1.03, -0.026), (50, float(B.radiance(30 + ICE)), 1.05, -0.045),
    (30, float(B.radiance(28 + ICE)), 1.05, -0.052)])
def test_slopes_of_the_surface_temperature(surface_c, around, by_reading, by_background):
    """1.03 to 1.05 by the reading, -.026 to -.052 by the background's temperature, both K per K,
    emissivity .95; the middle case lies between (its own digits: this package's)."""
    read, sky_k = seen_k(surface_c, 0.95, around), float(B.temperature_k(around))
    found = [float(standoff_temperature_k(B, read + a, 0.95, B.radiance(sky_k + b)))
             for a, b in ((0.01, 0), (-0.01, 0), (0, 0.01), (0, -0.01))]
    assert (found[0] - found[1]) / 0.02 == pytest.approx(by_reading, abs=0.005)
    assert (found[2] - found[3]) / 0.02 == pytest.approx(by_background, abs=0.0005)


@pytest.mark.parametrize(("emissivity", "kelvins"), [(0.95, -1.6), (0.90, -3.4), (0.85, -5.5)])
def test_the_body_taken_for_the_background_of_a_stand_off_reading(emissivity, kelvins):
    """Surface 60, body 30 degC."""
    assert error_k(60, emissivity, B.radiance(30 + ICE)) == pytest.approx(kelvins, abs=0.05)


def test_an_emissivity_off_by_the_form_of_the_vegetation_fraction():
    """.968 or .958, as the form of the fraction has it: .5 K at 50 degC."""
    read = seen_k(50, 0.958)
    off = float(standoff_temperature_k(B, read, 0.968, SKY)) - 50 - ICE
    assert abs(off) == pytest.approx(0.5, abs=0.05)


def test_the_mean_of_the_radiances_is_another_mean():
    """Two thirds of the ground at 35 and one third at 55 degC: 42.0 degC by radiance, where the
    mean of the temperatures is 41.7 degC; .4 K apart."""
    by_radiance = float(B.temperature_k((2 * B.radiance(35 + ICE) + B.radiance(55 + ICE)) / 3))
    assert by_radiance - ICE == pytest.approx(42.0, abs=0.05)
    assert by_radiance - ICE - (2 * 35 + 55) / 3 == pytest.approx(0.4, abs=0.05)


# ---- emissivity from pairs: 95 % half-width, surface known to .3 K, reading to .2 K

@pytest.mark.parametrize(("contrast", "half_width", "digit"), [
    (2, 0.79, 0.006), (5, 0.15, 0.005), (10, 0.073, 0.0015), (20, 0.037, 0.001),
    (30, 0.026, 0.001), (40, 0.020, 0.001)])
def test_half_widths_of_a_pair_against_a_warm_background(contrast, half_width, digit):
    """Background 30 degC, u 1 K; Monte Carlo, +- .001 (for 2 K: two digits of a wide law)."""
    n, rng = 1_000_000, np.random.default_rng(11)
    around_k, known = 30 + ICE, 30 + contrast
    read = seen_k(known, 0.95, float(B.radiance(around_k)))
    u = float(B.radiance(around_k + 1) - B.radiance(around_k - 1)) / 2
    draws = emissivity_of_pair(
        B, read + 0.2 * rng.standard_normal(n), known + ICE + 0.3 * rng.standard_normal(n),
        B.radiance(around_k) + u * rng.standard_normal(n))
    low, high = np.quantile(draws, [0.025, 0.975])
    assert (high - low) / 2 == pytest.approx(half_width, abs=digit)


def test_how_sure_a_pair_must_be_of_its_thermometer():
    """30 K of contrast with that background is what it takes for .026: below the limit of .03;
    20 K, with .037, above it (engineering default)."""
    limit = Settings().temperature.pair_max_half_width
    widths = []
    for contrast in (20, 30):
        around_k = 30 + ICE
        read = seen_k(30 + contrast, 0.95, float(B.radiance(around_k)))
        u = float(B.radiance(around_k + 1) - B.radiance(around_k - 1)) / 2
        slopes = [float(np.ptp(emissivity_of_pair(
            B, read + a, around_k + contrast + b, B.radiance(around_k) + c))) / 2
            for a, b, c in ((np.array([-0.2, 0.2]), 0, 0), (0, np.array([-0.3, 0.3]), 0),
                            (0, 0, np.array([-u, u])))]
        widths.append(1.96 * float(np.linalg.norm(slopes)))
    assert widths == pytest.approx([0.037, 0.026], abs=0.001)
    assert widths[1] < limit < widths[0]


# ---- contact

@pytest.mark.parametrize(("effusivity", "cooling", "digits"), [
    (2000, (0.34, 0.76, 1.1, 1.9), (0.005, 0.005, 0.05, 0.05)),
    (1600, (0.42, 0.95, 1.3, 2.3), (0.005, 0.005, 0.05, 0.05)),
    (1300, (0.52, 1.2, 1.7, 2.9), (0.005, 0.05, 0.055, 0.05)),
    (600, (1.1, 2.5, 3.6, 6.2), (0.05, 0.05, 0.05, 0.05)),
    (250, (2.7, 6.1, 8.6, 15), (0.05, 0.05, 0.05, 0.5))])
def test_cooling_under_the_head_to_the_printed_digits(effusivity, cooling, digits):
    """600 W m-2, after 1, 5, 10 and 30 s; the law by Carslaw & Jaeger (from memory). The 1.7 K of
    asphalt after 10 s is 1.647."""
    found = head_cooling_k(600.0, [1.0, 5.0, 10.0, 30.0], effusivity)
    assert np.all(np.abs(found - cooling) <= digits), found


def test_a_change_of_light_that_asphalt_remembers():
    """150 W m-2 for 2 min: 1.4 K, the limit of the irradiance history; 60 s of cloud, -500 W m-2:
    3.4 K of asphalt, 17 K of dry fibre."""
    assert head_cooling_k(150.0, 120.0, 1300.0) == pytest.approx(1.4, abs=0.05)
    assert head_cooling_k(500.0, 60.0, 1300.0) == pytest.approx(3.4, abs=0.05)
    assert head_cooling_k(500.0, 60.0, 250.0) == pytest.approx(17, abs=0.5)


T = np.arange(0, 15, 0.2)  # 15 s at 5 Hz, a head of 25 degC put down on ground at 60


def course(tau):
    return 60 - 0.52 * root_time(T, tau, lagged=True) - 35 * np.exp(-T / tau)


@pytest.mark.parametrize(("tau", "bias_free", "scatter"), [
    (0.5, 60.11, 0.03), (1.0, 60.19, 0.06), (2.0, 60.33, 0.24)])
def test_the_estimator_before_the_touch(tau, bias_free, scatter):
    """Time constant fitted too: value without noise, and scatter with .05 K of noise, in 400
    courses (their own error of it is 3.5 %)."""
    plain = {"time_constant_s": tau, "fit_time_constant": True, "lagged": False}
    assert fit_placements([T], [course(tau)], **plain).mean_k == pytest.approx(bias_free, abs=0.005)
    rng = np.random.default_rng(1)
    fits = [fit_placements([T], [course(tau) + 0.05 * rng.standard_normal(T.size)], **plain)
            for _ in range(400)]
    assert np.std([f.mean_k for f in fits]) == pytest.approx(scatter, abs=0.01)
    assert np.mean([f.u_mean_k for f in fits]) == pytest.approx(scatter, abs=0.01)
    assert course(tau)[T >= 10].mean() == pytest.approx(58.2, abs=0.05)  # "the settled value"
