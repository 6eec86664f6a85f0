"""Every correction has a switch: without it its step is gone, it is said, and its size is budgeted.

The clean twin of each case is the same survey with the switch on.
"""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import HEADS, WEATHER, changed, changed_column, inputs, stand_off
from pass_values import sensitivities
from small_survey import (
    ALBEDO,
    CERTAIN,
    CONTACT,
    KIT,
    LEVELS,
    NDVI,
    lines,
    readings,
    row,
    small,
)

from surveykit.intake.params.settings import Settings

CAPPED = np.arange(160) < 15
DARKS = [row(entry="dark", instrument=name, start="12:00:02", stop="12:00:12")
         for name in ("pair", *HEADS)]
SUN = {"pair": lines("pair")}
LONG = CONTACT | {"start": "12:00:01", "stop": "12:02:38"}


def capped(logger, zeros):
    return lines(logger, **{c: np.where(CAPPED, 0.0, readings(
        c if logger == "pair" else f"{logger}.{c}", 160, 1)) + zero for c, zero in zeros.items()})


def light(root, cells, settings):
    logs = {"pair": capped("pair", {"sky": 4.0, "ground": 2.0})}
    (one,) = small(root, [row(**cells), DARKS[0]], logs, settings=settings).estimates()
    return one


def index(root, rows, settings, logs=None, kit=KIT):
    logs = logs or {"rednir-sky": capped("rednir-sky", {"red": 0.5, "nir": 0.5}),
                    "rednir-ground": capped("rednir-ground", {"red": 0.5, "nir": 0.5})}
    sheet = [row(**NDVI | {"start": "12:00:20", "stop": "12:01:20"}), *rows]
    (one,) = small(root, sheet, logs, settings=settings, kit=kit).estimates()
    return one


def over_panel(root, settings):
    at = np.arange(160) >= 90
    ground = {c: np.where(at, 0.5 * gain * readings(f"rednir-sky.{c}", 160, 1),
                          readings(f"rednir-ground.{c}", 160, 1))
              for c, gain in (("red", 1.03), ("nir", 0.98))}
    panel = row(entry="panel", instrument="rednir-ground", start="12:01:35", stop="12:02:35",
                reading="0.5")
    return index(root, [panel], settings, {"rednir-sky": lines("rednir-sky"),
                                           "rednir-ground": lines("rednir-ground", **ground)})


def turned(root, settings):
    """One swap of the pair: the ground head reads 4 % too much."""
    sky, ground = readings("sky", 300, 1), readings("ground", 300, 1)
    up, down = sky.copy(), 1.04 * ground
    up[230:], down[230:] = ground[230:], 1.04 * sky[230:]
    rows = [row(entry="swap", surface="court", patch="C1", instrument="pair", start=start,
                stop=stop, reading=word) for word, start, stop in (
                    ("normal", "12:02:45", "12:03:45"), ("inverted", "12:03:55", "12:04:55"))]
    (one,) = small(root, [row(**ALBEDO), *rows], {"pair": lines("pair", n=300, sky=up,
                                                                ground=down)},
                   settings=settings).estimates()
    return one


def slow_sky(root, settings, *, logger, column, cells):
    """Light that grows by .2 % a second, the sky head 3 s behind the ground head."""
    at = np.arange(160) - 80.0
    names = ("pair",) if logger == "pair" else HEADS
    logs = {name: lines(name, **{c: readings(c if c in LEVELS else f"{name}.{c}", 160, 1)
                                 * (1 + 0.002 * (at - 3.0 * (name == logger and c == column)))
                                 for c in KIT[name]["columns"]}) for name in names}
    kit = changed_column(logger, column, time_constant_s=3.0)
    rows = [row(**cells | {"start": "12:00:20", "stop": "12:02:20"})]
    (one,) = small(root, rows, logs, kit=kit, settings=settings).estimates()
    return one


def cooled(root, settings):
    target = 47 + 0.02 * (readings("target", 160, 1) - 47)
    for start in (12, 60, 108):
        target[start:start + 40] -= 0.2 * np.sqrt(np.arange(40))
        target[start - 8:start] -= 15 * np.sin(np.pi * (np.arange(8) + 0.5) / 8)
    target[148:] -= 15.0  # lifted for good
    shade = {"pair": lines("pair", sky=readings("sky", 160, 1) / 3, ground=readings(
        "ground", 160, 1) / 3)}
    return stand_off(root, LONG, logs=WEATHER | shade | {"thermal": lines("thermal",
                     target=target)}, settings=settings)


