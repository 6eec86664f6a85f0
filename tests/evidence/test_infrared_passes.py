"""Stand-off and contact passes: sizes and scopes of their inputs, flags, what is missing."""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import WEATHER, changed, changed_column, inputs, made, stand_off
from pass_values import sensitivities
from small_survey import CONTACT, KIT, STAND_OFF, lines, readings

from surveykit.evidence.estimates import display
from surveykit.physics.bands import band
from surveykit.physics.surroundings import sky_radiance
from surveykit.physics.thermal import contact_temperature_k


def test_worked_case_of_a_stand_off_pass(tmp_path):
    """47.0 degC, emissivity .95, air 30 degC, humidity 30 %, open sky: 49.567 degC (computed)."""
    one = stand_off(tmp_path, logs=WEATHER | {"thermal": lines("thermal", target=np.full(
        160, 47.0) + np.resize([0.01, -0.01], 160))})
    weather = inputs(one)
    assert weather["air_k"].value == pytest.approx(303.15, abs=0.1)
    assert display(one.value, "temperature") == pytest.approx(49.567, abs=0.01)
    assert one.value_raw - 273.15 == pytest.approx(47.0, abs=1e-6)


def test_a_gain_of_the_infrared_head_acts_on_the_reading_in_its_own_unit(tmp_path):
    """1 % of a gain on 47 degC is .47 K at the head."""
    one = stand_off(tmp_path, kit=changed_column("thermal", "target", u_gain=0.01))
    assert inputs(one)["gain_reading"].value == pytest.approx(47.0, abs=0.1)
    assert sensitivities("stand-off", one.inputs)["gain_error"] == pytest.approx(0.485, abs=0.01)


def test_the_housings_rate_keeps_its_sign(tmp_path):
    """Warming by 1 K/min, cooling by 1 K/min: one coefficient, opposite effects."""
    minutes = np.arange(160) / 60
    rates = []
    for name, rate in (("a", 1.0), ("b", -1.0)):
        log = lines("thermal", body=30 + rate * minutes)
        one = stand_off(tmp_path / name, logs=WEATHER | {"thermal": log})
        assert inputs(one)["body_rate_k_min"].value == pytest.approx(rate, abs=0.01)
        rates.append(sensitivities("stand-off", one.inputs)["body_rate_error"])
    assert rates[0] == pytest.approx(0.5 * 1.03, abs=0.02)
    assert rates[1] == pytest.approx(-rates[0], rel=0.02)


def test_a_head_higher_than_its_path_limit_is_flagged(tmp_path):
    flag = "higher than 3 m: the air in between is not corrected"
    high = stand_off(tmp_path / "a", STAND_OFF | {"height_cm": "301"})
    low = stand_off(tmp_path / "b", STAND_OFF | {"height_cm": "299"})
    assert flag in high.flags
    assert flag not in low.flags


@pytest.mark.parametrize(("kit", "missing"), [
    (changed("thermal", band_um=None), "band_um of thermal, target is missing"),
    (changed_column("thermal", "target", emissivity_setting=None),
     "emissivity_setting of thermal, target is missing")])
def test_what_an_infrared_head_must_state(tmp_path, kit, missing):
    assert stand_off(tmp_path, kit=kit).note == missing


def test_a_stand_off_pass_needs_the_air(tmp_path):
    one = made(tmp_path, STAND_OFF, "thermal")
    assert not one.evaluated
    assert one.note == "air temperature during the pass is missing"


def test_a_surface_without_emissivity_has_no_temperature(tmp_path):
    one = stand_off(tmp_path, surfaces={"court": {"label": "Court"}})
    assert one.note == "surfaces.court.emissivity is missing"


def test_a_contact_pass_without_its_housing_keeps_its_reading(tmp_path):
    """The whole term, a bore as warm as the air at 30 degC under ground at 47, stays as a
    rectangle: emissivity .95 and a bore of .95 do 0.7 K there (from the cavity's closed form).
    """
    kit = changed("thermal", columns={"target": KIT["thermal"]["columns"]["target"]})
    log = [",".join(line.split(",")[:2]) for line in lines("thermal")]
    one = stand_off(tmp_path / "a", CONTACT, logs=WEATHER | {"thermal": log}, kit=kit)
    flag = "housing temperature not logged: emissivity and bore not corrected"
    assert flag in one.flags
    assert list(dict(one.steps)) == ["raw", "cooling under the head"]
    assert dict(one.steps)["raw"] == pytest.approx(one.value_raw, abs=1e-6)
    window, read, gap = band(8.0, 14.0), one.value_raw, inputs(one)["rim_gap"].value
    sky = float(sky_radiance(window, 303.15, 0.3))
    whole = float(contact_temperature_k(window, read, 0.95, 303.15, 0.95, gap, sky)) - read
    assert whole > 0.7
    assert sensitivities("contact", one.inputs)["correct_bore_left"] == pytest.approx(
        whole / np.sqrt(3), rel=0.02)
    assert flag not in stand_off(tmp_path / "b", CONTACT).flags


def test_the_bore_belongs_to_the_calibration(tmp_path):
    """Another head under the same name is another bore."""
    one = stand_off(tmp_path, CONTACT)
    assert inputs(one)["bore_emissivity"].scope == "thermal-2025:target:gain:bore"


def contact_log(*lifts, warmer=()):
    """Settled at 47 degC but for lifts [s] to what is 15 K colder; `warmer` [s] is 2 K warmer."""
    target = readings("target", 160, 1) * 0.2 + 47 * 0.8
    for start, stop in lifts:
        target[start:stop] -= 15 * np.sin(np.pi * (np.arange(stop - start) + 0.5) / (stop - start))
    if warmer:
        target[slice(*warmer)] += 2.0
    return WEATHER | {"thermal": lines("thermal", target=target)}


def test_a_contact_pass_counts_placements(tmp_path):
    """Three placements, the second 2 K warmer: their mean and its standard error (hand
    arithmetic: values 0, 2, 0; sd 1.155, over sqrt 3 .667).
    """
    logs = contact_log((60, 68), (104, 112), warmer=(64, 108))
    one = stand_off(tmp_path, CONTACT | {"start": "12:00:20", "stop": "12:02:38"}, logs=logs)
    assert one.n_effective == 3
    assert [d[4] for d in one.dwells] == pytest.approx([40, 36, 46], abs=2)  # less a record a side
    slope = sensitivities("contact", one.inputs)["offset_error"] / 0.2
    assert one.u_within == pytest.approx(0.667 * slope, abs=0.03)
    assert "few placements" not in one.flags
    assert "few effective records" not in one.flags
    values = [d[2] for d in one.dwells]
    assert one.value == pytest.approx(np.mean(values))


def test_two_placements_are_few(tmp_path):
    one = stand_off(tmp_path, CONTACT, logs=contact_log((70, 78)))
    assert one.n_effective == 2
    assert "few placements" in one.flags
