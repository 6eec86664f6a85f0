"""Numbers of results, comparisons and budgets to their printed digits, through passes and surfaces.

All are computed by two independent scripts that share no code with this package, unless a line says
otherwise.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from one_estimate import WEATHER, changed, stand_off
from pass_values import DRAWS, bright, error, heat, kelvin, one_pass, pooled
from scipy import stats
from small_survey import STAND_OFF, lines, row, small

from surveykit.core import Input
from surveykit.evidence.changes import MATCHED, RATIO
from surveykit.evidence.comparability import Date
from surveykit.evidence.compare import changes
from surveykit.evidence.surfaces import budget_table, groups, surface_table
from surveykit.intake.paths import walk
from surveykit.report.wording import NO_BREAK, interval
from surveykit.statistics.draws import Draws, combine, summarise

ICE = 273.15
MANY = 60  # passes: Student's t is nearly the normal law, and u the root of a sum


def worked(*, calibration="thermal-2025", ground="court", u_offset=0.4, u_emissivity=0.01):
    """47.0 degC read, emissivity .95, air 30 degC, humidity 30 %, open sky: 49.567 degC."""
    return kelvin(
        47.0 + ICE, error("offset_error", u_offset, f"{calibration}:target:offset"),
        Input("emissivity", 0.95, u_emissivity, f"emissivity:{ground}:x", "emissivity"),
        Input("air_k", 30 + ICE, 1.0, "weather:air:offset", "air"),
        Input("relative_humidity", 0.30, 0.05, "weather:humidity:offset", "humidity"),
        Input("sky_factor", 1.0, 0.15, "yard:sky", "sky"))


def surface(these, name="court", n=MANY, u_within=1e-4, draws=DRAWS):
    (group,) = groups("yard", [one_pass(these, surface=name, patch=f"{name}{i}", n=i,
                                        u_within=u_within) for i in range(n)], draws, coverage=0.95)
    return group


# ---- the worked temperature as a surface

def test_the_worked_temperature_is_printed_as_it_should_be():
    """49.6 degC, U 1.4 K; the ends 48.2 and 51.0."""
    row_ = surface_table([surface(worked())], 0.95).iloc[0]
    assert row_.u == pytest.approx(0.712, abs=0.005)
    assert [row_.lower, row_.upper] == pytest.approx([48.20, 50.99], abs=0.03)
    text = interval(row_.value, row_.lower, row_.upper, 1)
    assert text.replace(NO_BREAK, " ") == "49.6 ± 1.4"


def test_what_halving_the_emissivitys_u_gains():
    """56 % of the variance is emissivity; halved, U goes from 1.4 to 1.1 K."""
    table = budget_table([surface(worked())]).set_index("source")
    assert table.index[0] == "emissivity"
    assert table.share["emissivity"] == pytest.approx(0.56, abs=0.01)
    whole = 1.96 * 0.712
    assert whole == pytest.approx(1.4, abs=0.05)
    assert whole - table.narrower["emissivity"] == pytest.approx(1.1, abs=0.05)
    halved = summarise(surface(worked(u_emissivity=0.005)).result, 0.95)
    assert (halved.upper - halved.lower) / 2 == pytest.approx(
        whole - table.narrower["emissivity"], rel=0.02)


@pytest.mark.parametrize(("calibration", "ground", "u"), [
    ("thermal-2025", "court", 0.28), ("new", "lawn", 1.08)])
def test_two_temperatures_of_one_head_and_one_material(calibration, ground, u):
    """Calibration .5, emissivity .54, noise .2 K each: .28 K between them, not 1.08 K."""
    def made(name, **whose):
        these = worked(u_offset=0.5 / 1.032, u_emissivity=0.0101, **whose)
        only = tuple(replace(i, u=0.0) if i.scope.startswith(("weather", "yard")) else i
                     for i in these)  # what these numbers leave out
        return surface(only, name, u_within=0.2 * np.sqrt(MANY), draws=Draws(1, 200_000)).result

    one = made("court")
    two = made("lawn", calibration=calibration, ground=ground)
    assert summarise(combine(lambda a, b: a - b, one, two), 0.95).u == pytest.approx(u, abs=0.005)


@pytest.mark.parametrize(("passes", "t"), [(2, 12.7), (3, 4.3), (4, 3.2)])
def test_what_few_passes_cost(passes, t):
    """Student's t at 95 %: 12.7, 4.3, 3.2 (table of Student's t)."""
    found = summarise(pooled([one_pass(kelvin(300.0 + 0.1 * (-1) ** i), n=i, u_within=1e-3)
                              for i in range(passes)])[0].result, 0.95)
    # the draws' own error of an end of so long a tail is a per cent
    assert found.k == pytest.approx(t, abs=0.05 + 0.01 * t)
    assert stats.t.ppf(0.975, found.dof) == pytest.approx(t, abs=0.05)


# ---- between dates

def test_an_albedo_under_a_lower_sun_holds_the_dependences_size():
    """From 30 to 60 degrees .067 of the albedo with d .1: .02 at .30."""
    now = bright("june", {"court": 0.30}, zenith_deg=60.0, control=None, u=1e-6)
    then = bright("may", {"court": 0.30}, zenith_deg=30.0, control=None, u=1e-6)
    made = changes(now, (then,), DRAWS)
    row_ = made[made.method == MATCHED].iloc[0]
    assert row_.u == pytest.approx(0.02, abs=5e-4)
    assert row_.u / 0.30 == pytest.approx(0.067, abs=5e-4)


@pytest.mark.parametrize("excess", [8.5, 20.0, 40.0])
def test_the_ratio_is_less_sure_near_the_air(excess):
    """u of the ratio grows as one over what the control stands above the air: a surface 10 K above
    the air, control known to .1 K on both dates (analytic: theta .1 sqrt 2)."""
    air = 303.15
    pair = {"court": air + 10, "control": air + excess}
    settings = {"comparison": {"model_u_matched": 0.0, "model_u_partly": 0.0}}

    def day(name):
        made = heat(name, pair, u=1e-6, n=MANY, settings=settings)
        sure = {k: g for k, g in made.groups.items() if k[0] != "control"}
        loose = heat(name, {"control": air + excess}, u=0.1 * np.sqrt(MANY), n=MANY,
                     settings=settings)
        return Date(made.parameters, sure | loose.groups)

    row_ = changes(day("june"), (day("may"),), DRAWS).set_index(["surface", "method"])
    got = row_.u["court", RATIO]
    assert got == pytest.approx(10 / excess * 0.1 * np.sqrt(2), rel=0.03)


# ---- in time and on the way

HOT = np.arange(160) >= 75  # from 12:01:15 on the log shows the neighbour, 20 K hotter


def timed(root, overlap, sheet_u_s):
    """A pass written as a minute, of which the last seconds lie on the neighbour."""
    cells = STAND_OFF | {"start": f"12:00:{15 + overlap}", "stop": f"12:01:{15 + overlap}"}
    assert HOT[15 + overlap:75 + overlap].sum() == overlap
    target = np.where(HOT, 67.0, 47.0) + 0.01 * np.resize([1, -1], 160)
    return stand_off(root, cells, WEATHER | {"thermal": lines("thermal", target=target)}, settings={
        "passes": {"sheet_u_s": sheet_u_s}, "quality": {
            "step_max_k_s": 1e3, "spike_mad": 1e6, "flatline_max_repeat": 0.999}},
        surfaces={"court": {"label": "Court", "emissivity": {
            "value": 1.0, "u": 0.0, "source": "black, invented"}}})


@pytest.mark.parametrize(("overlap", "kelvins"), [(5, 1.7), (10, 3.3)])
def test_a_neighbour_within_the_edges_of_a_minute(tmp_path, overlap, kelvins):
    """20 K hotter: .33 K a second of overlap, 1.7 K in 5 s, 3.3 K in 10 s; trimmed by as much as
    the written times are unsure, nothing of it is left.
    """
    as_written = timed(tmp_path / "a", overlap, 0.0)
    assert as_written.value - ICE - 47 == pytest.approx(kelvins, abs=0.05)
    trimmed = timed(tmp_path / "b", overlap, float(overlap))
    assert trimmed.value - ICE == pytest.approx(47, abs=0.01)


def test_a_class_c_head_smears_five_metres(tmp_path):
    """t95 30 s is a time constant of 10 s (a third); at .5 m/s a reading belongs 5 m behind."""
    kit = changed("pair", time_constant_s=None, t95_s=30.0)
    cells = {"quantity": "albedo", "height_cm": "40", "width_m": "30", "length_m": "60",
             "lanes": "1"}
    survey = small(tmp_path, [row(**cells)], {"pair": lines("pair")}, kit=kit)  # 60 m in 120 s
    (this,) = survey.passes
    tau = this.channels["shortwave_up"].time_constant_s
    assert tau == pytest.approx(10, abs=0.02)
    time = this.start_ns + (np.array([60.0, 90.0]) * 1e9).astype(np.int64)
    path = walk(this, time, survey.parameters)
    assert 0.5 * np.array([60, 90]) - path.x_m == pytest.approx([5.0, 5.0], abs=0.01)


def test_a_drift_of_the_day_is_no_gradient_once_walked_back(tmp_path):
    """3 K/h walked in 20 min looks like 1 K across the patch; a second pass the other way round
    cancels it at every point (arithmetic, by the walk's own places)."""
    cells = {"quantity": "albedo", "height_cm": "40", "width_m": "40", "length_m": "40",
             "lanes": "1", "start": "12:00:00", "stop": "12:20:00"}
    survey = small(tmp_path, [row(**cells)], {"pair": lines("pair")})
    (this,) = survey.passes
    seconds = np.linspace(0, 1200, 41)[1:-1]
    path = walk(this, this.start_ns + (seconds * 1e9).astype(np.int64), survey.parameters)
    drift = 3.0 * seconds / 3600
    slope = np.polyfit(path.x_m, drift, 1)[0]
    assert slope * 40 == pytest.approx(1.0, abs=1e-6)
    back = 3.0 * (2400 - seconds) / 3600  # the same places on the way back
    assert np.ptp(drift + back) == pytest.approx(0, abs=1e-9)
