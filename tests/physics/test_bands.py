"""Black-body and band radiance against published and computed tables, astropy and quadrature."""

from __future__ import annotations

import csv

import astropy.units as units
import numpy as np
import pytest
from astropy.modeling.models import BlackBody
from checks import DATA, check, names
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad

from surveykit.physics import bands

WINDOW = bands.band(8.0, 14.0)
ZERO_C = 273.15


def test_stefan_boltzmann_constant_codata():
    one = check("sigma")
    assert pytest.approx(one.expected, abs=one.tol) == bands.SIGMA.value


def test_radiation_constants_codata_2022():
    # CODATA 2022 (exact): c1L = 1.191042972e-16 W m2 sr-1, c2 = 1.438776877e-2 m K
    assert pytest.approx(1.191042972e8, rel=1e-9) == bands.C1L.value
    assert pytest.approx(14387.76877, rel=1e-9) == bands.C2.value


def test_planck_radiance_check_value():
    one = check("planck_radiance")
    got = bands.planck_radiance(one.input["um"], one.input["K"])
    assert got == pytest.approx(one.expected, abs=one.tol)


@pytest.mark.parametrize("t_k", [200.0, 300.0, 400.0])
def test_planck_radiance_against_astropy(t_k):
    um = np.array([3.0, 8.0, 10.0, 14.0, 40.0])
    body = BlackBody(t_k * units.K, scale=1.0 * units.Unit("W m-2 sr-1 um-1"))
    expected = body(um * units.um).to_value("W m-2 sr-1 um-1")
    np.testing.assert_allclose(bands.planck_radiance(um, t_k), expected, rtol=1e-9)


@pytest.mark.parametrize("name", names("bb_fraction_"))
def test_blackbody_fraction_check_values(name):
    one = check(name)
    got = bands.blackbody_fraction(one.input["lambdaT_um_K"])
    assert got == pytest.approx(one.expected, abs=one.tol)


def handbook():
    """Incropera & DeWitt table 12.1 = Siegel & Howell, beside values computed by two methods."""
    with (DATA / "blackbody_fraction.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    columns = [np.array([float(row[name]) for row in rows])
               for name in ("lambdaT_um_K", "F_exact", "F_handbook")]
    return (*columns, np.array([row["handbook_misprint"] == "True" for row in rows]))


def test_blackbody_fraction_computed_table():
    product, exact, _, _ = handbook()
    np.testing.assert_allclose(bands.blackbody_fraction(product), exact, atol=1e-6, rtol=0)


def test_blackbody_fraction_handbook_table_without_its_misprints():
    product, _, printed, misprint = handbook()
    error = printed - bands.blackbody_fraction(product)
    assert np.abs(error[~misprint]).max() < 6e-5
    # three misprints of the handbook, each .0010 too high
    assert list(product[misprint]) == [5200, 11500, 15000]
    np.testing.assert_allclose(error[misprint], 0.0010, atol=6e-5)


def test_blackbody_fraction_at_its_ends_and_across_its_two_series():
    np.testing.assert_allclose(bands.blackbody_fraction([0.0, 10.0, 1e12]), [0, 0, 1], atol=1e-12)
    assert np.isnan(bands.blackbody_fraction([-1.0, np.nan])).all()
    join = bands.C2.value * np.array([1 - 1e-12, 1 + 1e-12])
    below, above = bands.blackbody_fraction(join)
    assert above - below == pytest.approx(0, abs=1e-11)


@pytest.mark.parametrize("name", names("band_8_14_radiance_"))
def test_band_radiance_check_values(name):
    one = check(name)
    band = bands.band(*map(float, one.input["band_um"]))
    assert band.radiance(one.input["K"]) == pytest.approx(one.expected, abs=one.tol)


