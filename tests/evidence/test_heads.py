"""What belongs to heads: a tabulated response, two loggers' clocks, direction by the sun's height.
"""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import (
    DAY_SCOPE,
    HEADS,
    UNTOUCHED,
    albedo,
    changed,
    changed_column,
    inputs,
    made,
    stand_off,
)
from pass_values import albedo as albedo_inputs
from pass_values import bright, channel_of, evaluate, parameters, pooled, sensitivities
from small_survey import CERTAIN, DAY, NDVI, lines, readings

from surveykit.core import Input, InputError
from surveykit.evidence.conditions import Day
from surveykit.evidence.handing import from_frames, to_frames
from surveykit.evidence.heads import directional_inputs
from surveykit.evidence.models import window_of
from surveykit.intake.clocks import Clock, Piece
from surveykit.statistics.alignment import Line
from surveykit.statistics.draws import Draws

# ---- a tabulated response

RESPONSE = [[7.0, 0.0], [8.5, 1.0], [12.0, 0.8], [15.0, 0.0]]
PLANCK_C1L, PLANCK_C2 = 1.191042972397e8, 14387.768775  # CODATA 2022


def weighted_radiance(t_k):
    """Planck's law over the response, summed at 20,001 wavelengths (trapezium)."""
    at, response = np.array(RESPONSE).T
    um = np.unique(np.concatenate([np.linspace(at[0], at[-1], 20_001), at]))
    spectral = PLANCK_C1L / um**5 / np.expm1(PLANCK_C2 / (um * t_k))
    return np.trapezoid(np.interp(um, at, response) * spectral, um)


def test_a_stated_response_is_the_band_of_the_pass(tmp_path):
    """A surface at 50 degC, emissivity .95, under a sky as its own model has it."""
    kit = changed("thermal", band_um=None, band_response=RESPONSE)
    flat = stand_off(tmp_path / "flat")
    one = stand_off(tmp_path / "own", kit=kit)
    assert one.evaluated, one.note
    window = window_of({i.name: i.value for i in one.inputs})
    for t_k in (230.0, 300.0, 360.0):
        assert float(window.temperature_k(weighted_radiance(t_k))) == pytest.approx(t_k, abs=1e-3)
    assert 0.002 < abs(one.value - flat.value) < 0.2
    assert one.value == pytest.approx(evaluate("stand-off", one.inputs), rel=1e-6)


def test_the_response_goes_on_to_the_next_notebook_and_into_the_budget(tmp_path):
    one = stand_off(tmp_path, kit=changed("thermal", band_um=None, band_response=RESPONSE))
    (again,) = from_frames(to_frames([one]), (one.this,))
    assert window_of({i.name: i.value for i in again.inputs}).response == tuple(
        (um, value) for um, value in RESPONSE)
    (group,) = pooled([one, again], campaign=f"yard-{DAY}")
    assert group.result is not None
    assert group.value == pytest.approx(one.value)


def test_a_head_without_band_or_response_has_no_temperature(tmp_path):
    assert stand_off(tmp_path, kit=changed("thermal", band_um=None)).note == (
        "band_um of thermal, target is missing")


@pytest.mark.parametrize(("kit", "told"), [
    ({"band_response": RESPONSE}, "got 4 points beside band_um"),  # the kit's own band stays
    ({"band_um": None, "band_response": RESPONSE[::-1]}, "wavelengths rising"),
    ({"band_um": None, "band_response": [[8.0, 1.0]]}, "got 1 points"),
    ({"band_um": None, "band_response": [[8.0, 0.0], [14.0, 0.0]]}, "one above")])
def test_a_response_that_is_none_is_refused_with_what_to_write(tmp_path, kit, told):
    with pytest.raises(InputError, match=told) as refused:
        stand_off(tmp_path, kit=changed("thermal", **kit))
    assert "thermal.band_response" in refused.value.faults[0]


# ---- clocks of two loggers against each other

