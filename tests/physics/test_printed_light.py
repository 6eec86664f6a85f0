"""Numbers of the shortwave, index and energy methods to their printed digits: those no other file
holds so closely.

All are computed by two independent scripts that share no code with this package.
"""

from __future__ import annotations

import numpy as np
import pytest

from surveykit.physics.energy import (
    SRI_BLACK,
    SRI_WHITE,
    balance_temperature_k,
    solar_reflectance_index,
)
from surveykit.physics.footprint import (
    best_height_m,
    disc_share,
    limited_share,
    rectangle_share,
    self_shade,
    upright_share,
)
from surveykit.physics.instrument import CLASS_TERMS, head_ratio_by_swap, rod_shade
from surveykit.physics.propagation import combined_u
from surveykit.physics.shortwave import (
    daily_factor,
    directional_u,
    levelling_error,
    patch_albedo,
    ratio_of_sums,
    zenith_factor,
)
from surveykit.physics.sun import clear_sky_shape
from surveykit.physics.vegetation import ndvi, ndvi_of_sums, vegetation_fraction

# ---- the instrument

@pytest.mark.parametrize(("name", "percent"), [
    ("C", (3.5, 4.2, 6.0, 8.8)), ("A", (3.5 / 3, 4.2 / 3, 6.0 / 3, 8.8 / 3))])
def test_direction_of_a_class_in_per_cent_of_the_beam(name, percent):
    """X / (1000 cos z) at 30, 45, 60, 70 degrees; class A a third of class C (ISO 9060:2018, from
    memory)."""
    found = 100 * np.sqrt(3) * directional_u(
        [30, 45, 60, 70], CLASS_TERMS[name].directional_w_m2)
    assert found == pytest.approx(percent, abs=0.05)


@pytest.mark.parametrize(("light", "share", "error", "digit"), [
    (900, 0.08, 0.004, 5e-4), (300, 0.08, 0.0115, 5e-5), (900, 0.30, 0.005, 5e-4),
    (300, 0.30, 0.015, 5e-4)])
def test_zeros_left_in(light, share, error, digit):
    """Sky head -5, ground head +3 W m-2; .0115 is 14 % of .08."""
    read = ratio_of_sums([light * share + 3], [light - 5])
    assert read - share == pytest.approx(error, abs=digit)
    if digit == 5e-5:
        assert (read - share) / share == pytest.approx(0.14, abs=0.005)


def test_levelling_to_the_printed_digits():
    """Per cent, beam fraction .85, 2 degrees towards the sun, and 5 degrees at 45."""
    found = 100 * levelling_error([20, 30, 45, 60], 2.0, 0.0, 0.85)
    assert found == pytest.approx([1.0, 1.7, 2.9, 5.1], abs=0.05)
    assert 100 * levelling_error(45.0, 5.0, 0.0, 0.85) == pytest.approx(7.1, abs=0.05)
    there, back = levelling_error(45.0, 2.0, [0.0, 180.0], 0.85)
    assert 50 * there + 50 * back == pytest.approx(-0.05, abs=0.005)
    assert 60 * there + 40 * back == pytest.approx(0.5, abs=0.05)


def test_a_swap_with_zeros_left_in_is_still_off():
    """-3 W m-2 on both heads at 600 W m-2, albedo .2, ratio 1.04: .1961, through the sums."""
    up, down = np.full(3, 600.0), np.full(3, 120.0)
    normal = ratio_of_sums(1.04 * down - 3, up - 3)
    inverted = ratio_of_sums(down - 3, 1.04 * up - 3)
    found = head_ratio_by_swap(normal, inverted, 0.0, 0.0).reflectance
    assert found == pytest.approx(0.1961, abs=5e-5)


# ---- what a head sees and shades

def test_the_standards_own_geometry_leaves_foreign_ground():
    """Disc of 2 m radius from 50 cm .941, square of 4 m .951 (ASTM E1918's size and height, from
    memory): 5 to 6 % of foreign surface."""
    disc, square = disc_share(2.0, 0.5), rectangle_share(-2, 2, -2, 2, 0.5)
    assert disc == pytest.approx(0.941, abs=5e-4)
    assert square == pytest.approx(0.951, abs=5e-4)
    assert all(0.045 < 1 - one < 0.065 for one in (disc, square))


