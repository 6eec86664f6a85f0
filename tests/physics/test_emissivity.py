"""Emissivity measured in the field; "computed" half-widths are those of 1e6 Monte Carlo draws."""

from __future__ import annotations

from functools import partial

import numpy as np
import pytest

from surveykit.physics.bands import band
from surveykit.physics.emissivity import (
    emissivity_of_pair,
    emissivity_of_two_backgrounds,
    foil_background,
)
from surveykit.physics.propagation import combined_u
from surveykit.physics.thermal import standoff_temperature_k

B = band(8.0, 14.0)
ICE = 273.15


def pair(contrast_k, background_k=30 + ICE, emissivity=0.95):
    surface = background_k + contrast_k
    around = float(B.radiance(background_k))
    seen = float(B.temperature_k(emissivity * B.radiance(surface) + (1 - emissivity) * around))
    u = float(B.radiance(background_k + 1) - B.radiance(background_k - 1)) / 2
    return seen, surface, around, u


@pytest.mark.parametrize(("contrast", "half_width", "tolerance"), [
    (2, 0.79, 0.05), (5, 0.15, 0.005), (10, 0.073, 0.001), (20, 0.037, 0.001),
    (30, 0.026, 0.001), (40, 0.020, 0.001)])
def test_reference_pairs_need_contrast(contrast, half_width, tolerance):
    """95 % half-width with u .3 K (surface), .2 K (reading), background 30 degC u 1 K (computed);
    by draws here, as the linear law fails for little contrast.
    """
    seen, surface, around, u = pair(contrast)
    rng = np.random.default_rng(3)
    draws = emissivity_of_pair(B, seen + 0.2 * rng.standard_normal(400_000),
                               surface + 0.3 * rng.standard_normal(400_000),
                               around + u * rng.standard_normal(400_000))
    low, high = np.quantile(draws, [0.025, 0.975])
    assert (high - low) / 2 == pytest.approx(half_width, abs=tolerance)
    if contrast >= 10:
        linear = combined_u(partial(emissivity_of_pair, B), (seen, surface, around), (0.2, 0.3, u))
        assert 1.96 * linear == pytest.approx(half_width, abs=0.0015)


@pytest.mark.parametrize(("surface", "half_width"), [(60, 0.012), (30, 0.018)])
def test_a_clear_sky_is_a_good_background(surface, half_width):
    """Sky -19 degC, u 1 K (computed)."""
    seen, known, around, u = pair(surface + 19, -19 + ICE)
    found = combined_u(partial(emissivity_of_pair, B), (seen, known, around), (0.2, 0.3, u))
    assert 1.96 * found == pytest.approx(half_width, abs=0.0006)
    assert emissivity_of_pair(B, seen, known, around) == pytest.approx(0.95, abs=1e-6)


@pytest.mark.parametrize(("lid", "scatter", "step"), [(60, 0.003, 3.1), (30, 0.005, None)])
def test_two_backgrounds(lid, scatter, step):
    """Sky -19 degC and a lid, surface 50 degC, emissivity .95; .1 K of noise, 2 K on lid and sky
    (computed).
    """
    rng = np.random.default_rng(4)
    emitted = 0.95 * B.radiance(50 + ICE)
    sky, hot = B.radiance(-19 + ICE), B.radiance(lid + ICE)
    seen = [B.temperature_k(emitted + 0.05 * around) for around in (sky, hot)]
    if step:
        assert seen[1] - seen[0] == pytest.approx(step, abs=0.05)
    n = 200_000
    draws = emissivity_of_two_backgrounds(
        *(B.radiance(t + 0.1 * rng.standard_normal(n)) for t in seen),
        *(B.radiance(t + ICE + 2 * rng.standard_normal(n)) for t in (-19, lid)))
    assert draws.mean() == pytest.approx(0.95, abs=0.0005)
    assert draws.std() == pytest.approx(scatter, abs=0.0004)


def test_alike_backgrounds_tell_nothing():
    assert np.isnan(emissivity_of_two_backgrounds(70.0, 71.0, 30.0, 30.0))


def test_a_foil_emits_too():
    """Sky -20, foil 40 degC, reflectance .96: 1.7 W m-2 sr-1 too much if ignored (computed)."""
    sky, foil = B.radiance(-20 + ICE), 40 + ICE
    seen = B.temperature_k(0.96 * sky + 0.04 * B.radiance(foil))
    assert B.radiance(seen) - sky == pytest.approx(1.7, abs=0.05)
    assert foil_background(B, seen, foil, 0.96) == pytest.approx(float(sky), rel=1e-7)
    # 3.4 K of the background's temperature, -.09 K of a surface at 50 degC, emissivity .95
    assert seen - (-20 + ICE) == pytest.approx(3.4, abs=0.05)
    read = B.temperature_k(0.95 * B.radiance(50 + ICE) + 0.05 * sky)
    wrong = standoff_temperature_k(B, read, 0.95, B.radiance(seen))
    assert wrong - (50 + ICE) == pytest.approx(-0.09, abs=0.006)
