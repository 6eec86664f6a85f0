"""Measured and modelled backgrounds of a stand-off pass, and emissivities found on the day."""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import DAY_SCOPE, HEADS, changed, inputs
from pass_values import sensitivities
from small_survey import NDVI, SITE, STAND_OFF, lines, row, small

from surveykit.core import InputError
from surveykit.physics.bands import band
from surveykit.physics.surroundings import (
    hemispheric_emissivity,
    sky_emissivity_window,
    vapour_pressure_hpa,
)

ICE, N = 273.15, 400
B = band(8.0, 14.0)
AIR = 30 + ICE
WEATHER = {"weather": lines("weather", n=8, step_s=60)}
CALM = np.resize([0.01, -0.01], N)
PASS = STAND_OFF | {"start": "12:00:20", "stop": "12:02:20"}
E = float(vapour_pressure_hpa(AIR, 0.30))
ZENITH = float(sky_emissivity_window(AIR, E))
HEMISPHERE = float(hemispheric_emissivity(ZENITH))


def log(target, *parts):
    seen = np.full(N, target) + CALM
    for start, stop, value in parts:
        seen[start:stop] = value + CALM[start:stop]
    return {"thermal": lines("thermal", n=N, target=seen)} | WEATHER


def made(root, logs, *rows, **more):
    found = small(root, [row(**PASS), *rows], logs, **more).by_name()
    return found["C1-standoff-1"]


SKY = row(entry="sky", instrument="thermal", start="12:03:20", stop="12:04:00")
FOIL = row(entry="foil", instrument="thermal", start="12:03:20", stop="12:04:00", reading="35")


def test_a_sky_read_at_the_zenith_replaces_the_model(tmp_path):
    """A sky of the model's own zenith brightness gives factor 1; its u falls from .15 to .05."""
    zenith_c = float(B.temperature_k(ZENITH * B.radiance(AIR))) - ICE
    one = made(tmp_path / "a", log(47, (200, 240, zenith_c)), SKY)
    assert inputs(one)["sky_factor"].value == pytest.approx(1.0, abs=8e-3)
    assert inputs(one)["sky_factor"].u == pytest.approx(0.05, abs=0.002)
    model = made(tmp_path / "b", log(47))
    assert one.value == pytest.approx(model.value, abs=0.02)
    warmer = made(tmp_path / "c", log(47, (200, 240, zenith_c + 10)), SKY)
    assert warmer.value < one.value - 0.1


def test_a_sky_below_the_range_is_said_and_the_model_kept(tmp_path):
    one = made(tmp_path, log(47, (200, 240, -60.0)), SKY)
    assert "sky reading below the instrument's range" in one.flags
    assert inputs(one)["sky_factor"].u == 0.15


def test_a_foil_replaces_sky_and_walls(tmp_path):
    """The foil under the model's own hemisphere, emitting 4 % at 35 degC: factor 1."""
    seen = float(B.temperature_k(0.96 * HEMISPHERE * B.radiance(AIR)
                                 + 0.04 * B.radiance(35 + ICE))) - ICE
    one = made(tmp_path, log(47, (200, 240, seen)), FOIL)
    i = inputs(one)
    assert i["background_factor"].value == pytest.approx(1.0, abs=5e-3)
    assert 0 < i["background_factor"].u < 0.1
    assert i["sky_factor"].u == i["sky_view"].u == i["walls_k"].u == 0
    assert i["background_factor"].scope == f"{DAY_SCOPE}:foil"


def test_cloud_warms_the_sky_and_widens_its_u(tmp_path):
    rows = [row(entry="weather", quantity="cloud_fraction", start=t, reading="0.5",
                reading_u="0.1") for t in ("12:00:00", "12:05:00")]
    clear, cloudy = made(tmp_path / "a", log(47)), made(tmp_path / "b", log(47), *rows)
    assert inputs(cloudy)["sky_factor"].u == 0.30
    base = float(B.radiance(AIR - 10))
    sky = 0.5 * HEMISPHERE * float(B.radiance(AIR)) + 0.5 * base
    want = float(B.temperature_k((B.radiance(47 + ICE) - 0.05 * sky) / 0.95))
    assert cloudy.value == pytest.approx(want, abs=0.01)
    assert cloudy.value < clear.value


