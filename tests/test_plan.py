"""The plan of a survey day: sun windows, heights, speeds, passes, order, and the sheet to print."""

from __future__ import annotations

import dataclasses
import re
import shutil

import html5lib
import numpy as np
import pandas as pd
import pvlib
import pytest
from projects import DEMO, copy_project, surveykit

from surveykit import planning
from surveykit.intake.fieldsheet import read_sheet
from surveykit.opening import open_file
from surveykit.physics.footprint import best_height_m, disc_share
from surveykit.physics.walking import footprint_m, lanes, spot_height_m, walking_speed_m_s
from surveykit.planning.day import _channel, _height
from surveykit.statistics.pooling import passes_needed


@pytest.fixture(scope="module")
def project(tmp_path_factory):
    return copy_project(tmp_path_factory.mktemp("plan") / "project")


@pytest.fixture(scope="module")
def survey(project):
    return open_file(project / "params" / f"{DEMO[1]}.yml")


@pytest.fixture(scope="module")
def plan(survey):
    return planning.make(survey)


@pytest.fixture(scope="module")
def visits(survey, plan):
    return planning.order(survey, plan, planning.rounds_needed(survey, plan))


def test_sun_windows_agree_with_pvlib(survey, plan):
    """Independent library: pvlib's own solar position, its default method, minute by minute."""
    site = survey.campaign.site
    times = pd.date_range(survey.campaign.date, periods=24 * 60, freq="min", tz=site.time_zone)
    with np.errstate(all="ignore"):
        sun = pvlib.solarposition.get_solarposition(
            times, site.latitude, site.longitude, altitude=site.elevation_m)
    for row in plan.windows.to_dict("records"):
        inside = times[(sun["apparent_zenith"] <= row["limit_deg"]).to_numpy()]
        for mine, theirs in ((row["first"], inside[0]), (row["last"], inside[-1])):
            hour, minute = map(int, mine.split(":"))
            assert abs(hour * 60 + minute - (theirs.hour * 60 + theirs.minute)) <= 1
        assert row["hours"] == pytest.approx(len(inside) / 60, abs=0.06)


def test_hours_of_sun_at_40_north(survey):
    """Computed (two independent scripts): zenith below 45 degrees at 40 N for 6.7 h on 21 June,
    3.0 h on 20 March and not at all in December."""
    for day, hours in (("2025-06-21", 6.7), ("2025-03-20", 3.0), ("2025-12-21", 0.0)):
        other = changed(survey, date=day,
                        site=survey.campaign.site.model_copy(update={"latitude": 40.0}))
        windows = planning.sun_windows(planning.sun_course(other), other)
        assert windows["hours"].iloc[0] == pytest.approx(hours, abs=0.15), day
        if not hours:
            assert windows["first"].iloc[0] == "never"


def changed(survey, **sections):
    campaign = survey.campaign.model_copy(update=sections)
    return dataclasses.replace(survey, parameters=dataclasses.replace(
        survey.parameters, campaign=campaign))


def test_a_day_whose_midnight_the_clocks_leap_over(survey):
    """Chile puts its clocks forward at midnight: 7 September 2025 begins at 01:00 (IANA zone)."""
    site = survey.campaign.site.model_copy(update={
        "latitude": -33.4, "longitude": -70.6, "time_zone": "America/Santiago"})
    course = planning.sun_course(changed(survey, date="2025-09-07", site=site))
    assert course["time_utc"].iloc[0] == pd.Timestamp("2025-09-07T04:00Z")


def test_limits_of_the_sun_that_coincide_keep_both_meanings(survey):
    albedo = survey.campaign.settings.albedo.model_copy(update={"zenith_standard_deg": 60.0})
    other = changed(survey, settings=survey.campaign.settings.model_copy(
        update={"albedo": albedo}))
    windows = planning.sun_windows(planning.sun_course(other), other)
    assert windows["meaning"].iloc[0] == "albedo, standard; albedo, qualified"


def test_a_wider_coverage_needs_more_passes(survey, plan):
    statistics = survey.campaign.settings.statistics.model_copy(update={"coverage": 0.99})
    other = changed(survey, settings=survey.campaign.settings.model_copy(
        update={"statistics": statistics}))
    wide = planning.make(other).passes
    assert (wide["passes"] >= plan.passes["passes"]).all()
    assert (wide["passes"] > plan.passes["passes"]).any()


@pytest.mark.parametrize(("radius", "zenith", "contrast", "height_cm"), [
    (0.25, 30, 0.5, 9.2), (0.25, 30, 1.0, 7.6), (0.25, 45, 0.5, 7.8), (0.25, 60, 0.5, 6.0),
    (0.5, 30, 0.5, 12.7), (0.5, 30, 1.0, 10.6), (0.5, 45, 0.5, 10.7), (0.5, 60, 0.5, 8.4),
    (1.0, 30, 0.5, 17.8), (1.0, 30, 1.0, 14.9), (1.0, 45, 0.5, 14.9), (1.0, 60, 0.5, 11.8),
    (2.0, 30, 0.5, 25.0), (2.0, 30, 1.0, 21.0), (2.0, 45, 0.5, 21.0), (2.0, 60, 0.5, 16.6)])
