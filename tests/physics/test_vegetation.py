"""Indices and emissivity from cover against published forms and computed tables."""

from __future__ import annotations

import numpy as np
import pytest
from checks import check, names
from hypothesis import given
from hypothesis import strategies as st

from surveykit.physics import vegetation

reflectance = st.floats(0.005, 0.9)


def test_indices_check_values():
    one = check("indices")
    red, nir = one.input["red"], one.input["nir"]
    assert vegetation.ndvi(red, nir) == pytest.approx(one.expected["ndvi"], abs=one.tol)
    got = vegetation.savi(red, nir, one.input["L"])
    assert got == pytest.approx(one.expected["savi"], abs=one.tol)


def test_ndvi_worked_case():
    # computed: incoming 100/120, reflected 4.2/55, head ratios 1.03/.98
    red = vegetation.reflectance_factor(4.2, 100.0, 1.03)
    nir = vegetation.reflectance_factor(55.0, 120.0, 0.98)
    assert red == pytest.approx(0.040777, abs=6e-7)
    assert nir == pytest.approx(0.467687, abs=6e-7)
    assert vegetation.ndvi(red, nir) == pytest.approx(0.83961, abs=6e-6)
    raw = [vegetation.reflectance_factor(up, down, 1.0) for up, down in [(4.2, 100), (55, 120)]]
    assert vegetation.ndvi(*raw) == pytest.approx(0.83211, abs=6e-6)


@pytest.mark.parametrize(("percent", "expected"), [(5, [0.024, 0.018, 0.012, 0.007]),
                                                   (10, [0.047, 0.036, 0.024, 0.013])])
def test_error_of_the_head_ratio(percent, expected):
    # computed for NDVI .1, .5, .7, .85: the ratio of the two bands' head ratios is off
    index = np.array([0.1, 0.5, 0.7, 0.85])
    red, nir, factor = 1 - index, 1 + index, (1 + percent / 100)**0.5
    got = vegetation.ndvi(red, nir * factor) - vegetation.ndvi(red, nir / factor)
    np.testing.assert_allclose(got, expected, atol=6e-4)


@given(reflectance, reflectance, st.floats(0.1, 10))
def test_ndvi_ignores_a_common_gain(red, nir, gain):
    got = vegetation.ndvi(gain * red, gain * nir)
    assert got == pytest.approx(vegetation.ndvi(red, nir), abs=1e-12)
    assert -1 <= got <= 1


def test_ndvi_of_nothing_is_missing():
    got = vegetation.ndvi([0.0, -0.1, np.nan, 0.1], [0.0, 0.05, 0.4, np.nan])
    assert np.isnan(got).all()
    assert np.isnan(vegetation.reflectance_factor([1.0, 1.0], [0.0, -2.0], 1.0)).all()


def test_index_of_the_patch_is_not_the_mean_index():
    # computed: half bright soil (.30/.36), half turf (.04/.45)
    red, nir, sun = np.array([0.30, 0.04]), np.array([0.36, 0.45]), np.ones(2)
    assert vegetation.ndvi(red, nir).mean() == pytest.approx(0.464, abs=6e-4)
    assert vegetation.ndvi_of_sums(red, sun, nir, sun) == pytest.approx(0.409, abs=6e-4)


def test_index_of_sums_survives_weak_light():
    # computed: turf at 10 units of light with noise 1: ratio of sums .836 +- .002, truth .837
    rng = np.random.default_rng(3)
    n = 200_000
    red_up, nir_up = 0.4 + rng.normal(size=n), 4.5 + rng.normal(size=n)
    light = 10.0 + rng.normal(size=(2, n))
    sums = vegetation.ndvi_of_sums(red_up, light[0], nir_up, light[1])
    assert sums == pytest.approx(0.837, abs=0.004)
    records = vegetation.ndvi(red_up / light[0], nir_up / light[1])
    assert np.nanstd(records) > 0.5  # heavy tails: the mean of these is worth nothing


