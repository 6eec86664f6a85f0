"""One scatter for all surfaces, what would narrow an interval, and passes needed."""

from __future__ import annotations

import numpy as np
import pytest
from pass_values import DRAWS, albedo, error, kelvin, one_pass
from scipy import stats

from surveykit.evidence.surfaces import budget_table, groups, surface_table
from surveykit.intake.params.sections import RelevantChange
from surveykit.statistics.draws import summarise
from surveykit.statistics.pooling import common_scatter, passes_needed, paule_mandel


def made(values, **more):
    some = [one_pass(kelvin(v), surface=s, patch=s, n=i, u_within=1e-4)
            for s, passes in values.items() for i, v in enumerate(passes)]
    return {g.surface: g for g in groups("yard", some, DRAWS, coverage=0.95, **more)}


def test_common_scatter_is_the_residual_of_one_way_analysis():
    """Exact units: sum of squares within over summed dof, (2 * .5 + 2 * 4.5) / 3 (hand)."""
    found = common_scatter([([1.0, 2.0, 1.5], [0.0] * 3), ([5.0, 8.0], [0.0] * 2)])
    assert found.tau2 == pytest.approx((0.5 + 4.5) / 3)
    assert found.dof == 3


def test_one_group_alone_is_paule_mandel():
    y, u = [41.2, 42.6, 40.1, 43.0], [0.3, 0.4, 0.3, 0.5]
    assert common_scatter([(y, u)]).tau2 == pytest.approx(paule_mandel(y, u), rel=1e-6)
    assert common_scatter([([1.0], [0.1])]) is None


def test_common_scatter_borrows_degrees_of_freedom():
    """Two surfaces of 3 and 2 passes: 3 dof for both, u = s / sqrt(k) (hand)."""
    found = made({"court": [300.0, 301.0, 300.5], "lawn": [310.0, 313.0]}, between_passes="common")
    s = np.sqrt(5 / 3)
    for name, k in (("court", 3), ("lawn", 2)):
        got = summarise(found[name].result, 0.95)
        assert got.dof == pytest.approx(3)
        assert got.u == pytest.approx(s / np.sqrt(k), rel=1e-3)
        assert got.k == pytest.approx(stats.t.ppf(0.975, 3), rel=0.02)
        assert "borrows the common spread of passes, 1.3 K" in "; ".join(found[name].notes)


def test_one_pass_has_a_borrowed_interval():
    found = made({"court": [300.0, 301.0, 300.5], "lawn": [310.0]}, between_passes="common")
    assert found["lawn"].result is not None
    assert found["lawn"].notes[0] == "one pass"
    assert "(its own is not known)" in found["lawn"].notes[1]
    assert made({"court": [300.0, 301.0], "lawn": [310.0]})["lawn"].result is None


def test_several_patches_borrow_within_them_and_keep_their_own_scatter_between():
    """Each patch mean: the common spread over the root of 4 (hand); two patches, 1 dof."""
    some = [one_pass(kelvin(320.0 + 3 * p + v), patch=f"C{p}", n=n, u_within=1e-4)
            for p in range(2) for n, v in enumerate((0.0, 0.5, 1.0, 1.5))]
    (group,) = groups("yard", some, DRAWS, coverage=0.95, between_passes="common")
    assert group.dof == 1
    assert group.notes[0].startswith("passes within its patches borrow the common spread of passes")
    s = np.std([0.0, 0.5, 1.0, 1.5], ddof=1)
    assert group.units_u == pytest.approx([s / 2, s / 2], rel=1e-3)


def test_a_wider_scatter_than_the_common_one_is_warned_of_and_not_switched():
    """F of 100 with 3 and 3 dof: p .0017 (F table: 9.28 at 5 %)."""
    calm, wild = np.array([0.0, 0.1, 0.2, 0.3]), np.array([0.0, 1.0, 2.0, 3.0])
    found = made({"court": 300 + calm, "lawn": 310 + wild}, between_passes="common")
    assert "which its own exceeds" in "; ".join(found["lawn"].notes)
    assert "which its own exceeds" not in "; ".join(found["court"].notes)
    assert found["lawn"].dof == found["court"].dof == 6


def test_what_halving_a_source_would_gain():
    """Gain 3 % of .30 = .009, sampling .002 with 59 dof: half-widths by hand (normal quantile)."""
    gain = error("up_gain_error", 0.03, "pair:up:gain")
    some = [one_pass(albedo(0.3, gain), quantity="albedo", n=i, u_within=0.002 * np.sqrt(60))
            for i in range(60)]
    rows = budget_table(groups("yard", some, DRAWS, coverage=0.95)).set_index("source")
    z = stats.norm.ppf(0.975)
    whole = z * np.hypot(0.009, 0.002)
    assert rows.narrower["source of pair:up:gain"] == pytest.approx(
        whole - z * np.hypot(0.0045, 0.002), rel=0.02)
    assert rows.narrower["scatter between passes and patches"] == pytest.approx(
        whole - z * np.hypot(0.009, 0.001), rel=0.05)


def test_passes_needed_beside_a_shared_error():
    """Shared .3 K leaves sqrt((1 / 1.96)^2 - .3^2) = .41 K for the passes; none helps beyond."""
    k = passes_needed(0.5, 0.3, 1.0, shared_u=0.3)
    half = [stats.t.ppf(0.975, (n - 1) * ((0.09 + 0.34 / n) / (0.34 / n)) ** 2)
            * np.sqrt(0.09 + 0.34 / n) for n in (k - 1, k)]
    assert half[1] <= 1.0 < half[0]
    assert passes_needed(0.5, 0.3, 1.0, shared_u=0.52) == np.inf


def test_table_names_passes_needed_for_the_relevant_change():
    """(.5, .3) K for 1 K: 4 passes (computed)."""
    rng = np.array([-1.0, 1.0, -1.0, 1.0, 0.0]) * 0.5 * np.sqrt(5 / 4)
    some = [one_pass(kelvin(300.0 + v), n=i, u_within=1e-4) for i, v in enumerate(rng)]
    row = surface_table(groups("yard", some, DRAWS, coverage=0.95), 0.95,
                        RelevantChange(temperature=1.0)).iloc[0]
    assert row.spread == pytest.approx(np.std(rng, ddof=1), rel=1e-3)
    assert row.needed == passes_needed(row.spread, 1e-4, 1.0)
    assert 0 < row.end_error < 0.1