@pytest.mark.parametrize(("humidity", "flag"), [(90.0, True), (30.0, False)])
def test_very_humid_air_is_at_the_sky_models_edge(tmp_path, humidity, flag):
    """30 degC and 90 %: 38 hPa, above the 35 hPa of the model's range."""
    logs = log(47) | {"weather": lines("weather", n=8, step_s=60, humidity=humidity
                                       + np.arange(8) * 0.01)}
    assert ("sky model at its edge: very humid air" in made(tmp_path, logs).flags) == flag


# ---- emissivity of the day

def spot(emissivity, surface_c):
    around = HEMISPHERE * float(B.radiance(AIR))
    return float(B.temperature_k(emissivity * B.radiance(surface_c + ICE)
                                 + (1 - emissivity) * around)) - ICE


def from_way(way, **more):
    return {"surfaces": {"court": {"label": "Court", "emissivity": {"from": way} | more}}}


def reference(reading="50.0", u="0.3"):
    return row(entry="reference", surface="court", patch="C1", instrument="thermal",
               start="12:03:20", stop="12:04:00", reading=reading, reading_u=u)


def test_emissivity_from_a_reference_pair(tmp_path):
    one = made(tmp_path, log(spot(0.93, 50), (200, 240, spot(0.93, 50))), reference(),
               **from_way("reference_pairs"))
    e = inputs(one)["emissivity"]
    assert e.value == pytest.approx(0.93, abs=1e-3)
    assert 0.004 < e.u < 0.012
    assert "contrast" in e.source  # the conditioning is reported
    assert one.value - ICE == pytest.approx(50.0, abs=0.05)
    assert any(f.startswith("emissivity measured: 0.93") for f in one.flags)


def test_a_pair_without_contrast_is_refused(tmp_path):
    """Ground at 50 degC below a sky of some -19 degC: 69 K, here less than asked for."""
    settings = {"passes": {"sheet_u_s": 0.0}, "temperature": {"pair_min_contrast_k": 75.0}}
    one = made(tmp_path, log(spot(0.93, 50)), reference(), settings=settings,
               **from_way("reference_pairs"))
    assert "emissivity cannot be measured here" in one.note


def test_a_pair_of_a_poor_thermometer_is_refused(tmp_path):
    one = made(tmp_path, log(spot(0.93, 50)), reference(u="2.0"), **from_way("reference_pairs"))
    assert "emissivity is known to" in one.note


def test_no_pair_no_emissivity(tmp_path):
    one = made(tmp_path, log(47), **from_way("reference_pairs"))
    assert "is to come from reference rows, and the sheet has none" in one.note


def test_emissivity_from_two_backgrounds(tmp_path):
    """Sky for 30 s, then a lid of 60 degC over the same spot."""
    lid = float(B.temperature_k(0.94 * B.radiance(50 + ICE) + 0.06 * B.radiance(60 + ICE))) - ICE
    sheet = row(entry="lid", surface="court", patch="C1", instrument="thermal",
                start="12:03:20", stop="12:03:40", reading="60", reading_u="1")
    one = made(tmp_path, log(spot(0.94, 50), (200, 220, lid)), sheet,
               **from_way("two_backgrounds"))
    assert inputs(one)["emissivity"].value == pytest.approx(0.94, abs=2e-3)
    assert one.value - ICE == pytest.approx(50.0, abs=0.1)


LID = row(entry="lid", surface="court", patch="C1", instrument="thermal", start="12:03:20",
          stop="12:03:40", reading="60", reading_u="1")


