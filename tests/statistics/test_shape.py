"""A robust location as a diagnostic, and two hills of readings against one."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm

from surveykit.evidence.hills import two_kinds
from surveykit.statistics.shape import huber_location, two_hills

RNG = np.random.default_rng(2)
CLEAN = RNG.normal(0.0, 1.0, 4000)
MIXTURE = np.concatenate([RNG.normal(35.0, 1.0, 2667), RNG.normal(55.0, 1.0, 1333)])


def test_five_per_cent_far_off_move_the_mean_by_one_and_huber_by_a_tenth():
    """5 % at +20 K, sd 1: mean +1.00, Huber +.09 (population values, computed)."""
    x = CLEAN.copy()
    x[:200] += 20
    assert x.mean() - CLEAN.mean() == pytest.approx(1.0, abs=1e-9)
    assert huber_location(x) - CLEAN.mean() == pytest.approx(0.09, abs=0.03)


@pytest.mark.parametrize("x", [CLEAN, CLEAN[:50], np.r_[CLEAN[:100], [30.0, 40.0]]])
def test_location_agrees_with_statsmodels(x):
    """Its Huber T with the same fixed scale (median absolute deviation about the median)."""
    model = sm.RLM(x, np.ones(x.size), M=sm.robust.norms.HuberT())
    assert huber_location(x) == pytest.approx(model.fit(update_scale=False).params[0], abs=0.02)


def test_a_patch_truly_of_two_kinds_is_flagged_and_not_corrected():
    """One third at 55, the rest at 35: the area's mean is 41.7, Huber 36 or so (computed)."""
    assert MIXTURE.mean() == pytest.approx(41.7, abs=0.1)
    assert huber_location(MIXTURE) < 37
    shuffled = RNG.permutation(MIXTURE)
    assert two_kinds(shuffled, 0.3, 200.0)


def test_one_hill_is_not_flagged():
    """No false alarm in 200 normal samples of 100."""
    assert not any(two_kinds(RNG.normal(0, 1, 100), 0.1, 100.0) for _ in range(200))
    assert two_hills([1.0] * 20) == 0.0
    assert not two_kinds(np.array([1.0, 9.0]), 0.1, 2.0)
