"""Walked passes: the error of the lanes' mean as the mean of the patch, from made patterns."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.distance import cdist
from small_survey import STAND_OFF, lines, row, small

from surveykit.evidence.mapping import SPARSE, UNFITTED, patch_mean
from surveykit.intake.paths import walk
from surveykit.statistics.series import mean_of_series

SIDE, LANES, SECONDS = 20, 10, 400
STEPS = (np.arange(24) + 0.5) / 24 * SIDE
GRID = np.stack(np.meshgrid(STEPS, STEPS), axis=-1).reshape(-1, 2)


def walked(root, lanes=LANES, **read):
    cells = {"start": "12:00:20", "stop": "12:07:00", "width_m": str(SIDE), "length_m": str(SIDE)}
    sheet = [row(**STAND_OFF | cells | {"lanes": str(lanes) if lanes else ""})]
    logs = {"thermal": lines("thermal", n=450, **read),
            "weather": lines("weather", n=10, step_s=60)}
    return small(root, sheet, logs)


def fields(day, this, n, *, scale_m, noise=0.3, seed=5):
    """Return n patterns, exponential covariance of sd 2: readings on the walk, patch means."""
    chosen = day.quality.passes[this.name]
    path = walk(this, day.records[chosen.logger].time_ns[chosen.index], day.parameters)
    places = np.vstack([np.column_stack([path.x_m, path.y_m]), GRID])
    covariance = 4 * np.exp(-cdist(places, places) / scale_m)
    root = np.linalg.cholesky(covariance + 1e-9 * np.eye(len(places)))
    rng = np.random.default_rng(seed)
    made = 320 + (root @ rng.standard_normal((len(places), n))).T
    at = path.x_m.size
    return made[:, :at] + noise * rng.standard_normal((n, at)), made[:, at:].mean(axis=1)


def test_the_error_of_the_patch_mean_is_what_the_lanes_leave(tmp_path):
    # the truth of every pattern is known; extension variance, Journel & Huijbregts 1978, II.C;
    # a series in time takes the pattern for scatter and says several times as much
    survey = walked(tmp_path)
    day, (this,) = survey.day(), survey.passes
    records, means = fields(day, this, 60, scale_m=2.0)
    stated = [patch_mean(day, this, one) for one in records]
    u = np.array([one for one, _ in stated])
    fitted = np.isfinite(u)
    assert fitted.mean() > 0.5
    off = float(np.sqrt(np.mean((records.mean(axis=1) - means)[fitted] ** 2)))
    assert 0.7 < np.sqrt(np.mean(u[fitted] ** 2)) / off < 1.4
    in_time = [mean_of_series(one, "K", "").u for one in records[fitted]]
    assert np.median(in_time) > 3 * off
    assert np.mean([SPARSE in flags for _, flags in stated]) < 0.2
    assert all(flags[0].startswith(UNFITTED)
               for (_, flags), good in zip(stated, fitted, strict=True) if not good)


def test_lanes_far_apart_for_the_pattern_are_flagged(tmp_path):
    survey = walked(tmp_path, lanes=3)
    day, (this,) = survey.day(), survey.passes
    records, _ = fields(day, this, 8, scale_m=1.0)
    found = [patch_mean(day, this, one) for one in records]
    assert sum(SPARSE in flags for _, flags in found) >= 4


def test_a_pass_takes_it_where_the_sheet_has_lanes(tmp_path):
    survey = walked(tmp_path / "one")
    (seen,), _ = fields(survey.day(), survey.passes[0], 1, scale_m=1.5)
    read = np.interp(np.arange(450), 20 + np.arange(seen.size), seen - 273.15)
    mapped, plain = (walked(tmp_path / f"with {lanes}", lanes, target=read).estimates()[0]
                     for lanes in (LANES, 0))
    assert mapped.value == pytest.approx(plain.value, abs=0.3)  # turns are left out
    assert mapped.u_within < plain.u_within / 2
    assert not any(UNFITTED in flag for flag in (*mapped.flags, *plain.flags))