def test_band_radiance_table():
    # computed: series and quadrature; L [W m-2 sr-1] and n = dlnL/dlnT for 8-14 um
    t = np.array([-40, -20, 0, 20, 30, 40, 50, 60, 70, 80]) + ZERO_C
    radiance = [15.1893, 23.8247, 35.1520, 49.3729, 57.6105, 66.6132, 76.3864, 86.9320, 98.2490,
                110.3336]
    exponent = [5.66, 5.28, 4.95, 4.67, 4.54, 4.41, 4.30, 4.19, 4.09, 3.99]
    np.testing.assert_allclose(WINDOW.radiance(t), radiance, atol=6e-5)
    step = 1e-3
    got = np.log(WINDOW.radiance(t * (1 + step)) / WINDOW.radiance(t * (1 - step))) / (2 * step)
    np.testing.assert_allclose(got, exponent, atol=6e-3)


@pytest.mark.parametrize("edges", [(8.0, 14.0), (7.5, 13.0), (3.0, 5.0), (10.0, 11.0)])
@pytest.mark.parametrize("t_k", [100.0, 220.0, 300.0, 360.0, 600.0])
def test_band_radiance_against_quadrature(edges, t_k):
    # scipy.integrate.quad over Planck's law; 100 and 600 K lie outside the table
    expected, _ = quad(lambda um: float(bands.planck_radiance(um, t_k)), *edges, epsabs=0)
    assert bands.Band(*edges).radiance(t_k) == pytest.approx(expected, rel=1e-6)


def test_band_temperature_is_exact_to_far_below_a_millikelvin():
    t = np.linspace(150, 500, 4321)[1:-1]
    exact = bands.band_radiance(8.0, 14.0, t)
    np.testing.assert_allclose(WINDOW.temperature_k(exact), t, atol=1e-5)
    np.testing.assert_allclose(WINDOW.radiance(t), exact, rtol=1e-7)


@given(st.floats(151, 499), st.floats(2, 20), st.floats(0.5, 10))
def test_band_round_trip(t_k, low, width):
    band = bands.band(round(low), round(low) + round(width) + 1)
    assert band.temperature_k(band.radiance(t_k)) == pytest.approx(t_k, abs=1e-3)


def test_band_refuses_what_is_no_temperature_or_radiance():
    assert np.isnan(WINDOW.radiance([0.0, -5.0, np.nan])).all()
    assert np.isnan(WINDOW.temperature_k([0.0, -1.0, np.nan, 1e-6, 1e6])).all()
    for edges in [(14.0, 8.0), (0.0, 8.0), (np.nan, 8.0)]:
        with pytest.raises(ValueError, match="0 < low_um < high_um"):
            bands.Band(*edges)
    assert bands.band(8.0, 14.0) is WINDOW


@pytest.mark.parametrize("response", [
    ((8.0, 1.0),), ((8.0, 1.0), (13.0, 1.0)), ((8.0, 1.0), (8.0, 1.0), (14.0, 1.0)),
    ((8.0, -0.1), (14.0, 1.0)), ((8.0, 0.0), (14.0, 0.0)), ((14.0, 1.0), (8.0, 1.0))])
def test_a_response_must_ascend_from_edge_to_edge(response):
    with pytest.raises(ValueError, match="a response needs ascending wavelengths"):
        bands.Band(8.0, 14.0, response)


@pytest.mark.parametrize("t_k", [230.0, 300.0, 360.0])
def test_a_triangle_against_quadrature(t_k):
    """scipy.integrate.quad of Planck's law times a triangle; inverted within a millikelvin."""
    def weighted(um):
        return float(np.interp(um, [7.5, 10.5, 14.5], [0, 1, 0]) * bands.planck_radiance(um, t_k))

    triangle = bands.band(7.5, 14.5, ((7.5, 0.0), (10.5, 1.0), (14.5, 0.0)))
    expected = quad(weighted, 7.5, 14.5, points=[10.5], epsabs=0)[0]
    assert triangle.radiance(t_k) == pytest.approx(expected, rel=1e-6)
    assert triangle.temperature_k(expected) == pytest.approx(t_k, abs=1e-3)
