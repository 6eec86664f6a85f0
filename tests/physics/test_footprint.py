"""Shares of the view and self-shade against closed forms, quadrature, rays and tables."""

from __future__ import annotations

import numpy as np
import pytest
from checks import check, names
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import dblquad, quad

from surveykit.physics import footprint
from surveykit.physics.walking import footprint_m

side = st.floats(-5, 5)


@pytest.mark.parametrize("name", names("vf_disc_"))
def test_disc_check_values(name):
    one = check(name)
    got = footprint.disc_share(one.input["r"], one.input["h"])
    assert got == pytest.approx(one.expected, abs=one.tol)


@pytest.mark.parametrize("name", names("vf_corner_"))
def test_corner_check_values(name):
    one = check(name)
    got = footprint.corner_share(one.input["a"], one.input["b"], one.input["h"])
    assert got == pytest.approx(one.expected, abs=one.tol)


@pytest.mark.parametrize("name", names("vf_rect_"))
def test_rectangle_check_values(name):
    one = check(name)
    got = footprint.rectangle_share(*one.input["x0x1y0y1h"])
    assert got == pytest.approx(one.expected, abs=one.tol)


@pytest.mark.parametrize("edges", [(-0.5, 0.5, -0.5, 0.5, 0.12), (-0.1, 0.9, -0.5, 0.5, 0.12),
                                   (0.3, 2.0, -1.0, -0.2, 0.5), (-2.0, 3.0, 0.0, 1.0, 1.5)])
def test_rectangle_against_double_quadrature(edges):
    # scipy.integrate.dblquad over cos^2 / (pi s^2), the head outside the rectangle included
    x0, x1, y0, y1, h = edges
    expected, _ = dblquad(lambda y, x: h**2 / (np.pi * (x**2 + y**2 + h**2)**2), x0, x1, y0, y1)
    assert footprint.rectangle_share(*edges) == pytest.approx(expected, abs=1e-7)


def test_footprint_table():
    # computed (closed form, Monte Carlo .5542): 1 m square at .05, .12, .5 m; 4 m square at .5
    got = footprint.rectangle_share(-0.5, 0.5, -0.5, 0.5, [0.05, 0.12, 0.5])
    np.testing.assert_allclose(got, [0.9919, 0.9551, 0.5541], atol=6e-5)
    assert footprint.rectangle_share(-2, 2, -2, 2, 0.5) == pytest.approx(0.9514, abs=6e-5)
    # 1 m square from .12 m: 0.1 m inside an edge, and on the edge
    off = footprint.rectangle_share([-0.1, 0.0], [0.9, 1.0], -0.5, 0.5, 0.12)
    np.testing.assert_allclose(off, [0.802, 0.485], atol=6e-4)


def test_area_rule_of_the_standard():
    # ASTM E1918 (from memory: 4 m across, .5 m up), computed: 5-6 % is foreign ground even so
    assert footprint.disc_share(2.0, 0.5) == pytest.approx(0.941, abs=6e-4)


@pytest.mark.parametrize(("share", "heights"), [(0.80, 2), (0.90, 3), (0.95, 4.36), (0.99, 9.95)])
def test_radius_needed_in_heights(share, heights):
    assert footprint.disc_share(heights, 1.0) == pytest.approx(share, abs=2e-4)  # computed


@given(side, side, side, side, st.floats(0.05, 2), st.floats(0, 1))
def test_rectangle_parts_add_up(x0, x1, y0, y1, h, at):
    # property: a rectangle cut in two; and the whole plane is 1
    cut = x0 + at * (x1 - x0)
    parts = (footprint.rectangle_share(x0, cut, y0, y1, h)
             + footprint.rectangle_share(cut, x1, y0, y1, h))
    assert parts == pytest.approx(footprint.rectangle_share(x0, x1, y0, y1, h), abs=1e-12)
    assert footprint.rectangle_share(-1e6, 1e6, -1e6, 1e6, h) == pytest.approx(1, abs=1e-9)