@pytest.mark.parametrize(("light", "expected"), [(500, 0.822), (100, 0.765), (30, 0.617)])
def test_dark_offset_in_red(light, expected):
    # computed: the same turf with 2 counts too many in reflected red; truth .837
    assert vegetation.ndvi_of_sums([0.04 * light], [light], [0.45 * light], [light]) == (
        pytest.approx(0.837, abs=6e-4))
    got = vegetation.ndvi_of_sums([0.04 * light + 2], [light], [0.45 * light], [light])
    assert got == pytest.approx(expected, abs=6e-4)


def test_index_of_sums_leaves_out_half_records_in_all_four():
    got = vegetation.ndvi_of_sums([10, np.nan, 10], [100, 100, 100], [30, 90, np.nan],
                                  [100, 100, 100])
    assert got == pytest.approx(0.5, abs=1e-12)  # (.3 - .1) / (.3 + .1) of the first record
    with pytest.raises(ValueError, match="one series"):
        vegetation.ndvi_of_sums([1.0], [1.0], [1.0, 2.0], [1.0, 2.0])


def test_savi_is_not_free_of_brightness_without_cover():
    # computed: one soil dry (.30/.36) and wet (.15/.18)
    red, nir = np.array([0.30, 0.15]), np.array([0.36, 0.18])
    np.testing.assert_allclose(vegetation.ndvi(red, nir), 0.091, atol=6e-4)
    np.testing.assert_allclose(vegetation.savi(red, nir, 0.5), [0.078, 0.054], atol=6e-4)
    np.testing.assert_allclose(vegetation.savi(red, nir, 0.0), vegetation.ndvi(red, nir))


def test_cover_and_emissivity_by_both_forms():
    # computed: NDVI .5 between .2 and .86 (Gutman & Ignatov 1998; Carlson & Ripley 1997)
    for form, fraction, emissivity in [("linear", 0.455, 0.968), ("squared", 0.207, 0.958)]:
        got = vegetation.vegetation_fraction(0.5, 0.2, 0.86, form)
        assert got == pytest.approx(fraction, abs=6e-4)
        mixed = vegetation.emissivity_mixed(got, 0.99, 0.95)
        assert mixed == pytest.approx(emissivity, abs=6e-4)


def test_cover_is_cut_and_refused():
    np.testing.assert_array_equal(
        vegetation.vegetation_fraction([0.1, 0.95], 0.2, 0.86, "linear"), [0, 1])
    assert np.isnan(vegetation.vegetation_fraction(0.5, 0.86, 0.2, "linear"))
    with pytest.raises(ValueError, match="'linear' or 'squared', got 'cubic'"):
        vegetation.vegetation_fraction(0.5, 0.2, 0.86, "cubic")


@pytest.mark.parametrize("name", names("vdg_owe_"))
def test_emissivity_logarithmic_check_values(name):
    one = check(name)
    got = vegetation.emissivity_logarithmic(one.input["ndvi"])
    assert got == pytest.approx(one.expected, abs=one.tol)


def test_emissivity_logarithmic_is_not_the_misprint():
    # Van de Griend & Owe 1993: 1.0094; with the misprinted 1.094 all vegetation exceeds 1
    assert vegetation.emissivity_logarithmic(0.7) < 1 < 1.094 + 0.047 * np.log(0.7)
    assert np.isnan(vegetation.emissivity_logarithmic([-0.1, 0.0, 0.1, 0.8, np.nan])).all()


@pytest.mark.parametrize("name", names("sobrino_"))
def test_emissivity_mixed_check_values(name):
    one = check(name)
    fraction = vegetation.vegetation_fraction(one.input["ndvi"], one.input["ndvi_soil"],
                                              one.input["ndvi_veg"], "squared")
    got = vegetation.emissivity_mixed(fraction, 0.990, 0.986)
    assert got == pytest.approx(one.expected, abs=one.tol)
