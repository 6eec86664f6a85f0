"""Spots of tilted cones, settling of first-order heads, speed of a walk."""

from __future__ import annotations

import numpy as np
import pytest

from surveykit.physics.walking import settling_time_s, spot, spot_height_m, walking_speed_m_s


@pytest.mark.parametrize(("half", "view"), [(22.0, 0.0), (22.0, 30.0), (10.0, 60.0), (40.0, 45.0)])
def test_a_tilted_spot_against_traced_rays(half, view):
    """Independent: the cone's rays, turned by a rotation matrix, meet the ground 1.2 m below."""
    round_about = np.radians(np.arange(0, 360, 0.05))
    cone, tilt = np.radians([half, view])
    rays = np.array([np.sin(cone) * np.cos(round_about), np.sin(cone) * np.sin(round_about),
                     -np.full(round_about.size, np.cos(cone))])
    turn = np.array([[np.cos(tilt), 0, -np.sin(tilt)], [0, 1, 0], [np.sin(tilt), 0, np.cos(tilt)]])
    x, y, z = turn @ rays
    ahead, aside = x / -z * 1.2, y / -z * 1.2
    found = spot(1.2, half, view)
    assert found.length_m == pytest.approx(np.ptp(ahead), rel=1e-5)
    assert found.width_m == pytest.approx(np.ptp(aside), rel=1e-5)
    assert found.ahead_m == pytest.approx((ahead.max() + ahead.min()) / 2, rel=1e-5, abs=1e-12)


def test_a_cone_that_looks_above_the_horizon_has_no_spot():
    assert spot(1.0, 30.0, 60.0).length_m == np.inf
    assert spot_height_m(4.0, 30.0, 1 / 3, 60.0) == 0.0


@pytest.mark.parametrize(("left", "constants"), [(11.0, 1.0), (1.5, 3.0), (0.1, 5.7), (0.5, 4.1)])
def test_what_is_left_of_a_step_of_30_k(left, constants):
    """Computed by two scripts: 11 K after one time constant, 1.5 K after three; 0.1 K after 5.7,
    0.5 K after 4.1 (the printed digits are of the time or of the rest)."""
    time = settling_time_s(30.0, left, 7.0)
    assert time / 7.0 == pytest.approx(constants, abs=0.05)
    assert settling_time_s(0.05, 0.1, 7.0) == 0.0


@pytest.mark.parametrize(("tau", "metres"), [(1.0, 1.5), (7.0, 10.5)])
def test_how_far_a_walk_smears(tau, metres):
    """Computed: three time constants at 0.5 m/s."""
    assert walking_speed_m_s(metres, tau) == pytest.approx(0.5)
