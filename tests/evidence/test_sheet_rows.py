"""Sky, foil, reference, lid and check rows of a head logged with an emissivity other than 1.

The clean twin is the same head logged with 1: what stands behind its readings is the same.
"""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import changed_column, inputs
from small_survey import KIT, STAND_OFF, lines, row, small

from surveykit.physics.bands import band

ICE, N, SETTING, REFLECTED = 273.15, 420, 0.90, 25.0
B = band(8.0, 14.0)
WEATHER = {"weather": lines("weather", n=8, step_s=60)}
PASS = STAND_OFF | {"start": "12:00:20", "stop": "12:02:20"}
SET = changed_column("thermal", "target", emissivity_setting=SETTING,
                     reflected_setting_degC=REFLECTED)
ROWS = {
    "sky": (row(entry="sky", instrument="thermal", start="12:03:20", stop="12:04:00"), -10.0, {}),
    "foil": (row(entry="foil", instrument="thermal", start="12:03:20", stop="12:04:00",
                 reading="35"), -8.0, {}),
    "reference": (row(entry="reference", surface="court", patch="C1", instrument="thermal",
                      start="12:03:20", stop="12:04:00", reading="50.5", reading_u="0.3"), 47.0,
                  {"from": "reference_pairs"}),
    "lid": (row(entry="lid", surface="court", patch="C1", instrument="thermal", start="12:03:20",
                stop="12:03:40", reading="60", reading_u="1"), 50.5, {"from": "two_backgrounds"}),
    "check": (row(entry="check", instrument="thermal", start="12:03:20", stop="12:04:00",
                  reading="20"), 21.0, {}),
}


def logged(brightness_c):
    """What an instrument prints that takes the ground for .90 below a black 25 degC."""
    seen = B.radiance(np.asarray(brightness_c) + ICE)
    reflected = (1 - SETTING) * B.radiance(REFLECTED + ICE)
    return B.temperature_k((seen - reflected) / SETTING) - ICE


def one(root, kind, kit, through):
    sheet, value, emissivity = ROWS[kind]
    seen = np.full(N, 47.0)
    seen[200:240] = value
    calm = np.resize([0.01, -0.01], N)
    logs = WEATHER | {"thermal": lines("thermal", n=N, target=through(seen) + calm)}
    more = {"surfaces": {"court": {"label": "Court", "emissivity": emissivity}}} if emissivity \
        else {}
    (found,) = small(root, [row(**PASS), sheet], logs, kit=kit, **more).estimates()
    return found


@pytest.mark.parametrize("kind", ROWS)
def test_a_setting_is_undone_in_every_row_of_the_sheet(tmp_path, kind):
    plain = one(tmp_path / "a", kind, KIT, lambda x: x)
    made = one(tmp_path / "b", kind, SET, logged)
    assert plain.evaluated, plain.note
    assert made.evaluated, made.note
    assert made.value == pytest.approx(plain.value, abs=0.01)
    assert made.value_raw - plain.value_raw > 1.0  # the readings themselves differ by kelvins
    for name in ("sky_factor", "background_factor", "emissivity", "check_error"):
        if name in inputs(plain):
            assert inputs(made)[name].value == pytest.approx(inputs(plain)[name].value, abs=2e-3)
            assert inputs(made)[name].u == pytest.approx(inputs(plain)[name].u, rel=0.1, abs=2e-3)
    used = {"sky": "sky_factor", "foil": "background_factor", "check": "check_error"}.get(
        kind, "emissivity")
    assert inputs(made)[used].u > 0


def test_a_setting_without_what_it_took_for_reflected_is_refused(tmp_path):
    kit = changed_column("thermal", "target", emissivity_setting=SETTING)
    columns = {"target": kit["thermal"]["columns"]["target"]}
    kit = kit | {"thermal": kit["thermal"] | {"columns": columns}}
    log = [",".join(line.split(",")[:2]) for line in lines("thermal")]
    (found,) = small(tmp_path, [row(**PASS)], WEATHER | {"thermal": log}, kit=kit).estimates()
    assert found.note == ("thermal, target was logged with emissivity setting 0.9; write its "
                          "reflected_setting_degC, or log its housing temperature")
