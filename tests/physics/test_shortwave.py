"""Albedo, limits and instrument terms against published limits and computed tables."""

from __future__ import annotations

import numpy as np
import pvlib
import pytest
from checks import check, names
from hypothesis import given
from hypothesis import strategies as st

from surveykit.physics import footprint, shortwave


def test_ratio_of_sums_worked_by_hand():
    one = check("albedo_u")
    got = shortwave.ratio_of_sums([one.input["up"]], [one.input["down"]])
    assert got == pytest.approx(one.expected["albedo"], abs=one.tol)
    # (10 + 90) / (100 + 300), not the mean of .1 and .3
    assert shortwave.ratio_of_sums([10.0, 90.0], [100.0, 300.0]) == 0.25


def test_ratio_of_sums_leaves_out_half_records():
    up, down = [20.0, np.nan, 60.0, 5.0], [100.0, 900.0, 300.0, np.nan]
    assert shortwave.ratio_of_sums(up, down) == pytest.approx(0.2, abs=1e-15)


def test_ratio_of_sums_is_refused_in_the_dark():
    # SURFRAD (NOAA), Alamosa, 2016-01-01 04:00-06:00 UTC: two negative offsets would give .31
    assert np.isnan(shortwave.ratio_of_sums([-0.64] * 3, [-2.05] * 3))
    assert np.isnan(shortwave.ratio_of_sums([], []))
    with pytest.raises(ValueError, match="one series"):
        shortwave.ratio_of_sums([1.0, 2.0], [1.0])


@given(st.lists(st.tuples(st.floats(0, 1000), st.floats(1, 1400)), min_size=1, max_size=30),
       st.floats(0.1, 10))
def test_ratio_of_sums_scales_with_the_gain(pairs, gain):
    up, down = np.array(pairs).T
    scaled = shortwave.ratio_of_sums(gain * up, down)
    assert scaled == pytest.approx(gain * shortwave.ratio_of_sums(up, down), rel=1e-9)


def test_limits_check_values():
    one = check("bsrn_limits")
    got = shortwave.shortwave_limits(one.input["mu0"], one.input["Sa"])
    expected = one.expected
    assert got.down_possible == pytest.approx(expected["ghi_ppl"], abs=one.tol)
    assert got.down_rare == pytest.approx(expected["ghi_erl"], abs=one.tol)
    assert got.up_possible == pytest.approx(expected["swup_ppl"], abs=one.tol)
    assert got.up_rare == pytest.approx(expected["swup_erl"], abs=one.tol)
    assert [got.down_min_possible, got.down_rare_min] == expected["sw_min"]


def test_limits_table():
    # Long & Shi 2008, computed at zenith 0, 30, 60, 75 deg for 1361 W m-2; upward at 30 deg
    got = shortwave.shortwave_limits(np.cos(np.radians([0, 30, 60, 75])), 1361.0)
    np.testing.assert_allclose(got.down_possible, [2141.5, 1818, 989, 503], atol=0.6)
    np.testing.assert_allclose(got.down_rare, [1683, 1424, 761, 373], atol=0.6)
    assert got.up_possible[1] == pytest.approx(1424, abs=0.6)
    assert got.up_rare[1] == pytest.approx(1195, abs=0.6)


def test_limits_below_the_horizon_are_those_at_the_horizon():
    night = shortwave.shortwave_limits([-0.5, 0.0], [1361.0, 1361.0])
    assert list(night.down_possible) == [100.0, 100.0]
    assert list(night.up_rare) == [50.0, 50.0]
    assert night.down_min_possible.shape == (2,)


@pytest.mark.parametrize("name", names("albedo_zenith_"))
def test_zenith_factor_check_values(name):
    one = check(name)
    got = one.input["albedo_60"] * shortwave.zenith_factor(one.input["zenith"], one.input["d"])
    np.testing.assert_allclose(got, one.expected, atol=one.tol)


@pytest.mark.parametrize(("d", "ratio"), [(0.1, 1.067), (0.15, 1.095), (0.4, 1.209)])
def test_zenith_factor_from_30_to_60_degrees(d, ratio):
    # Dickinson 1983 form, computed
    got = shortwave.zenith_factor(60.0, d) / shortwave.zenith_factor(30.0, d)
    assert got == pytest.approx(ratio, abs=6e-4)


