"""The fit that leads a contact reading back to before the touch.

"Computed": first-order response solved in closed form by one script and by an ordinary differential
equation solver in the other.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from surveykit.physics.cooling import first_described, fit_placements, root_time
from surveykit.physics.thermal import head_cooling_k

T = np.arange(0, 15, 0.2)  # 15 s at 5 Hz


def response(tau, rate=0.52, before=60.0, start=25.0, t=T):
    return (before - rate * root_time(t, tau, True)
            + (start - before) * np.exp(-t / tau))


@pytest.mark.parametrize("tau", [0.5, 1.0, 2.0])
def test_a_first_order_heads_course_against_a_solver(tau):
    """scipy.integrate.solve_ivp of tau dT/dt = 60 - .52 sqrt(t) - T."""
    solved = solve_ivp(lambda t, y: (60 - 0.52 * np.sqrt(t) - y) / tau, (0, 15), [25.0], t_eval=T,
                       rtol=1e-9, atol=1e-9).y[0]
    assert response(tau) == pytest.approx(solved, abs=1e-5)


@pytest.mark.parametrize(("tau", "found", "scatter"), [
    (0.5, 60.11, 0.03), (1.0, 60.19, 0.06), (2.0, 60.33, 0.24)])
def test_plain_law_with_the_time_constant_fitted(tau, found, scatter):
    """Noise-free values and scatter with .05 K of noise (computed)."""
    plain = {"time_constant_s": tau, "fit_time_constant": True, "lagged": False}
    clean = fit_placements([T], [response(tau)], **plain)
    assert clean.mean_k == pytest.approx(found, abs=0.005)
    rng = np.random.default_rng(1)
    noisy = [fit_placements([T], [response(tau) + 0.05 * rng.standard_normal(T.size)], **plain)
             for _ in range(120)]
    assert np.std([f.mean_k for f in noisy]) == pytest.approx(scatter, rel=0.25)
    assert np.mean([f.u_mean_k for f in noisy]) == pytest.approx(scatter, rel=0.25)


@pytest.mark.parametrize("tau", [0.5, 1.0, 2.0])
def test_the_lagged_law_has_no_bias(tau):
    found = fit_placements([T], [response(tau)], time_constant_s=tau, fit_time_constant=False,
                           lagged=True)
    assert found.mean_k == pytest.approx(60.0, abs=1e-6)
    assert found.rate == pytest.approx(0.52, abs=1e-6)


def test_the_last_seconds_are_the_wrong_ones():
    """Mean of the last 5 s: 58.2 (computed)."""
    assert response(0.5)[T >= 10].mean() == pytest.approx(58.2, abs=0.05)


def test_the_rate_is_that_of_a_semi_infinite_solid():
    """2 q / (e sqrt pi): the fit of a course of `head_cooling_k` gives its flux back."""
    found = fit_placements([T[5:]], [330 - head_cooling_k(600.0, T[5:], 1300.0)],
                           time_constant_s=0.0, fit_time_constant=False, lagged=False)
    assert found.rate == pytest.approx(2 * 600 / 1300 / np.sqrt(np.pi), rel=1e-9)


def test_placements_share_their_rate_and_keep_their_levels():
    levels = np.array([50.0, 52.0, 47.0])
    found = fit_placements([T] * 3, [response(0.5, before=v) for v in levels], time_constant_s=0.5,
                           fit_time_constant=False, lagged=True)
    assert found.before_k == pytest.approx(levels, abs=1e-6)
    assert found.mean_k == pytest.approx(levels.mean(), abs=1e-6)


def test_standard_errors_are_those_of_the_scatter():
    rng = np.random.default_rng(2)
    t = np.arange(0, 7, 0.5)
    fits = [fit_placements([t] * 4, [response(0.3, t=t) + 0.08 * rng.standard_normal(t.size)
                                     for _ in range(4)], time_constant_s=0.3,
                           fit_time_constant=False, lagged=True) for _ in range(300)]
    assert np.std([f.mean_k for f in fits]) == pytest.approx(
        np.mean([f.u_mean_k for f in fits]), rel=0.15)


def test_too_few_records_are_refused():
    with pytest.raises(ValueError, match="unknowns need as many records"):
        fit_placements([T[:5]], [response(0.5)[:5]], time_constant_s=0.5, fit_time_constant=False,
                       lagged=True)


@pytest.mark.parametrize("touch", [3.0, 3.1, 3.3, 3.45])
def test_the_touch_is_found_within_a_step(touch):
    """A head swung through the air, then put down: 2 Hz, tau .3 s, .08 K of noise."""
    rng = np.random.default_rng(round(100 * touch))
    fine = np.arange(0, 10, 0.01)
    seen = np.where(fine < touch, 320 - 15 * np.sin(np.pi * fine / touch),
                    320 - 0.6 * np.sqrt(np.clip(fine - touch, 0, None)))
    read, memory = [seen[0]], np.exp(-0.01 / 0.3)
    for value in seen[1:]:
        read.append(memory * read[-1] + (1 - memory) * value)
    t = fine[::50]
    log = np.array(read)[::50] + 0.08 * rng.standard_normal(t.size)
    first = first_described(t, log, 12, time_constant_s=0.3, tolerance_k=0.2)
    assert touch - 0.5 <= t[first] <= touch + 0.5