def test_best_heights(radius, zenith, contrast, height_cm):
    """Computed, by a second script's numeric optimum; head of 3 cm radius, beam fraction .85."""
    height = best_height_m(0.03, radius, contrast, zenith, 0.85)
    assert 100 * height == pytest.approx(height_cm, abs=0.06)


def test_the_plan_puts_the_albedo_head_at_the_best_height(survey, plan):
    albedo = plan.heights[plan.heights["reading"] == "albedo"]
    assert len(albedo) == len(plan.patches)
    head = next(c for c in survey.parameters.channels("shortwave")
                if c.quantity == "shortwave_up").head_radius_m
    zenith = plan.course["zenith_deg"].min()
    for row in albedo.to_dict("records"):
        patch = next(p for p in plan.patches if p.name == row["patch"])
        # by brute force on the two errors themselves, not by the optimiser
        curve = plan.curves[plan.curves["across_m"] == patch.across_m]
        assert len(curve)
        grid = np.geomspace(0.02, 1.0, 4000)
        around = survey.campaign.surfaces[patch.surface].around.amount.value
        assert 0 < zenith < 45
        assert 0 < around < 1
        assert grid[0] < row["height_m"] < grid[-1]
        assert row["height_m"] > head
        assert row["footprint_m"] == pytest.approx(6 * row["height_m"])
        assert disc_share(row["footprint_m"] / 2, row["height_m"]) == pytest.approx(0.9)


@pytest.mark.parametrize(("between", "within", "wanted", "passes"), [
    (0.5, 0.3, 1.0, 4), (0.5, 0.3, 0.5, 8), (1.0, 0.3, 1.0, 7), (1.0, 0.3, 0.5, 20),
    (0.01, 0.005, 0.01, 8), (0.02, 0.005, 0.01, 19)])
def test_passes_for_a_wanted_interval(between, within, wanted, passes):
    """Computed, by a second script: least k with t(.975, k - 1) sqrt((b^2 + w^2) / k) <= U."""
    assert passes_needed(between, within, wanted) == passes


def test_passes_take_the_spread_of_the_earlier_campaign(plan, survey):
    assert set(plan.passes["source"]) == {DEMO[0]}
    for row in plan.passes.to_dict("records"):
        assert row["passes"] == passes_needed(row["between"], row["within"], row["wanted"])
    first = open_file(survey.parameters.root / "params" / f"{DEMO[0]}.yml")
    defaults = planning.make(first).passes
    assert set(defaults["source"]) == {"settings"}
    row = defaults[defaults["quantity"] == "temperature"].iloc[0]
    assert (row["between"], row["within"], row["wanted"], row["passes"]) == (0.5, 0.3, 1.0, 4)


def test_what_a_plan_assumes_is_a_setting(survey):
    """Each moves what it says: reach the heights, patience the control, spread the passes."""
    def planned(**changed):
        settings = survey.campaign.settings
        settings = settings.model_copy(update={
            "planning": settings.planning.model_copy(update=changed)})
        campaign = survey.campaign.model_copy(update={
            "settings": settings,
            "comparison": survey.campaign.comparison.model_copy(update={"earlier": ()})})
        other = dataclasses.replace(survey, made={}, parameters=dataclasses.replace(
            survey.parameters, campaign=campaign))
        made = planning.make(other)
        return made, planning.order(other, made, planning.rounds_needed(other, made))

    plan, visits = planned()
    low, seldom = planned(reach_m=0.5, control_every_min=1e6)
    assert plan.heights["height_m"].max() == pytest.approx(1.0)
    assert low.heights["height_m"].max() == pytest.approx(0.5)
    control = survey.campaign.comparison.control
    assert (visits["surface"] == control).sum() > (seldom["surface"] == control).sum() == 2
    wide, _ = planned(albedo_between=0.02)
    need = [made.passes.set_index("quantity")["passes"]["albedo"].iloc[0] for made in (plan, wide)]
    assert need == [passes_needed(0.01, 0.005, 0.02), passes_needed(0.02, 0.005, 0.02)]
    assert need[1] > need[0]


def test_the_wait_is_the_heads_settling_time(plan):
    """Time constants of the demo's kit times ln(1 / .0033) = 5.714 (hand arithmetic): of a step
    of 30 K .1 K is left."""
    waits = plan.heights.groupby("reading")["settle_s"].first()
    for reading, tau in {"stand-off": 0.3, "albedo": 1.0}.items():
        assert waits[reading] == pytest.approx(5.714 * tau, rel=1e-3)