@pytest.mark.parametrize(("skew_s", "percent"), [(0.2, 0.6), (1.0, 2.9), (5.0, 14.0)])
def test_a_ramp_and_a_skew(skew_s, percent):
    """20 W m-2 s-1 at 700 W m-2 (computed): .6, 2.9 and 14 % of the ratio, to first order."""
    these = [Input(name, value, u, "x", "") for name, value, u in (
        *((i.name, i.value, 0.0) for i in albedo_inputs(0.2)),
        ("down_per_s", -20 / 700, 0.0), ("clock_skew_s", 0.0, 1e-3))]
    a_second = sensitivities("albedo", these)["clock_skew_s"] / 1e-3 / 0.2
    assert 100 * skew_s * abs(a_second) == pytest.approx(percent, abs=0.05 if skew_s < 5 else 0.5)


@pytest.mark.parametrize("tau", [10.0, 0.0])
def test_a_slow_head_lags_a_ramp(tmp_path, tau):
    """A cloud ramp of 10 W m-2 s-1 leaves a head of 10 s behind by 100 W m-2 (computed); with the
    ground head fast, an albedo of .2 at some 800 W m-2 reads .2 x 800 / 700 before it is made up
    for."""
    light = 800.0 + 10.0 * (np.arange(160) - 80.0)  # of the middle, and of all at once
    kit = changed_column("pair", "sky", time_constant_s=tau)
    one = albedo(tmp_path, kit=kit, logs={"pair": lines(
        "pair", sky=light - 10.0 * tau, ground=0.2 * light)}, settings=CERTAIN | UNTOUCHED | {
            "passes": {"sheet_u_s": 0.0, "settle_time_constants": 1.0}})
    assert one.evaluated, one.note
    seen = inputs(one)["down"].value
    if tau:
        assert inputs(one)["lag_s"].value * inputs(one)["down_per_s"].value * seen == \
            pytest.approx(100.0, rel=1e-3)
        assert one.value_raw == pytest.approx(0.2 * (seen + 100) / seen, rel=0.01)
        assert dict(one.steps)["lag of the heads"] == pytest.approx(0.2, rel=0.01)
    else:
        assert "lag of the heads" not in dict(one.steps)
    assert one.value == pytest.approx(0.2, rel=0.01)


def ramped(root, red=0.0, nir=0.0, clock_u_s=0.5):
    """Light that changes by these shares of itself a second, on two loggers."""
    at = np.arange(160) - 79.5
    sky = {band: readings(f"rednir-sky.{band}", 160, 1) * (1 + rate * at)
           for band, rate in (("red", red), ("nir", nir))}
    ground = {band: readings(f"rednir-ground.{band}", 160, 1) * (1 + rate * at)
              for band, rate in (("red", red), ("nir", nir))}
    return made(root, NDVI, *HEADS, clock_u_s=clock_u_s, logs={
        "rednir-sky": lines("rednir-sky", **sky), "rednir-ground": lines("rednir-ground",
                                                                         **ground)})


def test_a_skew_moves_an_index_by_what_the_bands_do_unlike(tmp_path):
    """(1 - N^2) / 2 times the difference of the rates times hypot(.5, .5) s (hand arithmetic)."""
    one = ramped(tmp_path / "a", red=2e-3, nir=-2e-3)
    i = inputs(one)
    assert i["red_down_per_s"].value == pytest.approx(2e-3, rel=0.05)
    assert i["nir_down_per_s"].value == pytest.approx(-2e-3, rel=0.05)
    assert i["clock_skew_s"].u == pytest.approx(np.hypot(0.5, 0.5))
    assert i["clock_skew_s"].scope == f"{DAY_SCOPE}:rednir-ground:rednir-sky:clocks"
    want = (1 - one.value**2) / 2 * 4e-3 * np.hypot(0.5, 0.5)
    assert abs(sensitivities("ndvi", one.inputs)["clock_skew_s"]) == pytest.approx(want, rel=0.05)
    alike = sensitivities("ndvi", ramped(tmp_path / "b", red=2e-3, nir=2e-3).inputs)
    assert abs(alike["clock_skew_s"]) < 0.1 * want


