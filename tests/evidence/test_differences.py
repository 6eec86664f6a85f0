"""Differences between the surfaces of one date: words, families, the day's course."""

from __future__ import annotations

import numpy as np
import pytest
from pass_values import CLEAR, CLOUD, DRAWS, albedo, date, heat, kelvin, one_pass, parameters

from surveykit.evidence.comparability import Date
from surveykit.evidence.compare import differences


def by_pair(table):
    return {frozenset((r.surface, r.other)): r for r in table.itertuples()}


def test_words_of_a_difference():
    """Against a relevant difference of 1 K."""
    made = by_pair(differences(heat("june", {"court": 320.0, "control": 318.0, "lawn": 319.5},
                                    hour=12.0), DRAWS))
    assert made[frozenset(("court", "control"))].verdict == "higher"
    assert made[frozenset(("court", "lawn"))].verdict == "higher, small"
    assert made[frozenset(("control", "lawn"))].verdict == "lower"
    near = by_pair(differences(heat("june", {"court": 320.0, "lawn": 320.0}), DRAWS))
    row = near[frozenset(("court", "lawn"))]
    assert row.verdict == "no difference shown"
    # (t.975 + t.8) u with 6 dof: 2.4469 + .9057
    assert row.could_have_missed == pytest.approx(3.3526 * row.u, rel=1e-3)


def test_p_values_are_adjusted_within_the_family():
    """Holm over the three pairs; the last of them keeps its own p."""
    made = differences(heat("june", {"court": 320.0, "control": 319.8, "lawn": 319.7}), DRAWS)
    single = differences(heat("june", {"control": 319.8, "lawn": 319.7}), DRAWS)
    worst = made.p_adjusted.max()
    assert worst == pytest.approx(single.p_adjusted.item(), rel=1e-6)
    assert (made.p_adjusted >= 0).all()


def test_the_days_course_widens_a_difference_by_the_controls_own():
    """The control warms by 3 K/h; surfaces 20 min apart: 1.0 K, rectangular (computed)."""
    control = [one_pass(kelvin(318.0 + 3 * h), surface="control", patch=f"k{h}", n=h,
                        u_within=0.01, hour=11.0 + h) for h in range(3)]
    pair = [one_pass(kelvin(320.0), surface=s, patch=f"{s}{i}", n=i, u_within=1e-4, hour=at)
            for s, at in (("court", 12.0), ("lawn", 12 + 20 / 60)) for i in range(4)]
    made = by_pair(differences(date([*control, *pair], "june"), DRAWS))
    row = made[frozenset(("court", "lawn"))]
    assert row.u == pytest.approx(1.0 / np.sqrt(3), rel=0.01)
    assert row.upper == pytest.approx(0.95, abs=0.01)  # of a rectangular of half-width 1
    assert row.note == "not corrected for the day's course; it is in the interval"


@pytest.mark.parametrize("control", [None, "lawn"])
def test_without_a_control_the_days_course_was_not_watched(control):
    """Nor by one whose passes all stand at one time."""
    made = differences(heat("june", {"court": 320.0, "lawn": 319.0}, control=control), DRAWS)
    assert made.note.tolist() == ["the day's course was not watched by a control"]


def test_albedos_of_one_day_under_two_suns_hold_the_suns_height():
    """.20 at 60 and at 30 deg: 6.3 % by a weak dependence (computed)."""
    some = [one_pass(albedo(0.2), surface=s, patch=f"{s}{i}", n=i, quantity="albedo",
                     u_within=1e-6, zenith_deg=z)
            for s, z in (("court", 30.0), ("lawn", 60.0)) for i in range(4)]
    row = differences(date(some, "june"), DRAWS).iloc[0]
    assert row.u == pytest.approx(0.2 * 0.0624, rel=0.02)


def test_a_surface_without_an_interval_is_not_judged():
    some = [one_pass(kelvin(320.0), surface="court", patch=f"c{i}", n=i) for i in range(3)]
    some.append(one_pass(kelvin(318.0), surface="lawn", patch="l1"))
    row = differences(date(some, "june"), DRAWS).iloc[0]
    assert (row.verdict, row.note) == ("not evaluated", "lawn: one pass")
    assert np.isnan(row.difference)


def test_kinds_are_not_mixed():
    some = [one_pass(albedo(0.2), surface=s, patch=f"{s}{i}", n=i, quantity="albedo", sky=sky)
            for s, sky in (("court", CLEAR), ("lawn", CLOUD)) for i in range(3)]
    assert differences(date(some, "june"), DRAWS).empty


def test_coverage_of_the_campaign_is_used():
    wide = parameters("june", settings={"statistics": {"coverage": 0.99}})
    passes = heat("june", {"court": 320.0, "lawn": 319.9}, u=0.1)
    made = [differences(Date(p, passes.groups), DRAWS).iloc[0]
            for p in (passes.parameters, wide)]
    assert made[0].coverage == 0.95
    assert made[1].coverage == 0.99
    assert made[1].upper - made[1].lower > made[0].upper - made[0].lower