@pytest.mark.parametrize(("height", "circle"), [(0.05, 0.192), (0.04, 0.154)])
def test_circle_seen_by_a_wide_head(height, circle):
    # common practice, no source: full field of view 125 degrees held 5 and 4 cm up
    assert footprint_m(height, 62.5) == pytest.approx(circle, abs=6e-4)


def test_limited_view_against_quadrature():
    # independent: cosine-weighted solid angle of the disc over that of the cone
    def weight(upper):
        return quad(lambda angle: np.sin(angle) * np.cos(angle), 0, upper)[0]

    expected = weight(np.arctan(0.3 / 0.5)) / weight(np.radians(40.0))
    assert footprint.limited_share(0.3, 0.5, 40.0) == pytest.approx(expected, abs=1e-9)
    # the circle seen fills the cone and not a hair more; 90 degrees is the full hemisphere
    radius = footprint_m(0.5, 40.0) / 2
    got = footprint.limited_share([radius * 0.999, radius, 5.0], 0.5, 40.0)
    assert got[0] < 1
    np.testing.assert_allclose(got[1:], 1, atol=1e-12)
    full = footprint.limited_share(0.3, 0.5, 90.0)
    assert full == pytest.approx(footprint.disc_share(0.3, 0.5), abs=1e-12)


def test_self_shade_table():
    # computed [%], beam fraction .85, zenith 20, 30, 45, 60 deg; head radius, height [cm]
    table = {(2, 5): (10.4, 8.2, 4.3, 1.7), (3, 5): (21.1, 17.4, 9.8, 3.8),
             (5, 5): (43.5, 39.4, 27.3, 11.0), (3, 10): (6.1, 4.7, 2.4, 0.9),
             (5, 10): (15.5, 12.4, 6.8, 2.6), (3, 20): (1.6, 1.2, 0.6, 0.2),
             (3, 50): (0.26, 0.19, 0.09, 0.04)}
    for (radius, height), percent in table.items():
        got = 100 * footprint.self_shade(radius / 100, height / 100, [20, 30, 45, 60], 0.85)
        np.testing.assert_allclose(got, percent, atol=6e-3 if height == 50 else 0.06)


def test_self_shade_ray_count():
    # computed by two Monte Carlo checks: .1244 against .1242 (r 3, h 5 cm, 40 deg); own rays here
    radius, height, zenith, beam_fraction, n = 0.03, 0.05, np.radians(40.0), 0.85, 200_000
    rng = np.random.default_rng(20251)

    def directions():
        sine, turn = np.sqrt(rng.random(n)), 2 * np.pi * rng.random(n)  # cosine-weighted
        away = height * sine / np.sqrt(1 - sine**2)
        return away * np.cos(turn), away * np.sin(turn)

    ground_x, ground_y = directions()  # points the sensor sees
    sky_x, sky_y = directions()  # where light that reaches them crosses the head's level
    beam = rng.random(n) < beam_fraction
    at_x = ground_x + np.where(beam, height * np.tan(zenith), sky_x)
    at_y = ground_y + np.where(beam, 0.0, sky_y)
    counted = np.mean(at_x**2 + at_y**2 < radius**2)
    expected = float(footprint.self_shade(radius, height, 40.0, beam_fraction))
    assert expected == pytest.approx(0.1242, abs=6e-5)
    assert counted == pytest.approx(expected, abs=4 * np.sqrt(expected / n))


@pytest.mark.parametrize("ratio", [0.05, 0.6, 1.0, 5.0])
def test_diffuse_shade_against_quadrature(ratio):
    # the closed form against the integral of its definition over the ground, h = 1
    def ring(x):
        covered = (1 - (x**2 + 1 - ratio**2)
                   / np.sqrt((x**2 + 1 + ratio**2)**2 - 4 * x**2 * ratio**2)) / 2
        return 2 * x / (x**2 + 1)**2 * covered

    expected, _ = quad(ring, 0, np.inf, epsabs=1e-12, limit=200)
    assert footprint.diffuse_shade(ratio, 1.0) == pytest.approx(expected, rel=1e-6)


