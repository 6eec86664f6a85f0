"""The worked temperature and albedo cases from raw files to the budget of their surface.

Contributions are "computed": two independent scripts that share no code with this package.
"""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import changed, changed_column, stand_off
from pass_values import pooled
from small_survey import CERTAIN, DAY, KIT, SITE, lines, row, small

from surveykit.physics.sun import sun_track

CALM = np.resize([1.0, -1.0], 160)
NS = 1_000_000_000


def budget(estimate):
    (group,) = pooled([estimate], campaign=f"yard-{DAY}")
    return {r["source"]: r["contribution"] for r in group.budget}, group


# ---- 47.0 degC, emissivity .95, air 30 degC, humidity 30 %, open sky: 49.567 degC

U = {"air_temperature_u_k": 1.0, "relative_humidity_u": 0.05, "sky_radiance_u": 0.15}
TEMPERATURE = {"calibration offset of thermal, target": 0.413,
               "emissivity of the surface (invented)": 0.535, "air temperature, logged": 0.046,
               "relative humidity, logged": 0.108, "modelled clear-sky radiance in the band": 0.191}


@pytest.fixture(scope="module")
def warm(tmp_path_factory):
    weather = lines("weather", n=5, step_s=60, air=30 + 0.001 * np.resize([1, -1], 5),
                    humidity=30 + 0.01 * np.resize([1, -1], 5))
    return stand_off(
        tmp_path_factory.mktemp("warm"),
        logs={"weather": weather, "thermal": lines("thermal", target=47 + 0.01 * CALM)},
        kit=changed_column("thermal", "target", u_offset=0.4),
        site=SITE | {"sky_view": {"value": 1.0, "u": 0.0}}, settings=CERTAIN | {"temperature": U})


@pytest.mark.parametrize("source", TEMPERATURE)
def test_each_source_of_the_worked_temperature(warm, source):
    assert budget(warm)[0][source] == pytest.approx(TEMPERATURE[source], rel=0.05)


def test_the_worked_temperature_and_its_whole_uncertainty(warm):
    """49.567 degC, u_c .712 K, and no source beside the five that weighs."""
    found, group = budget(warm)
    assert group.value - 273.15 == pytest.approx(49.567, abs=0.002)
    assert group.u_at_least == pytest.approx(0.712, rel=0.02)
    assert max(c for s, c in found.items() if s not in TEMPERATURE) < 0.02


# ---- sky head 812, ground head 172, darks -4 and 1.5 W m-2, gain ratio 1.012, disc of 1 m with the
# head (radius 3 cm) 12 cm above it, sun 40 degrees from the zenith, .10 around: .217552

CLOSE = {"quantity": "albedo", "height_cm": "12", "length_m": "1"}
# contribution, the u it belongs to, and the u that this way through has
ALBEDO_CASE = {
    "zero of pair, sky (dark readings)": (0.00055, 2.0, 2.0),
    "zero of pair, ground (dark readings)": (0.0013, 1.0, 2.0 / 3),  # a third of the sky head's
    "calibration gain of pair, ground": (0.0013, 0.006, 0.006),
    "share of the view that the patch fills": (0.0013, 0.01, 0.01),
    "shade of the head on the ground": (0.0012, 0.005, 0.005),
    "albedo around the patch, as stated": (0.0012, 0.02, 0.02)}


def when_the_sun_stands(zenith_deg):
    """Return the second of the morning at which the sun is that far from the zenith."""
    start = np.datetime64(f"{DAY}T06:00:00", "ns").astype(np.int64)
    time = start + np.arange(6 * 3600, dtype=np.int64) * NS
    sun = sun_track(time, SITE["latitude"], SITE["longitude"], SITE["elevation_m"])
    return 6 * 3600 + int(np.argmin(np.abs(sun.zenith_deg - zenith_deg)))


def clock(second):
    return f"{second // 3600:02d}:{second // 60 % 60:02d}:{second % 60:02d}"


@pytest.fixture(scope="module")
def bright(tmp_path_factory):
    noon = when_the_sun_stands(40.0)
    columns = {"sky": KIT["pair"]["columns"]["sky"] | {
        "unit": "mV", "gain": 1.0, "offset": 0.0, "u_gain": 0.0},
        "ground": KIT["pair"]["columns"]["ground"] | {
            "unit": "mV", "gain": 1 / 1.012, "offset": 0.0, "u_gain": 0.006}}
    capped = np.arange(160) < 15
    log = lines("pair", start=clock(noon - 80), sky=np.where(capped, -4, 812) + 0.002 * CALM,
                ground=np.where(capped, 1.5, 172) + 0.002 * CALM)
    sheet = [row(**CLOSE | {"start": clock(noon - 60), "stop": clock(noon + 60)}),
             row(entry="dark", instrument="pair", start=clock(noon - 78), stop=clock(noon - 68))]
    (one,) = small(
        tmp_path_factory.mktemp("bright"), sheet, {"pair": log},
        kit=changed("pair", columns=columns, head_radius_cm=3.0),
        surfaces={"court": {"label": "Court", "around": {"albedo": 0.10, "u": 0.02}}},
        settings=CERTAIN | {"albedo": {
            "zero_offset_u_w_m2": 2.0, "footprint_u": 0.01, "self_shade_u": 0.005 / 0.0215,
            "height_u_cm": 0.0}}).estimates()
    return one


@pytest.mark.parametrize("source", ALBEDO_CASE)
def test_each_source_of_the_worked_albedo(bright, source):
    contribution, u, used = ALBEDO_CASE[source]
    assert budget(bright)[0][source] * u / used == pytest.approx(contribution, rel=0.05)


def test_the_worked_albedo_step_by_step(bright):
    """.206468 with darks and gains, .217552 with footprint .9455 and shade .0215."""
    steps, inputs = dict(bright.steps), {i.name: i.value for i in bright.inputs}
    assert steps["dark readings"] == pytest.approx(0.206468, abs=2e-6)
    assert inputs["footprint_share"] == pytest.approx(0.9455, abs=5e-5)
    assert inputs["shade_share"] == pytest.approx(0.0215, abs=1e-4)
    assert bright.value == pytest.approx(0.217552, abs=3e-5)


def test_the_worked_albedos_whole_uncertainty(bright):
    """The six sources and a second time G 2 and D 1 W m-2, which here are the zeros': .0032 by
    Monte Carlo; "plus directional (shared)".
    """
    found, _ = budget(bright)
    six = {s: found[s] * u / used for s, (_, u, used) in ALBEDO_CASE.items()}
    zeros = [six[s] for s in six if s.startswith("zero")]
    assert np.linalg.norm([*six.values(), *zeros]) == pytest.approx(0.0032, rel=0.05)
    shared = [s for s in found if s.startswith("directional response")]
    assert 1 <= len(shared) <= 2