def lidded(root, open_rate=0.0, lid_rate=0.0):
    """A lid of 60 degC over ground at 50 degC of emissivity .94 that warms or cools [K/s]."""
    at = np.arange(N) - 200.0
    ground = 50 + open_rate * np.clip(at, -40, 0) + lid_rate * np.clip(at, 0, 20)
    seen = 0.94 * B.radiance(ground + ICE) + 0.06 * np.where(
        (at >= 0) & (at < 20), B.radiance(60 + ICE), HEMISPHERE * B.radiance(AIR))
    logs = WEATHER | {"thermal": lines("thermal", n=N, target=B.temperature_k(seen) - ICE + CALM)}
    return made(root, logs, LID, **from_way("two_backgrounds"))


def test_only_readings_beside_a_lids_edge_are_compared(tmp_path):
    """Ground that cools by .05 K/s below the lid: the 5 s after it are off by .13 K, the whole row
    by .5 K; .13 K of the 1.9 K between the two readings is .004 of emissivity (hand arithmetic)."""
    still, cooling = lidded(tmp_path / "a"), lidded(tmp_path / "b", lid_rate=-0.05)
    e = [inputs(one)["emissivity"] for one in (still, cooling)]
    assert e[0].value == pytest.approx(0.94, abs=1e-3)
    assert abs(e[1].value - 0.94) < 0.006
    assert abs(e[1].value - 0.94) < 2 * e[1].u
    assert e[1].u > e[0].u


@pytest.mark.parametrize("moving", [{"open_rate": 0.6}, {"lid_rate": -0.6}])
def test_a_lid_over_ground_that_moves_fast_is_refused(tmp_path, moving):
    assert "emissivity is known to" in lidded(tmp_path, **moving).note


def test_a_horizon_stands_for_the_sky_view(tmp_path):
    """Walls up to 30 degrees all round leave cos^2 30 = .75 of the sky (analytic)."""
    round_about = {"horizon_deg": [30] * 8, "walls": {"temperature_degC": 45.0}}
    stated = {"sky_view": 0.75, "walls": {"temperature_degC": 45.0}}
    one, other = (made(tmp_path / name, log(47), site=SITE | site) for name, site in (
        ("a", round_about), ("b", stated)))
    assert inputs(one)["sky_view"].value == pytest.approx(0.75)
    assert inputs(one)["sky_view"].u == 0.1
    assert one.value == pytest.approx(other.value, abs=1e-9)
    with pytest.raises(InputError, match="beside sky_view; write one of the two"):
        made(tmp_path / "c", log(47), site=SITE | round_about | stated)


def test_polished_ground_shows_the_sky_overhead(tmp_path):
    """Independent of the model's own path: the balance solved with the zenith's radiance, and the
    difference from the hemisphere's as half-width of a rectangle."""
    def court(**more):
        return {"surfaces": {"court": {"label": "Court", "emissivity": {
            "value": 0.90, "u": 0.0, "source": "stated"}, **more}}}

    one = made(tmp_path / "a", log(47), **court(reflection="specular"))
    other = made(tmp_path / "b", log(47), **court())
    seen = B.radiance(47 + ICE)
    zenith, whole = (float(B.temperature_k((seen - 0.1 * e * B.radiance(AIR)) / 0.9))
                     for e in (ZENITH, HEMISPHERE))
    assert one.value == pytest.approx(zenith, abs=0.02)
    assert other.value == pytest.approx(whole, abs=0.02)
    moved = sensitivities("stand-off", one.inputs)["background_factor"]
    assert abs(moved) == pytest.approx((zenith - whole) / np.sqrt(3), rel=0.02)
    assert "background_factor" not in sensitivities("stand-off", other.inputs)


@pytest.mark.parametrize("cloud", ["0.5", "1"])
def test_cloud_overhead_is_as_warm_as_all_around(tmp_path, cloud):
    """Below full cloud the sky is one: polished ground reads as rough ground does."""
    rows = [row(entry="weather", quantity="cloud_fraction", start="12:00:00", reading=cloud,
                reading_u="0.1")]
    polished = {"surfaces": {"court": {"label": "Court", "reflection": "specular", "emissivity": {
        "value": 0.90, "u": 0.0, "source": "stated"}}}}
    one = made(tmp_path, log(47), *rows, **polished)
    factor = inputs(one)["background_factor"].value
    assert (factor == pytest.approx(1.0)) if cloud == "1" else 0.85 < factor < 0.99


