"""How often five ways to an interval of 95 % hold the truth: passes are the unit, not records.

Simulation: passes of AR(1) records (coefficient .95, sd 1) about a truth of 0 with a standard
deviation between passes. Shares are computed by two independent scripts, within +- 3 (equal
passes) and +- 2 (unequal ones) in the hundred; 1,000 surveys here, with a fixed seed.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats
from scipy.signal import lfilter

from surveykit.statistics.bootstrap import stationary_u
from surveykit.statistics.pooling import pool
from surveykit.statistics.series import effective_sample_size

SURVEYS, PHI, BLOCK = 1000, 0.95, 120.0
EQUAL, UNEQUAL = (600, 600, 600), (200, 600, 1200)


def one_pass(rng, n):
    noise = rng.standard_normal(n)
    noise[1:] *= np.sqrt(1 - PHI**2)
    return lfilter([1.0], [1.0, -PHI], noise)


def held(sizes, between, seed=1):
    """Return by way the share [%] of intervals that hold 0."""
    rng, k = np.random.default_rng(seed), len(sizes)
    share, t = np.array(sizes) / sum(sizes), stats.t.ppf(0.975, k - 1)
    hits = dict.fromkeys(("records", "effective", "blocks", "student", "plain", "modified"), 0.0)
    for _ in range(SURVEYS):
        passes = [between * rng.standard_normal() + one_pass(rng, n) for n in sizes]
        every = np.concatenate(passes)
        mean = abs(every.mean())
        own = np.array([x.std(ddof=1) / np.sqrt(effective_sample_size(x)) for x in passes])
        means = np.array([x.mean() for x in passes])
        pooled = pool(means, own)
        half = t * pooled.u
        found = {
            "records": (mean, 1.96 * every.std(ddof=1) / np.sqrt(every.size)),
            "effective": (mean, 1.96 * np.sqrt(share**2 @ own**2)),
            "student": (abs(means.mean()), t * stats.sem(means)),
            "plain": (abs(pooled.value), half * np.sqrt(pooled.q / max(pooled.q, 1.0))),
            "modified": (abs(pooled.value), half)}
        if sizes == EQUAL:  # blocks of a fifth of a pass
            boot = np.array([stationary_u(x, BLOCK) for x in passes])
            found["blocks"] = mean, 1.96 * np.sqrt(share**2 @ boot**2)
        for way, (off, wide) in found.items():
            hits[way] += off <= wide
    return {way: 100 * count / SURVEYS for way, count in hits.items()}


@pytest.fixture(scope="module")
def scattered():
    return held(EQUAL, 0.5)


@pytest.mark.parametrize(("way", "share"), [
    ("records", 13), ("effective", 58), ("student", 95), ("modified", 98)])
def test_three_passes_that_scatter_between_them(scattered, way, share):
    """3 x 600 records, .5 between passes."""
    assert scattered[way] == pytest.approx(share, abs=3)


def test_blocks_within_passes_do_not_know_of_the_others(scattered):
    """51 % with moving blocks of 120; stationary ones of that mean length, which this package has,
    give some 46: about half in either form."""
    assert 43 < scattered["blocks"] < 54
    assert scattered["blocks"] < scattered["effective"] < scattered["student"]


def test_five_blocks_a_pass_are_too_few_even_without_scatter():
    """No scatter between passes: about 80 % still."""
    assert held(EQUAL, 0.0)["blocks"] == pytest.approx(80, abs=3)


@pytest.mark.parametrize(("between", "plain", "modified", "student"), [
    (0.5, 94, 97, 95), (0.0, 95, 99.9, 96)])
def test_three_passes_of_unequal_length(between, plain, modified, student):
    """200, 600 and 1,200 records; Hartung-Knapp plain and modified, Student's t on the means."""
    found = held(UNEQUAL, between)
    assert found["plain"] == pytest.approx(plain, abs=2)
    assert found["modified"] == pytest.approx(modified, abs=2)
    assert found["student"] == pytest.approx(student, abs=2)