def test_levelling_table():
    # computed, beam fraction .85, leaning towards the sun [%]
    got = shortwave.levelling_error([20, 30, 45, 60], 2.0, 0.0, 0.85)
    np.testing.assert_allclose(100 * got, [1.0, 1.7, 2.9, 5.1], atol=0.06)
    assert 100 * shortwave.levelling_error(45.0, 5.0, 0.0, 0.85) == pytest.approx(7.1, abs=0.06)


@pytest.mark.parametrize("turn", [0.0, 70.0, 180.0])
def test_levelling_against_pvlib_incidence(turn):
    # independent: pvlib.irradiance.aoi_projection of a plane tilted by 3 deg
    beam = pvlib.irradiance.aoi_projection(3.0, 150.0 + turn, 40.0, 150.0)
    expected = 0.85 * (beam / np.cos(np.radians(40.0)) - 1)
    assert shortwave.levelling_error(40.0, 3.0, turn, 0.85) == pytest.approx(expected, abs=1e-12)


def test_there_and_back_lanes_cancel_the_tilt():
    # computed [%]: 2 deg at 45 deg, 50/50 -> -.05, 60/40 -> +.5
    there, back = shortwave.levelling_error(45.0, 2.0, [0.0, 180.0], 0.85)
    assert 50 * there + 50 * back == pytest.approx(-0.05, abs=6e-3)
    assert 60 * there + 40 * back == pytest.approx(0.5, abs=0.06)


def test_directional_table():
    # ISO 9060:2018 (from memory), class C 30 W m-2: bound in % of the horizontal beam
    got = np.sqrt(3) * 100 * shortwave.directional_u([30, 45, 60, 70], 30.0)
    np.testing.assert_allclose(got, [3.5, 4.2, 6.0, 8.8], atol=0.06)
    class_a = shortwave.directional_u(45.0, 10.0)
    assert class_a == pytest.approx(shortwave.directional_u(45.0, 30.0) / 3, rel=1e-12)


def test_patch_albedo_worked_case():
    # computed: up-looking 812 + 4, down-looking 172 - 1.5, head ratio 1.012
    measured = shortwave.ratio_of_sums([172 - 1.5], [812 + 4.0]) / 1.012
    assert measured == pytest.approx(0.206468, abs=6e-7)
    patch = shortwave.patch_albedo(measured, 0.10, 0.9455, 0.0215)
    assert patch == pytest.approx(0.217552, abs=6e-7)


def test_patch_albedo_sensitivities():
    # computed: .28265 -> .3000; d/d(around) -.059; self-shade 20 % more +.0014
    def patch(around=0.10, shade=0.0215):
        return shortwave.patch_albedo(0.28265, around, 0.9455, shade)

    assert patch() == pytest.approx(0.3000, abs=6e-5)
    assert (patch(around=0.11) - patch(around=0.09)) / 0.02 == pytest.approx(-0.059, abs=6e-4)
    assert patch(shade=0.0215 * 1.2) - patch() == pytest.approx(0.0014, abs=6e-5)


def test_too_low_and_too_high_both_read_dark():
    # computed: .30 in .10, patch radius .5, head radius .03 m, zenith 40 deg, beam fraction .85
    height = np.array([0.05, 0.10, 0.12, 0.20, 0.30, 0.50])
    seen = footprint.disc_share(0.5, height)
    shade = footprint.self_shade(0.03, height, 40.0, 0.85)
    read = (seen - shade) * 0.30 + (1 - seen) * 0.10
    np.testing.assert_allclose(read, [0.261, 0.283, 0.283, 0.270, 0.246, 0.200], atol=6e-4)
    np.testing.assert_allclose(shortwave.patch_albedo(read, 0.10, seen, shade), 0.30, atol=1e-12)


def test_patch_albedo_is_refused_without_a_lit_footprint():
    assert np.isnan(shortwave.patch_albedo(0.2, 0.1, 0.3, 0.3))