def test_a_tilted_head_is_held_lower(survey, plan):
    """A cone of 10 degrees tilted by 50 has a spot tan 60 - tan 40 = .893 heights long, straight
    down 2 tan 10 = .353: held .395 as high for a spot as long (closed form)."""
    patch = next(p for p in plan.patches if np.isfinite(p.across_m))
    head = dataclasses.replace(_channel(survey, "brightness_temperature"), half_angle_deg=10.0)
    down, tilted = (_height(survey, dataclasses.replace(patch, length_m=1.0, width_m=1.0),
                                "stand-off", dataclasses.replace(head, view_angle_deg=angle),
                                30.0, 0.5)[0] for angle in (None, 50.0))
    assert tilted["height_m"] / down["height_m"] == pytest.approx(0.395, abs=1e-3)
    assert tilted["footprint_m"] == pytest.approx(down["footprint_m"])
    aloft = dataclasses.replace(head, half_angle_deg=45.0, view_angle_deg=45.0)
    row, _ = _height(survey, patch, "stand-off", aloft, 30.0, 0.5)
    assert np.isnan(row["height_m"])
    assert row["note"] == "the head looks above the horizon"


def test_walking_by_hand():
    """Hand arithmetic: 0.5 m in three time constants of 1 s; a cone of 22 degrees fills a third of
    a patch of 1 m from 1 / (6 tan 22 deg) = 0.4125 m; a full view of 125 degrees held at 5 cm sees
    19.2 cm (common practice, no source)."""
    assert walking_speed_m_s(0.5, 1.0) == pytest.approx(1 / 6)
    assert spot_height_m(1.0, 22.0, 1 / 3) == pytest.approx(0.41252, abs=1e-5)
    assert footprint_m(0.05, 62.5) == pytest.approx(0.192, abs=5e-4)
    assert lanes(4.0, 0.7) == 6
    with pytest.raises(ValueError, match="finite width"):
        lanes(float("nan"), 0.7)


def test_order_keeps_the_control_close_and_gives_each_surface_its_passes(survey, plan, visits):
    control = survey.campaign.comparison.control
    own = visits.loc[visits["surface"] == control, "starts_min"].to_numpy()
    assert own[0] == 0
    assert visits["surface"].iloc[-1] == control
    longest = max(planning.visit_minutes(survey, p) for p in plan.patches)
    assert np.diff(own).max() <= 20 + longest
    for row in plan.passes.to_dict("records"):
        if row["surface"] != control:
            assert (visits["surface"] == row["surface"]).sum() >= row["passes"]
    forward, back = ([*block.loc[block["surface"] != control, "patch"]]
                     for number, block in visits.groupby("round") if number < 3)
    assert forward == back[::-1]


def test_the_field_sheet_is_read_once_times_are_filled_in(survey, plan, visits, tmp_path):
    sheet = planning.field_sheet(survey, plan, visits)
    minute = pd.Timestamp(f"{survey.campaign.date} 10:00:00")
    ends = [minute + pd.Timedelta(seconds=70 * n) for n in range(len(sheet) + 1)]
    sheet["start"] = [f"{t:%H:%M:%S}" for t in ends[:-1]]
    sheet["stop"] = [f"{t - pd.Timedelta(seconds=5):%H:%M:%S}" for t in ends[1:]]
    path = tmp_path / "field_sheet.csv"
    sheet.to_csv(path, index=False)
    read = read_sheet(path, survey.parameters)
    assert len(read.entries) == len(sheet)
    assert {e.entry for e in read.entries} == {"pass", "dark", "cover"}


def test_a_campaign_without_files_is_planned_on_the_command_line(project):
    """Before the day there is no log and no field sheet; sizes are asked for, not guessed."""
    name = "pellowick-yard-2025-10-01"
    text = (project / "params" / f"{DEMO[0]}.yml").read_text(encoding="utf-8")
    text = text.replace(DEMO[0], name).replace("2025-06-11", "2025-10-01")
    (project / "params" / f"{name}.yml").write_text(text, encoding="utf-8")
    done = surveykit(project, "plan", f"params/{name}.yml")
    assert done.returncode == 0, done.stderr
    folder = project / "reports" / f"{name}.plan"
    assert sorted(p.name for p in folder.iterdir()) == [
        "field_sheet.csv", "field_sheet.html", "plan.html"]
    for page in ("plan.html", "field_sheet.html"):
        html = (folder / page).read_text(encoding="utf-8")
        html5lib.HTMLParser(strict=True).parse(html)
        assert "Local rules" in html
        assert not re.search(r"\b(nan|NaN|None)\b", re.sub(r"base64,[^\"]+", "", html))
    html = (folder / "plan.html").read_text(encoding="utf-8")
    assert "the patch’s size is not known" in html
    assert "No field sheet names patches yet" in html
    shutil.rmtree(folder)