def test_a_head_of_half_the_view_needs_less_ground():
    """sin^2(atan(R / h)) / sin^2(phi), never above 1: 30 degrees see all of a disc that a
    hemisphere sees a quarter of (arithmetic: tan 30 = .577)."""
    radius = np.tan(np.radians(30.0))
    assert disc_share(radius, 1.0) == pytest.approx(0.25)
    assert limited_share([radius, 2 * radius], 1.0, 30.0) == pytest.approx([1.0, 1.0])


@pytest.mark.parametrize("radius", [0.25, 0.5, 1.0, 2.0])
@pytest.mark.parametrize(("zenith", "contrast"), [(30, 0.5), (30, 1.0), (45, 0.5), (60, 0.5)])
def test_the_least_sum_by_the_closed_form(radius, zenith, contrast):
    """(2 r / R) sqrt(k c) with k = f cos^4 z + (1 - f) / 3: the sum within 8 % of the numeric
    optimum, the height sqrt(r R) (k / c)^(1/4) within 6 %; r 3 cm, beam fraction f .85."""
    k = 0.85 * np.cos(np.radians(zenith)) ** 4 + 0.15 / 3
    height = best_height_m(0.03, radius, contrast, zenith, 0.85)
    least = self_shade(0.03, height, zenith, 0.85) + contrast * (1 - disc_share(radius, height))
    assert 2 * 0.03 / radius * np.sqrt(k * contrast) == pytest.approx(float(least), rel=0.08)
    assert np.sqrt(0.03 * radius) * (k / contrast) ** 0.25 == pytest.approx(height, rel=0.06)


def test_a_head_that_is_too_low_and_one_too_high():
    """A head of 3 cm at 5 cm takes 12 % at 40 degrees and 21 % at 20; .30 reads .26. From 50 cm
    over a patch of 1 m in .10 it reads .20."""
    assert self_shade(0.03, 0.05, [40.0, 20.0], 0.85) == pytest.approx([0.12, 0.21], abs=0.005)
    for height, read in ((0.05, 0.26), (0.50, 0.20)):
        seen = disc_share(0.5, height)
        lit = seen - self_shade(0.03, height, 40.0, 0.85)
        assert lit * 0.30 + (1 - seen) * 0.10 == pytest.approx(read, abs=0.005)


def test_one_centimetre_of_height_in_a_corrected_albedo():
    """+.002 by the footprint alone: .28265 measured at 12 cm over 1 m, shade .0215, .10 around."""
    low, high = (patch_albedo(0.28265, 0.10, disc_share(0.5, h), 0.0215) for h in (0.12, 0.13))
    assert high - low == pytest.approx(0.002, abs=0.0005)


@pytest.mark.parametrize(("height", "sun", "across", "away"), [
    (0.05, (13.0, 0.05), (3.4, 0.05), (1.8, 0.05)),
    (0.12, (5.5, 0.05), (1.4, 0.05), (0.76, 0.005)),
    (0.20, (3.3, 0.05), (0.8, 0.05), (0.45, 0.005)),
    (0.50, (1.3, 0.05), (0.3, 0.05), (0.18, 0.005))])
def test_shadow_of_a_rod_to_the_printed_digits(height, sun, across, away):
    """1.5 cm by 1.5 m at zenith 40, per cent; the same rod on the operator's three sides."""
    found = 100 * rod_shade(0.015, 1.5, height, 40.0, [0.0, 90.0, 180.0])
    for value, (printed, digit) in zip(found, (sun, across, away), strict=True):
        assert value == pytest.approx(printed, abs=digit)


@pytest.mark.parametrize(("distance", "sky", "ground"), [(0.6, 8, 8.6), (1.5, 1.3, 1.4)])
def test_an_operator_in_per_cent_of_either_view(distance, sky, ground):
    """A plate of .5 m by 1.75 m, head at .9 m."""
    digit = 0.5 if sky == 8 else 0.05
    assert 100 * upright_share(0.5, 1.75 - 0.9, distance) == pytest.approx(sky, abs=digit)
    assert 100 * upright_share(0.5, 0.9, distance) == pytest.approx(ground, abs=0.05)


# ---- the sun's height

@pytest.mark.parametrize(("declination", "weak", "strong"), [
    (23.44, 1.036, 1.114), (0.0, 1.028, 1.092), (-23.44, 1.016, 1.056)])