@pytest.mark.parametrize(("form", "value"), [("linear", 0.968), ("squared", 0.958)])
def test_emissivity_from_ndvi(tmp_path, form, value):
    """NDVI .5 between .2 and .86, emissivities .99 and .95: .968 and .958 (computed)."""
    logs = log(47) | {name: lines(name, n=N, **{b: np.full(N, level) + 1e-3 * CALM
                      for b, level in some.items()}) for name, some in zip(HEADS, (
                          {"red": 100.0, "nir": 100.0}, {"red": 10.0, "nir": 30.0}),
                          strict=True)}
    ndvi = row(**(NDVI | {"start": "12:02:40", "stop": "12:04:40"}))
    one = made(tmp_path, logs, ndvi, **from_way("ndvi", vegetation=0.99, soil=0.95, u=0.01,
                                                form=form))
    e = inputs(one)["emissivity"]
    assert e.value == pytest.approx(value, abs=5e-4)
    assert e.u > 0.01
    assert any("never for synthetic turf" in f and form in f for f in one.flags)


def test_emissivity_from_ndvi_takes_the_calibrated_index(tmp_path):
    """A gain ratio of 1.25 over near infrared 30 and red 10: (24 - 10) / 34 = .412, cover .321."""
    logs = log(47) | {name: lines(name, n=N, **{b: np.full(N, level) + 1e-3 * CALM
                      for b, level in some.items()}) for name, some in zip(HEADS, (
                          {"red": 100.0, "nir": 100.0}, {"red": 10.0, "nir": 30.0}),
                          strict=True)}
    kit = changed("rednir-ground", band_ratio={"value": 1.25, "u": 0.0, "source": "invented"})
    one = made(tmp_path, logs, row(**(NDVI | {"start": "12:02:40", "stop": "12:04:40"})), kit=kit,
               **from_way("ndvi", vegetation=0.99, soil=0.95, u=0.01))
    assert inputs(one)["emissivity"].value == pytest.approx(0.95 + 0.04 * 0.321, abs=1e-4)


@pytest.mark.parametrize(("nir", "value"), [(30.0, 0.9768), (90.0, None)])
def test_emissivity_logarithmic_in_ndvi(tmp_path, nir, value):
    """1.0094 + .047 ln .5 = .97682 (Van de Griend & Owe 1993, from memory); .8 is beyond its range.
    """
    logs = log(47) | {name: lines(name, n=N, **{b: np.full(N, level) + 1e-3 * CALM
                      for b, level in some.items()}) for name, some in zip(HEADS, (
                          {"red": 100.0, "nir": 100.0}, {"red": 10.0, "nir": nir}),
                          strict=True)}
    ndvi = row(**(NDVI | {"start": "12:02:40", "stop": "12:04:40"}))
    one = made(tmp_path, logs, ndvi, **from_way("ndvi", u=0.01, form="logarithmic"))
    if value is None:
        assert one.note.startswith("NDVI 0.80 lies outside .157 to .727")
    else:
        assert inputs(one)["emissivity"].value == pytest.approx(value, abs=1e-4)
        assert any("never for synthetic turf" in f for f in one.flags)


def test_a_logarithmic_form_takes_no_mixture(tmp_path):
    with pytest.raises(InputError, match=r"emissivity\.soil: does not go with .*form: logarithmic"):
        made(tmp_path, log(47), **from_way("ndvi", u=0.01, soil=0.95, form="logarithmic"))


def test_emissivity_from_ndvi_needs_an_ndvi(tmp_path):
    one = made(tmp_path, log(47), **from_way("ndvi", vegetation=0.99, soil=0.95, u=0.01))
    assert "is to come from NDVI, and no pass of ndvi" in one.note
