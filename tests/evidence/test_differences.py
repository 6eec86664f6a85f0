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
    assert near[frozenset(("court", "lawn"))].verdict == "equivalent"
    near = by_pair(differences(heat("june", {"court": 320.0, "lawn": 320.0}, u=0.8), DRAWS))
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


def course(slope, *, u=0.001, hours=(11.0, 12.0, 13.0), at=(12.0, 12 + 20 / 60), air_k=None,
           form=0.3):
    """A control that warms by `slope` K/h, and two surfaces read at other times."""
    control = [one_pass(kelvin(318.0 + slope * (h - 12)), surface="control", patch=f"k{h}",
                        n=round(h), u_within=u, hour=h, air_k=air_k) for h in hours]
    pair = [one_pass(kelvin(318.0 + slope * (t - 12)), surface=s, patch=f"{s}{i}", n=i,
                     u_within=1e-4, hour=t, air_k=air_k)
            for s, t in zip(("court", "lawn"), at, strict=True) for i in range(4)]
    made = date([*control, *pair], "june",
                settings={"comparison": {"course_form_u": form}})
    return by_pair(differences(made, DRAWS))[frozenset(("court", "lawn"))]


def test_the_days_course_is_taken_off_by_the_control():
    """3 K/h, surfaces 20 min apart: 1.0 K of false difference (arithmetic) is removed."""
    row = course(3.0)
    assert row.difference == pytest.approx(0.0, abs=0.005)
    # 30 % of what was removed: 1 K of the later surface less that of the earlier
    assert row.u == pytest.approx(0.3 * np.hypot(2 / 3, 1 / 3), rel=0.1)
    assert row.note.startswith("corrected to a common time by the control")


def test_what_the_controls_visits_are_known_to_stands_in_the_difference():
    """Between visits of .1 K a difference moves by the hat weights: 1/3 of a visit each way."""
    row = course(0.0, u=0.1, form=0.0)
    assert row.u == pytest.approx(0.1 * np.sqrt(2) / 3, rel=0.02)


def test_a_surface_far_above_the_air_follows_by_the_ratio():
    """Control 20 to 40 K above the air, another surface always half as far: ratio exact."""
    control = [one_pass(kelvin(300.0 + e), surface="control", patch=f"k{n}", n=n, u_within=0.001,
                        hour=11.0 + n, air_k=300.0) for n, e in enumerate((20.0, 30.0, 40.0))]
    others = [one_pass(kelvin(300.0 + 0.5 * e), surface=s, patch=f"{s}{i}", n=i, u_within=0.001,
                       hour=h, air_k=300.0)
              for s, h, e in (("court", 11.5, 25.0), ("lawn", 12.5, 35.0)) for i in range(3)]
    row = by_pair(differences(date([*control, *others], "june"), DRAWS))[
        frozenset(("court", "lawn"))]
    assert row.difference == pytest.approx(0.0, abs=0.01)


def test_beyond_the_controls_visits_nothing_is_carried_on():
    """3 K/h, 20 min after the last visit: 1 K allowed on either side, rectangular (computed)."""
    row = course(3.0, hours=(10.0, 11.0, 12.0), form=0.0)
    assert "lawn: drift extrapolated" in row.note
    assert abs(row.difference) == pytest.approx(1.0, abs=0.01)
    assert row.u == pytest.approx(1 / np.sqrt(3), rel=0.05)


def test_one_patch_is_pseudo_replication():
    some = [one_pass(kelvin(value), surface=s, patch=f"{s}{i if many else 1}", n=i)
            for s, value, many in (("court", 320.0, True), ("lawn", 318.0, False))
            for i in range(4)]
    row = differences(date(some, "june"), DRAWS).iloc[0]
    assert "pseudo-replication: one patch of lawn, so this holds for that patch" in row.note


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
