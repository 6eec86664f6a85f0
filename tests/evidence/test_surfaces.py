"""Passes pooled to patches and surfaces: shared errors, degrees of freedom, budgets, notes."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from checks import check
from pass_values import albedo, error, kelvin, one_pass, only, pooled

from surveykit.core import Input
from surveykit.evidence.conditions import Sky
from surveykit.evidence.surfaces import budget_table, pass_tables, surface_table
from surveykit.statistics.draws import combine, summarise

COVERAGE = 0.95


def four(values, u_within, *, patches=False, **more):
    """Passes of these values, on one patch or each on its own."""
    return [one_pass(kelvin(273.15 + v), n=i, patch=f"C{i}" if patches else "C1", u_within=u,
                     **more) for i, (v, u) in enumerate(zip(values, u_within, strict=True), 1)]


# ---- pooling

WORKED = ([41.2, 42.6, 40.1, 43.0], [0.3, 0.4, 0.3, 0.5])


@pytest.mark.parametrize("patches", [False, True])
def test_worked_case_of_four(patches):
    """Paule-Mandel with the modified Hartung-Knapp scale: 41.688, half-width 2.115, t(3) 3.182
    (computed by two scripts); one pass a patch pools over patches to the same.
    """
    group = only(four(*WORKED, patches=patches))
    found = summarise(group.result, COVERAGE)
    assert group.value - 273.15 == pytest.approx(41.688, abs=0.0005)
    assert found.u == pytest.approx(0.6645, abs=0.0005)
    assert (found.upper - found.lower) / 2 == pytest.approx(2.115, rel=0.01)
    assert found.k == pytest.approx(3.182, rel=0.01)
    assert group.dof == 3


def test_pooling_of_a_published_comparison():
    """Nine laboratories of Kacker (2004), by Paule-Mandel: 62.408, standard error .338."""
    case = check("kacker2004_pm")
    group = only(four(case.input["y"], np.sqrt(case.input["v"]), patches=True))
    assert group.value - 273.15 == pytest.approx(case.expected["mean"], abs=1e-4)
    assert summarise(group.result, COVERAGE).u == pytest.approx(case.expected["se"], abs=1e-4)


def test_passes_of_a_patch_are_pooled_before_patches():
    """Three passes of one patch do not outvote the single pass of the other."""
    passes = [one_pass(kelvin(300.0), n=n, patch="C1") for n in (1, 2, 3)]
    passes.append(one_pass(kelvin(310.0), patch="C2"))
    group = only(passes)
    assert group.value == pytest.approx(305.0, abs=0.01)
    assert group.dof == 1
    assert group.weights == pytest.approx([1 / 6, 1 / 6, 1 / 6, 1 / 2], rel=0.01)


def test_two_patches_leave_one_degree_of_freedom():
    """t(1) at 95 % is 12.706 (table of Student's t)."""
    group = only(four([40.0, 41.0], [0.1, 0.1], patches=True))
    assert group.dof == 1
    assert summarise(group.result, COVERAGE).k == pytest.approx(12.706, rel=0.01)
    assert group.status == "qualified"
    assert group.notes == ("two passes only",)


def test_one_patch_holds_for_this_patch():
    group = only(four(*WORKED))
    assert group.status == "qualified"
    assert group.notes == ("one patch: holds for this patch",)
    assert only(four(*WORKED, patches=True)).status == "ok"


def test_one_pass_has_a_value_and_no_interval():
    (group,) = groups = pooled([one_pass(kelvin(313.15, error("offset_error", 0.4, "t")),
                                         u_within=0.3)])
    assert group.status == "value only"
    assert group.notes == ("one pass",)
    row = surface_table(groups, COVERAGE).iloc[0]
    assert row.value == pytest.approx(40.0, abs=0.002)
    assert np.isnan([row.u, row.lower, row.upper, row.k, row.dof]).all()
    assert row.u_at_least == pytest.approx(0.5, abs=0.002)  # 3-4-5


def test_nothing_is_pooled_across_kinds():
    cloudy = Sky(300.0, 0.3, "diffuse")
    made = pooled([one_pass(albedo(0.2), quantity="albedo", n=1),
                   one_pass(albedo(0.2), quantity="albedo", n=2),
                   one_pass(albedo(0.24), quantity="albedo", sky=cloudy, n=3)])
    assert [(g.kind, len(g.used)) for g in made] == [("clear", 2), ("diffuse", 1)]


def test_a_refused_albedo_pass_stays_with_its_surface():
    made = pooled([one_pass(albedo(0.2), quantity="albedo", n=n) for n in (1, 2)]
                  + [one_pass((), quantity="albedo", sky=Sky(), note="no record", n=3)])
    (group,) = made
    assert (group.kind, len(group.used), len(group.passes)) == ("clear", 2, 3)
    assert "1 of 3 passes not evaluated: no record" in group.notes


# ---- shared errors

def test_a_shared_gain_cancels_in_a_difference():
    """.30 and .10, a gain of 3 %, random .004 each: the difference has .0082 with the gain shared,
    .0110 without (computed: sqrt((.2 * .03)^2 + 2 * .004^2) = .00825).
    """
    def surface(name, value, scope):
        gain = error("up_gain_error", 0.03, scope)
        n = 60
        return only([one_pass(albedo(value, gain), surface=name, quantity="albedo", n=i,
                              u_within=0.004 * np.sqrt(n)) for i in range(n)])

    def of_difference(one, two):
        a, b = surface("court", 0.30, one), surface("lawn", 0.10, two)
        return summarise(combine(lambda x, y: x - y, a.result, b.result), COVERAGE).u

    shared = "pair-2025:ground:gain"
    assert of_difference(shared, shared) == pytest.approx(0.0082, abs=0.0001)
    assert of_difference(shared, "other:ground:gain") == pytest.approx(0.0110, abs=0.0001)


def test_a_shared_gain_cancels_between_dates_too():
    gain = error("up_gain_error", 0.03, "pair-2025:ground:gain")
    made = [only([one_pass(albedo(0.3, gain), quantity="albedo", n=n) for n in range(4)],
                 campaign=name) for name in ("june", "july")]
    assert not np.ptp(made[0].result.systematic - made[1].result.systematic)


def test_what_passes_share_is_not_in_their_weights():
    """Two passes, one ten times as certain within; the offset that both have changes nothing."""
    def weights(*offset):
        return only([one_pass(kelvin(300.0, *offset), n=1, u_within=0.1),
                     one_pass(kelvin(300.0, *offset), n=2, u_within=1.0)]).weights

    assert weights() == pytest.approx([1 / 1.01, 0.01 / 1.01])
    assert weights(error("offset_error", 5.0, "thermal-2025:target:offset")) == pytest.approx(
        weights())


def test_what_one_pass_has_of_its_own_is_in_its_weight():
    levels = [error("levelling_error", 0.02, f"yard:pass:C1-albedo-{n}") for n in (1, 2)]
    group = only([one_pass(albedo(0.2, levels[0]), quantity="albedo", n=1, u_within=0.003),
                  one_pass(albedo(0.2), quantity="albedo", n=2, u_within=0.003)])
    assert group.weights == pytest.approx([9 / 34, 25 / 34])  # .003 and hypot(.003, .004)
    assert group.result.systematic.std() == 0


# ---- the calibration is the least

@pytest.mark.parametrize("coverage", [0.60, 0.683, 0.95, 0.99])
def test_an_interval_is_never_below_its_calibration(coverage):
    """However well the passes agree, U is at least k times .03 of .3 (k of the normal)."""
    gain = error("up_gain_error", 0.03, "pair-2025:ground:gain")
    group = only([one_pass(albedo(0.3, gain), quantity="albedo", n=n, u_within=1e-5)
                  for n in range(30)], coverage=coverage)
    found = summarise(group.result, coverage)
    k = {0.60: 0.8416, 0.683: 1.0006, 0.95: 1.9600, 0.99: 2.5758}[coverage]
    assert (found.upper - found.lower) / 2 == pytest.approx(k * 0.009, rel=0.01)
    assert found.u >= 0.009 * 0.999


def test_stated_uncertainties_beyond_the_model_are_told_and_no_crash():
    """An emissivity of .3 with u .2: draws below zero have no temperature."""
    wild = Input("emissivity", 0.3, 0.2, "emissivity:court", "")
    group = only([one_pass(kelvin(300.0, wild), n=n) for n in (1, 2, 3)])
    assert group.status == "not evaluated"
    assert group.notes == ("the stated uncertainties of its inputs reach beyond the range of the "
                           "model",)
    assert np.isnan(group.value)


# ---- budget

def budget_passes():
    shared = (error("offset_error", 0.4, "thermal-2025:target:offset"),
              Input("emissivity", 0.95, 0.01, "emissivity:court:x", ""),
              Input("sky_factor", 1.0, 0.15, "yard:sky", ""))
    return [one_pass(kelvin(320 + d, *shared), n=n, u_within=0.3)
            for n, d in enumerate((0, 0.4, -0.2, 0.1), 1)]


def test_budget_shares_sum_to_one_and_contributions_to_u():
    group = only(budget_passes())
    table = budget_table([group])
    assert table.share.sum() == pytest.approx(1, abs=1e-12)
    combined = np.sqrt((table.contribution**2).sum())
    assert combined == pytest.approx(summarise(group.result, COVERAGE).u, rel=0.01)
    assert table.contribution.is_monotonic_decreasing
    assert table.loc[table.scope == "yard:sky", "u_input"].item() == 0.15
    # the worked stand-off case has .54 K for .01 of emissivity and .41 K for .4 K of reading
    rows = table.set_index("scope").contribution
    assert rows["emissivity:court:x"] == pytest.approx(0.54, abs=0.02)
    assert rows["thermal-2025:target:offset"] == pytest.approx(0.413, abs=0.005)


def test_errors_of_one_scope_add_with_their_signs():
    """A coefficient known to .5 K per K/min: passes that warm and cool alike leave nothing."""
    def passes(*rates):
        out = []
        for n, rate in enumerate(rates, 1):
            these = kelvin(300.0, error("body_rate_error", 0.5, "yard:thermal:body rate"))
            out.append(one_pass(tuple(replace(i, value=rate) if i.name == "body_rate_k_min" else i
                                      for i in these), n=n))
        return only(out)

    def contribution(group):
        return next((r["contribution"] for r in group.budget if r["scope"].endswith("rate")), 0.0)

    assert contribution(passes(0.4, 0.4)) == pytest.approx(0.2, abs=0.001)
    assert contribution(passes(0.4, -0.4)) == pytest.approx(0, abs=1e-9)
    assert passes(0.4, -0.4).result.systematic.std() == pytest.approx(0, abs=1e-4)


def test_a_single_pass_has_its_own_scatter_in_the_budget():
    table = budget_table([only(budget_passes()[:1])])
    last = table[table.source == "scatter within the one pass"]
    assert last.contribution.item() == pytest.approx(0.3, abs=1e-3)
    assert table.share.sum() == pytest.approx(1, abs=1e-12)


# ---- order, notes, tables

def test_the_order_of_the_passes_changes_nothing():
    passes = budget_passes() + four(*WORKED, surface="lawn", patches=True)
    rng = np.random.default_rng(1)
    one = surface_table(pooled(passes), COVERAGE).set_index("surface").sort_index()
    for _ in range(3):
        shuffled = [passes[i] for i in rng.permutation(len(passes))]
        two = surface_table(pooled(shuffled), COVERAGE).set_index("surface").sort_index()
        for column in one.columns:
            if one[column].dtype == float:
                assert np.allclose(one[column], two[column], rtol=1e-9, equal_nan=True), column
            else:
                assert (one[column] == two[column]).all(), column


def test_the_reason_most_passes_share_carries_their_mean():
    words = ("computed sun below the horizon while the pair reads {} W m-2: "
             "check longitude, zone or clock")
    group = only([one_pass((), quantity="albedo", sky=Sky(), note=words.format(x), n=n)
                  for n, x in enumerate((559, 576, 578, 564), 1)]
                 + [one_pass((), quantity="albedo", sky=Sky(), note="no record", n=5)])
    assert group.status == "not evaluated"
    assert group.notes == (words.format(569),)  # (559 + 576 + 578 + 564) / 4 = 569.25


def test_numbers_that_are_names_are_not_averaged():
    notes = [f"width_m and length_m of patch 'C{n}' are missing" for n in (1, 3)]
    group = only([one_pass((), quantity="albedo", sky=Sky(), note=note, n=n)
                  for n, note in enumerate(notes, 1)])
    assert group.notes == (notes[0],)


def test_flags_of_half_the_passes_qualify_the_surface():
    def notes(*flagged):
        return only([one_pass(kelvin(300.0), n=n, patch=f"C{n}", flags=("calibration expired",)
                              if on else ("walls not measured",))
                     for n, on in enumerate(flagged)]).notes

    assert notes(True, True, False, False) == ("calibration expired",)
    assert notes(True, False, False) == ()


def test_tables_show_degrees_celsius_and_every_pass():
    passes = [*budget_passes(), one_pass((), note="no record", n=9)]
    tables = pass_tables("yard", passes)
    assert len(tables["passes"]) == 5
    assert tables["passes"].value[0] == pytest.approx(
        (passes[0].value - 273.15), abs=1e-9)
    last = tables["passes"].iloc[-1]
    assert (last.status, last.note) == ("not evaluated", "no record")
    assert np.isnan(last.value)


def test_the_same_draws_give_the_same_table():
    one, two = (surface_table(pooled(budget_passes()), COVERAGE) for _ in range(2))
    assert one.equals(two)
