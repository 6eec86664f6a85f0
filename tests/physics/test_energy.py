"""Longwave up, net radiation and the solar reflectance index (ASTM E1980-11; computed)."""

from __future__ import annotations

import pytest
from checks import check, names
from hypothesis import given
from hypothesis import strategies as st
from scipy.optimize import brentq

from surveykit.physics.energy import (
    SRI_BLACK,
    SRI_WHITE,
    balance_temperature_k,
    longwave_up,
    net_radiation,
    solar_reflectance_index,
)


@pytest.mark.parametrize("name", names("sri_refs"))
def test_reference_surfaces_of_e1980(name):
    case = check(name)
    for pair, key in ((SRI_BLACK, "T_black_K"), (SRI_WHITE, "T_white_K")):
        assert balance_temperature_k(*pair, case.input["hc"]) == pytest.approx(
            case.expected[key], abs=case.tol)


@pytest.mark.parametrize("name", [n for n in names("sri_") if "refs" not in n])
def test_entries_of_e1980(name):
    case = check(name)
    found = solar_reflectance_index(case.input["reflectance"], case.input["emittance"],
                                    case.input["hc"])
    assert found.surface_k == pytest.approx(case.expected["Ts_K"], abs=case.tol)
    assert found.balance == pytest.approx(case.expected["SRI_balance"], abs=case.tol)
    assert found.regression == pytest.approx(case.expected["SRI_Eq4"], abs=case.tol)


@pytest.mark.parametrize(("reflectance", "emissivity", "balance", "equation"), [
    (0.30, 0.90, 31.87, 32.14), (0.08, 0.95, 6.41, 6.82), (0.55, 0.90, 65.18, 65.16)])
def test_further_cases_at_medium_wind(reflectance, emissivity, balance, equation):
    """Computed, CODATA sigma."""
    found = solar_reflectance_index(reflectance, emissivity, 12.0)
    assert found.balance == pytest.approx(balance, abs=0.005)
    assert found.regression == pytest.approx(equation, abs=0.005)


def test_the_equation_misses_the_standards_own_references():
    """.35 and 99.4 where the balance gives 0 and 100 (computed)."""
    black, white = (solar_reflectance_index(*pair, 12.0) for pair in (SRI_BLACK, SRI_WHITE))
    assert (black.balance, white.balance) == (pytest.approx(0, abs=1e-9), pytest.approx(100))
    assert black.regression == pytest.approx(0.35, abs=0.005)
    assert white.regression == pytest.approx(99.4, abs=0.05)


def test_slopes_of_the_index():
    """1.30 per .01 of reflectance, .43 per .01 of emissivity (computed)."""
    base = solar_reflectance_index(0.30, 0.90, 12.0).balance
    assert solar_reflectance_index(0.31, 0.90, 12.0).balance - base == pytest.approx(1.30, abs=0.02)
    assert solar_reflectance_index(0.30, 0.91, 12.0).balance - base == pytest.approx(0.43, abs=0.02)


def test_the_equation_is_refused_outside_its_range():
    assert solar_reflectance_index(0.95, 0.9, 12.0).regression != pytest.approx(0, abs=1e9)
    assert solar_reflectance_index(0.10, 0.15, 12.0).regression != pytest.approx(0, abs=1e9)


def test_longwave_and_net_radiation():
    """Albedo .1, 850 W m-2, 330 K, emissivity .94, sky 400: 656.11 and 508.89 (computed)."""
    up = longwave_up(330.0, 400.0, 0.94)
    assert up == pytest.approx(656.11, abs=0.005)
    assert net_radiation(0.1, 850.0, 400.0, up) == pytest.approx(508.89, abs=0.005)
    slope = (longwave_up(330.5, 400.0, 0.94) - longwave_up(329.5, 400.0, 0.94))
    assert slope == pytest.approx(7.7, abs=0.05)


@given(st.floats(0.0, 1.0), st.floats(0.05, 1.0), st.floats(1.0, 40.0))
def test_the_balance_is_kept_and_agrees_with_a_bracketing_solver(reflectance, emissivity, wind):
    """scipy.optimize.brentq of the standard's heat balance."""
    def gain(t):
        return (1 - reflectance) * 1000 - emissivity * 5.670374419e-8 * (t**4 - 300.0**4) \
            - wind * (t - 310)

    found = balance_temperature_k([reflectance, 0.05], emissivity, wind)
    assert found.shape == (2,)
    assert found[0] == pytest.approx(brentq(gain, 200.0, 1500.0, xtol=1e-10), abs=1e-6)