@pytest.mark.parametrize("zenith", [0.0, 30.0, 60.0])
def test_shade_of_a_small_head(zenith):
    # analytic limits: (r/h)^2 cos^4 z for the beam, (r/h)^2 / 3 for the sky
    small = 1e-3
    beam = footprint.beam_shade(small, 1.0, zenith) / small**2
    assert beam == pytest.approx(np.cos(np.radians(zenith))**4, rel=1e-4)
    assert footprint.diffuse_shade(small, 1.0) / small**2 == pytest.approx(1 / 3, rel=1e-4)


def test_no_head_no_shade():
    assert list(footprint.self_shade([0.0, 0.0], 0.1, 30.0, [0.0, 0.85])) == [0.0, 0.0]


def test_beam_shade_at_the_zenith_is_the_disc_itself():
    assert footprint.beam_shade(0.03, 0.05, 0.0) == pytest.approx(
        float(footprint.disc_share(0.03, 0.05)), abs=1e-12)
    assert np.isnan(footprint.beam_shade(0.03, 0.05, [90.0, 100.0, -1.0, np.nan])).all()


@pytest.mark.parametrize(("patch", "zenith", "contrast", "height_cm", "percent"), [
    # computed numeric optimum, head radius 3 cm, beam fraction .85
    (0.25, 30, 0.5, 9.2, 11.5), (0.25, 30, 1.0, 7.6, 16.4), (0.25, 45, 0.5, 7.8, 8.4),
    (0.25, 60, 0.5, 6.0, 5.3), (0.5, 30, 0.5, 12.7, 5.9), (0.5, 30, 1.0, 10.6, 8.5),
    (0.5, 45, 0.5, 10.7, 4.3), (0.5, 60, 0.5, 8.4, 2.7), (1.0, 30, 0.5, 17.8, 3.0),
    (1.0, 30, 1.0, 14.9, 4.3), (1.0, 45, 0.5, 14.9, 2.2), (1.0, 60, 0.5, 11.8, 1.4),
    (2.0, 30, 0.5, 25.0, 1.5), (2.0, 30, 1.0, 21.0, 2.2), (2.0, 45, 0.5, 21.0, 1.1),
    (2.0, 60, 0.5, 16.6, 0.7)])
def test_best_height_table(patch, zenith, contrast, height_cm, percent):
    best = footprint.best_height_m(0.03, patch, contrast, zenith, 0.85)
    assert 100 * best == pytest.approx(height_cm, abs=0.06)
    least = (footprint.self_shade(0.03, best, zenith, 0.85)
             + contrast * (1 - footprint.disc_share(patch, best)))
    assert 100 * least == pytest.approx(percent, abs=0.06)
    # closed form within 6 %: sqrt(r R) (k / c)^(1/4), k = .85 cos^4 z + .15 / 3
    k = 0.85 * np.cos(np.radians(zenith))**4 + 0.15 / 3
    assert best == pytest.approx(np.sqrt(0.03 * patch) * (k / contrast)**0.25, rel=0.06)


@pytest.mark.parametrize(("level", "distance", "sky", "ground"), [
    (0.9, 0.6, 0.08, 0.086), (0.9, 1.5, 0.013, 0.014), (0.12, 0.6, 0.11, None)])
def test_an_operator_hides_sky_and_ground(level, distance, sky, ground):
    """A plate of .5 m by 1.75 m (computed), to the digits printed."""
    digit = 5e-4 if sky < 0.05 else 5e-3
    up = footprint.upright_share(0.5, 1.75 - level, distance)
    assert up == pytest.approx(sky, abs=digit)
    if ground:
        assert footprint.upright_share(0.5, level, distance) == pytest.approx(ground, abs=6e-4)


def test_an_upright_plate_against_double_quadrature():
    """scipy.integrate.dblquad of cos cos / (pi r^2) over the plate."""
    away = 0.7

    def seen(z, y):
        r2 = away**2 + y**2 + z**2
        return z * away / (np.pi * r2**2)

    whole, _ = dblquad(seen, -0.3, 0.3, 0, 1.2)
    assert footprint.upright_share(0.6, 1.2, away) == pytest.approx(whole, rel=1e-6)
