"""Swapped heads and the shadow of a rod ("computed": closed form and Monte Carlo rays)."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from surveykit.physics.instrument import CLASS_TERMS, head_ratio_by_swap, rod_shade
from surveykit.physics.shortwave import daily_factor, directional_u


def test_swap_worked_case():
    """Albedo .2, ratio 1.04: .208 and .19231 (computed)."""
    found = head_ratio_by_swap(0.208, 0.19231, 0.0, 0.0)
    assert found.reflectance == pytest.approx(0.2000, abs=5e-5)
    assert found.ratio == pytest.approx(1.040, abs=5e-4)


@given(st.floats(0.05, 0.9), st.floats(0.8, 1.25), st.floats(0.5, 2))
def test_swapping_removes_gains(albedo, ratio, gain):
    """Whatever either head's gain, its ratio and the albedo come back."""
    found = head_ratio_by_swap(ratio * albedo, albedo / ratio, 0.0, 0.0)
    assert found.ratio == pytest.approx(ratio)
    assert found.reflectance == pytest.approx(albedo)


def test_swapping_does_not_remove_offsets():
    """-3 W m-2 on both heads at 600 W m-2, albedo .2, ratio 1.04: .1961 (computed)."""
    up, down = 600 * 1.0, 600 * 0.2
    normal = (1.04 * down - 3) / (up - 3)
    inverted = (down - 3) / (1.04 * up - 3)
    assert head_ratio_by_swap(normal, inverted, 0, 0).reflectance == pytest.approx(0.1961, abs=5e-5)


def test_u_of_a_swap():
    """Half the quadratic sum of the relative uncertainties (hand arithmetic: 1 and 2 %)."""
    found = head_ratio_by_swap(0.2, 0.2, 0.002, 0.004)
    assert found.u == pytest.approx(0.5 * np.hypot(0.01, 0.02))


@pytest.mark.parametrize(("height", "sun", "across", "away"), [
    (0.05, 13.0, 3.4, 1.8), (0.12, 5.5, 1.4, 0.76), (0.20, 3.3, 0.8, 0.45), (0.50, 1.3, 0.3, 0.18)])
def test_shadow_of_a_rod(height, sun, across, away):
    """1.5 cm by 1.5 m at zenith 40, per cent of the beam-lit signal (computed)."""
    found = 100 * rod_shade(0.015, 1.5, height, 40.0, [0.0, 90.0, 180.0])
    assert found == pytest.approx([sun, across, away], abs=0.06)


def test_shadow_of_a_rod_against_rays():
    """Cosine-weighted rays from the head that end in the strip, 2e6 of them."""
    rng = np.random.default_rng(5)
    n, height = 2_000_000, 0.12
    radius = height * np.sqrt(1 / rng.uniform(size=n) - 1)  # tan of a cosine-weighted angle
    turn = rng.uniform(0, 2 * np.pi, n)
    x, y = radius * np.cos(turn), radius * np.sin(turn)
    shift = height * np.tan(np.radians(40.0))
    inside = (x >= -shift) & (x <= 1.5 - shift) & (np.abs(y) <= 0.0075)
    assert rod_shade(0.015, 1.5, height, 40.0, 0.0) == pytest.approx(inside.mean(), abs=5e-4)


def test_classes_of_iso_9060():
    """Directional 10/20/30 W m-2; class C at 60 degrees is 6 % of the beam (from memory)."""
    assert [CLASS_TERMS[c].directional_w_m2 for c in "ABC"] == [10, 20, 30]
    assert directional_u(60.0, CLASS_TERMS["C"].directional_w_m2) * np.sqrt(3) == pytest.approx(
        0.060, abs=5e-4)
    for name in CLASS_TERMS["A"]._fields:
        a, b, c = (getattr(CLASS_TERMS[k], name) for k in "ABC")
        assert a <= b <= c


@pytest.mark.parametrize(("declination", "weak", "strong"), [
    (23.44, 1.036, 1.114), (0.0, 1.028, 1.092), (-23.44, 1.016, 1.056)])
def test_daily_albedo_over_noon(declination, weak, strong):
    """40 degrees north, clear sky after Haurwitz (1945): d .1 and .4 (computed)."""
    hour = np.radians(np.arange(-180, 180, 0.25))
    lat, dec = np.radians(40.0), np.radians(declination)
    mu = np.sin(lat) * np.sin(dec) + np.cos(lat) * np.cos(dec) * np.cos(hour)
    up = np.maximum(mu, 1e-6)
    sun = np.where(mu > 0, 1098 * up * np.exp(-0.057 / up), 0.0)
    found = daily_factor(np.degrees(np.arccos(mu)), sun, 40.0 - declination, [0.1, 0.4])
    assert found == pytest.approx([weak, strong], abs=0.0015)