def test_energy_weighted_albedo_of_a_day_to_the_printed_digits(declination, weak, strong):
    """40 degrees north, clear sky after Haurwitz as this package has it, d .1 and .4: 2 to 11 %
    above noon."""
    hour = np.radians(np.arange(-180, 180, 0.25))
    lat, dec = np.radians(40.0), np.radians(declination)
    mu = np.sin(lat) * np.sin(dec) + np.cos(lat) * np.cos(dec) * np.cos(hour)
    found = daily_factor(np.degrees(np.arccos(mu)), clear_sky_shape(mu), 40.0 - declination,
                         [0.1, 0.4])
    assert found == pytest.approx([weak, strong], abs=5e-4)


def test_the_dependence_from_30_to_60_degrees_at_thirty_per_cent():
    """.067 of the albedo with d .1: .02 at .30."""
    rise = 0.30 * (zenith_factor(60.0, 0.1) / zenith_factor(30.0, 0.1) - 1)
    assert rise == pytest.approx(0.02, abs=5e-4)
    assert rise / 0.30 == pytest.approx(0.067, abs=5e-4)


# ---- index

def test_u_of_a_vegetation_fraction_is_smaller_than_the_two_forms_differ():
    """u(NDVI) .02 and u(bare) .03 give +- .04 at .5 between .2 and .86; the forms differ by .25."""
    def linear(index, bare):
        return vegetation_fraction(index, bare, 0.86, "linear")

    u = combined_u(linear, (0.5, 0.2), (0.02, 0.03))
    assert u == pytest.approx(0.04, abs=0.005)
    forms = [float(vegetation_fraction(0.5, 0.2, 0.86, form)) for form in ("linear", "squared")]
    assert forms[0] - forms[1] == pytest.approx(0.455 - 0.207, abs=1e-3)


def test_gain_error_of_the_index_by_its_slope():
    """-(1 - N^2) / 2 d ln(ratio): the sign, and 5 % of a ratio at .1, .5, .7, .85."""
    index = np.array([0.1, 0.5, 0.7, 0.85])
    moved = ndvi((1 - index) * 1.05, 1 + index) - index  # the red head reads 5 % more
    assert moved == pytest.approx([-0.024, -0.018, -0.012, -0.007], abs=1e-3)


def test_weak_light_over_turf():
    """Ten units of light, noise of one: index of the sums .836 +- .002 in 2e5 records, truth .837;
    two counts left in the red give .617 at 30."""
    rng, n = np.random.default_rng(8), 200_000
    red, nir = 0.4 + rng.standard_normal(n), 4.5 + rng.standard_normal(n)
    light = 10 + rng.standard_normal((2, n))
    assert ndvi_of_sums(red, light[0], nir, light[1]) == pytest.approx(0.836, abs=0.003)
    assert ndvi_of_sums([1.2 + 2], [30], [13.5], [30]) == pytest.approx(0.617, abs=5e-4)


# ---- energy

def test_reference_temperatures_of_medium_wind():
    """355.607 and 317.757 K (CODATA sigma; ASTM E1980's black .05/.90 and white .80/.90)."""
    for pair, kelvins in ((SRI_BLACK, 355.607), (SRI_WHITE, 317.757)):
        # 317.75749: its third digit is exact, its fourth is on the edge
        assert balance_temperature_k(*pair, 12.0) == pytest.approx(kelvins, abs=6e-4)


def test_slopes_of_the_index_to_the_printed_digits():
    """1.30 per .01 of reflectance, .43 per .01 of emissivity, about .30 and .90."""
    def index(reflectance, emissivity):
        return float(solar_reflectance_index(reflectance, emissivity, 12.0).balance)

    assert index(0.305, 0.90) - index(0.295, 0.90) == pytest.approx(1.30, abs=0.005)
    assert index(0.30, 0.905) - index(0.30, 0.895) == pytest.approx(0.43, abs=0.005)


@pytest.mark.parametrize("convection", [12.0, 30.0])
def test_the_equation_stays_within_two_of_the_balance(convection):
    """ASTM E1980 of its regression: largest deviation 2, mean .9. So it is with medium and strong
    wind at emissivities of .3 to .95; in weak wind its largest is 2.6 there."""
    reflectance, emissivity = np.meshgrid(np.linspace(0.1, 0.9, 17), np.linspace(0.3, 0.95, 14))
    found = solar_reflectance_index(reflectance.ravel(), emissivity.ravel(), convection)
    off = np.abs(found.balance - found.regression)
    off = off[np.isfinite(off)]
    assert off.size > 150
    assert off.max() <= 2
    assert off.mean() <= 0.9
