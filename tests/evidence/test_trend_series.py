"""Trends over dates, families, two controls, interventions."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from pass_values import DRAWS, bright, error, heat

from surveykit.evidence.changes import DOUBLE
from surveykit.evidence.comparability import Date
from surveykit.evidence.compare import changes, differences, ranks
from surveykit.evidence.series import trends
from surveykit.intake.params.sections import Comparison, Intervention
from surveykit.statistics.draws import combine, summarise

DAYS = ("2021-06-01", "2022-06-01", "2023-06-01", "2024-06-01", "2025-06-01")


def with_comparison(date: Date, *, done: tuple[Intervention, ...] = (), **more) -> Date:
    campaign = date.parameters.campaign
    comparison = Comparison(**({"control": "control"} | more))
    return Date(replace(date.parameters, campaign=campaign.model_copy(
        update={"comparison": comparison, "interventions": done})), date.groups)


def years(values, *, u=0.001):
    return [bright(f"y{day[:4]}", {"court": v, "control": 0.2}, day=day, u=u)
            for day, v in zip(DAYS, values, strict=False)]


def test_a_steady_change_is_established_by_both_lines():
    """.02 a year over three years, .0001 off the line."""
    *earlier, now = years([0.30, 0.3201, 0.34])
    made = trends(now, earlier, DRAWS).set_index("method")
    assert made.slope["weighted line"] == pytest.approx(0.02, abs=2e-4)
    assert made.slope["ordinary line"] == pytest.approx(0.02, abs=3e-5)
    assert made.verdict["weighted line"] == "higher"
    assert (made.verdict["ordinary line"], made.dates["weighted line"]) == ("", 3)
    assert (made["first"].iloc[0], made["last"].iloc[0]) == ("2021-06-01", "2023-06-01")


def test_a_step_is_no_trend_where_the_lines_disagree():
    """Known u says yes, the scatter about the line (1 degree of freedom) says no."""
    *earlier, now = years([0.20, 0.30, 0.30])
    row = trends(now, earlier, DRAWS).iloc[0]
    assert row.p < 0.05
    assert row.verdict == "no difference shown"
    assert row.note.startswith("trend not established: the two lines disagree")


def test_from_five_dates_the_median_of_slopes_joins():
    *earlier, now = years([0.20, 0.22, 0.24, 0.26, 0.28])
    made = trends(now, earlier, DRAWS)
    assert made.method.tolist() == ["weighted line", "ordinary line", "median of slopes"]
    assert made.p.iloc[2] == pytest.approx(2 / 120)  # Mann-Kendall, all five in order: 2 / 5!
    assert len(trends(now, earlier[:1], DRAWS)) == 0


def test_the_weather_does_not_make_a_trend_of_temperatures():
    """A surface always half as far above the air as the control, on ever milder days."""
    dates = [heat(f"y{i}", {"court": 303.15 + 0.5 * e, "control": 303.15 + e}, u=0.02)
             for i, e in enumerate((30.0, 20.0, 12.0))]
    for date, day in zip(dates, DAYS, strict=False):
        object.__setattr__(date.parameters, "campaign",
                           date.parameters.campaign.model_copy(update={"date": day}))
    row = trends(dates[2], dates[:2], DRAWS).iloc[0]
    assert row.slope == pytest.approx(0.0, abs=0.05)
    assert row.verdict == "no difference shown"


def test_families_are_judged_apart_and_pairs_outside_are_not_judged():
    date = heat("june", {"court": 320.0, "control": 319.85, "lawn": 319.7, "path": 310.0})
    made = differences(with_comparison(date, families={
        "hard": ["court", "control"], "rest": ["lawn", "path"]}), DRAWS)
    rows = {(r.surface, r.other): r for r in made.itertuples()}
    assert rows["court", "lawn"].verdict == ""
    assert "not in one of the families" in rows["court", "lawn"].note
    whole = {(r.surface, r.other): r for r in differences(date, DRAWS).itertuples()}
    pair = "court", "control"
    assert rows[pair].p_adjusted < whole[pair].p_adjusted
    assert rows[pair].upper_all < whole[pair].upper_all
    assert rows[pair].upper_all == pytest.approx(rows[pair].upper, rel=1e-2)


def test_two_controls_that_moved_apart_are_said_on_every_row():
    then = bright("may", {"court": 0.3, "control": 0.2, "path": 0.25})
    now = with_comparison(bright("june", {"court": 0.3, "control": 0.2, "path": 0.29},
                                 day="2025-07-11"), second_control="path")
    made = changes(now, (then,), DRAWS)
    row = made[(made.surface == "court") & (made.method == DOUBLE)].iloc[0]
    assert "the controls moved apart: path against control by +0.04" in row.note
    calm = with_comparison(bright("june", {"court": 0.3, "control": 0.2, "path": 0.25},
                                  day="2025-07-11"), second_control="path")
    assert not changes(calm, (then,), DRAWS).note.str.contains("controls").any()


def test_interventions_stand_on_the_change_across_their_day():
    done = (Intervention(date="2025-07-01", surface="court", text="pale coating"),)
    then = bright("may", {"court": 0.2, "control": 0.2})
    now = with_comparison(bright("july", {"court": 0.3, "control": 0.2}, day="2025-07-11"),
                          done=done)
    made = changes(now, (then,), DRAWS)
    assert made[made.verdict == "higher"].note.iloc[0].startswith("2025-07-01: pale coating")
    early = with_comparison(now, done=(replace_day(done[0], "2025-01-01"),))
    assert "coating" not in "".join(changes(early, (then,), DRAWS).note)


def replace_day(done: Intervention, day: str) -> Intervention:
    return done.model_copy(update={"date": day})


@pytest.mark.parametrize(("second", "u"), [("pair-2025:up:gain", 0.0082), ("new:up:gain", 0.0110)])
def test_a_change_under_a_kept_and_under_a_renewed_calibration(second, u):
    """.30 on one date, .10 on the other, gain 3 %, .004 each: sqrt((.2 * .03)^2 + 2 * .004^2) =
    .00825 with one calibration, .0110 with two (computed).
    """
    n = 60
    dates = [bright(name, {"court": value}, u=0.004 * np.sqrt(n), n=n,
                    shared=(error("up_gain_error", 0.03, scope),))
             for name, value, scope in (("may", 0.3, "pair-2025:up:gain"), ("june", 0.1, second))]
    a, b = (d.groups["court", "albedo", "clear"].result for d in dates)
    assert summarise(combine(lambda x, y: x - y, a, b), 0.95).u == pytest.approx(u, abs=1e-4)


def test_places_of_surfaces_sum_to_one():
    made = ranks(heat("june", {"court": 320.0, "lawn": 319.9, "control": 310.0}), DRAWS)
    assert made.groupby("surface").probability.sum().tolist() == pytest.approx([1, 1, 1])
    last = made[(made.surface == "control") & (made.place == 3)].probability.item()
    assert last == pytest.approx(1.0, abs=0.01)