def clock(name, u_s, **more):
    """A clock known to u_s; with `reference` aligned with that other clock, so well."""
    piece = Piece(0, 10**15, 0, Line(0.0, 0.0, 0.0, u_s**2, 0.0), (0, 10**15))
    return Clock(name, "", 0.0, u_s, 0.0, "ok", "", pieces=(piece,), **more)


def test_two_clocks_against_each_other():
    """Declared: both u. Aligned one with the other: that fit alone. By covers: both u against the
    watch, whose own u drops out; one so and one against UTC: the watch counts as well (2 s).
    """
    sky = clock("sky", 0.3)
    assert sky.u_between(clock("ground", 0.4), 1e9, 2.0) == pytest.approx(0.5)
    aligned = clock("ground", 0.05, reference=sky)
    assert aligned.u_between(sky, 1e9, 2.0) == sky.u_between(aligned, 1e9, 2.0) == (
        pytest.approx(0.05))
    covered = clock("ground", 0.4, to_watch=True)
    assert covered.u_between(clock("sky", 0.3, to_watch=True), 1e9, 2.0) == pytest.approx(0.5)
    assert covered.u_between(sky, 1e9, 2.0) == pytest.approx(np.hypot(0.5, 2.0))


def test_one_logger_has_no_skew(tmp_path):
    assert "clock_skew_s" not in inputs(albedo(tmp_path))


# ---- direction by the sun's height

def direction(zenith_deg):
    day = Day(parameters(), {}, None, None)
    return directional_inputs(day, channel_of("pair")["shortwave_down"], zenith_deg)


def drawn(zenith_deg):
    draws = Draws(4, 40_000)
    return sum(i.u * draws.standard(i.scope, i.distribution) for i in direction(zenith_deg))


@pytest.mark.parametrize("zenith", [0.0, 10.0, 23.0, 45.0, 59.9])
def test_the_error_is_as_large_as_the_class_allows_whatever_the_height(zenith):
    """Class B: .85 * 20 / (1000 cos z) / sqrt 3 (hand arithmetic)."""
    want = 0.85 * 20 / 1000 / np.cos(np.radians(zenith)) / np.sqrt(3)
    assert np.linalg.norm([i.u for i in direction(zenith)]) == pytest.approx(want, rel=1e-9)
    assert drawn(zenith).std() == pytest.approx(want, rel=0.02)


@pytest.mark.parametrize(("one", "other", "low", "high"), [
    (40.0, 40.0, 1.0, 1.0), (41.0, 42.0, 0.98, 1.0), (40.0, 44.0, 0.75, 0.80),
    (40.0, 50.0, -0.02, 0.02), (20.0, 45.0, -0.02, 0.02)])
def test_it_is_shared_between_suns_of_one_height_only(one, other, low, high):
    """The products of the shares: sqrt(.9 * .8) + sqrt(.1 * .2) at 41 and 42 degrees."""
    assert low <= np.corrcoef(drawn(one), drawn(other))[0, 1] <= high + 1e-12


def change_u(zenith_then, zenith_now):
    """Standard deviation of the change of an albedo of .3 that only this error moves."""
    moved = [next(iter(bright(
        name, {"court": 0.3}, shared=tuple(direction(zenith)), u=1e-6).groups.values())).result
        for name, zenith in (("june", zenith_then), ("july", zenith_now))]
    return (moved[1].systematic - moved[0].systematic).std()


def test_a_change_between_dates_keeps_it_unless_the_sun_stood_alike():
    alike, apart = change_u(40.0, 40.0), change_u(20.0, 42.0)
    assert alike == pytest.approx(0.0, abs=1e-6)
    each = [0.3 * 0.85 * 0.02 / np.cos(np.radians(z)) / np.sqrt(3) for z in (20.0, 42.0)]
    assert apart == pytest.approx(np.hypot(*each), rel=0.02)