OTHER_BANDS = changed("rednir-ground", band_conversion={
    "slope": 0.95, "intercept": 0.02, "u": 0.01, "source": "invented",
    "centres_nm": {"red": 670, "nir": 780}, "widths_nm": {"red": 20, "nir": 20}})
SET = {"kit": changed_column("thermal", "target", emissivity_setting=0.95,
                             reflected_setting_degC=20.0)}
# switch: (maker of the pass, name of the step, input that keeps what is left)
CASES = {
    "temperature.correct_emissivity": (
        lambda root, s: stand_off(root, settings=s), "emissivity", "correct_emissivity_left"),
    "temperature.correct_surroundings": (
        lambda root, s: stand_off(root, settings=s), "reflected surroundings",
        "correct_surroundings_left"),
    "temperature.correct_bore": (
        lambda root, s: stand_off(root, CONTACT, settings=s), "reflected bore",
        "correct_bore_left"),
    "temperature.correct_rim_gap": (
        lambda root, s: stand_off(root, CONTACT, settings=s), "rim gap", "rim_gap_error"),
    "temperature.correct_head_cooling": (
        cooled, "cooling under the head", "head_cooling_error"),
    "temperature.correct_emissivity_setting": (
        lambda root, s: stand_off(root, settings=s, **SET), "emissivity setting undone",
        "correct_emissivity_setting_left"),
    "albedo.correct_darks": (
        lambda root, s: light(root, ALBEDO, s), "dark readings", "correct_darks_left"),
    "albedo.correct_lag": (
        lambda root, s: slow_sky(root, s, logger="pair", column="sky", cells=ALBEDO),
        "lag of the heads", "correct_lag_left"),
    "ndvi.correct_lag": (
        lambda root, s: slow_sky(root, s, logger="rednir-sky", column="red", cells=NDVI),
        "lag of the heads", "correct_lag_left"),
    "albedo.correct_gain_ratio": (turned, "gain ratio", "up_gain_error"),
    "albedo.correct_surroundings": (
        lambda root, s: light(root, ALBEDO, s), "surroundings", "contamination_error"),
    "albedo.correct_self_shade": (
        lambda root, s: light(root, ALBEDO, s), "own shade", "shade_error"),
    "ndvi.correct_darks": (
        lambda root, s: index(root, DARKS[1:], s), "dark readings", "correct_darks_left"),
    "ndvi.correct_bands": (
        lambda root, s: index(root, [], s, kit=OTHER_BANDS), "bands converted",
        "correct_bands_left"),
    "ndvi.correct_gain_ratio": (over_panel, "gain ratio", "red_up_gain_error"),
}


def test_every_switch_has_a_case():
    held = {f"{section}.{name}" for section in ("temperature", "albedo", "ndvi")
            for name in type(getattr(Settings(), section)).model_fields
            if name.startswith("correct_")}
    assert held == set(CASES)


@pytest.mark.parametrize("switch", CASES)
def test_a_correction_switched_off_is_gone_said_and_budgeted(tmp_path, switch):
    make, step, left = CASES[switch]
    section, name = switch.split(".")
    on = make(tmp_path / "on", CERTAIN)
    off = make(tmp_path / "off", CERTAIN | {section: {name: False}})
    assert on.evaluated, on.note
    assert off.evaluated, off.note
    assert step in dict(on.steps)
    assert step not in dict(off.steps)
    names = [word for word, _ in on.steps]
    before = on.steps[names.index(step) - 1][1]
    assert abs(dict(on.steps)[step] - before) > 1e-6  # it does something here
    assert sensitivities(off.model, off.inputs)[left] != 0
    assert sensitivities(off.model, off.inputs).get(left, 0.0) != pytest.approx(
        sensitivities(on.model, on.inputs).get(left, 0.0), rel=1e-6)
    said = [f for f in off.flags if f not in on.flags]
    assert any("not corrected" in f for f in said)
    assert not any(f"{name} is off" in f for f in on.flags)


@pytest.mark.parametrize("switch", [s for s, case in CASES.items() if case[2].endswith("_left")])
def test_what_is_left_is_the_whole_size_of_the_correction(tmp_path, switch):
    """A rectangle of the step's size on either side: over the square root of three."""
    make, _, left = CASES[switch]
    section, name = switch.split(".")
    on = make(tmp_path / "on", CERTAIN)
    off = make(tmp_path / "off", CERTAIN | {section: {name: False}})
    assert inputs(off)[left].distribution == "rectangular"
    assert inputs(off)[left].u == pytest.approx(abs(on.value - off.value) / np.sqrt(3), rel=0.02)
