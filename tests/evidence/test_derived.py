"""Derived quantities and heights, from a small survey of two patches."""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import HEADS
from small_survey import KIT, LONGWAVE, NDVI, SIZE, flux, lines, row, small

from surveykit.evidence.derived import derived
from surveykit.evidence.estimates import estimate_all
from surveykit.evidence.geometry import geometry
from surveykit.evidence.surfaces import groups
from surveykit.physics.bands import band
from surveykit.physics.energy import solar_reflectance_index
from surveykit.physics.footprint import disc_share, self_shade
from surveykit.physics.surroundings import sky_radiance
from surveykit.physics.thermal import standoff_temperature_k
from surveykit.statistics.draws import Draws, summarise

N = 760
DRAWS = Draws(1, 4000)


def survey(root, **more):
    read = {"target": more.pop("target")} if "target" in more else {}
    sheet, logs = [], {"pair": lines("pair", n=N), "thermal": lines("thermal", n=N, **read),
                       "weather": lines("weather", n=14, step_s=60)}
    for number, minute in enumerate((0, 3, 6, 9)[:more.pop("passes", 4)]):
        times = {"start": f"12:0{minute}:10", "stop": f"12:{minute + 2:02d}:30",
                 "patch": f"C{number % 2 + 1}"}
        sheet.append(row(quantity="albedo", **(SIZE | {"height_cm": "50"} | times)))
        sheet.append(row(quantity="temperature", mode="stand-off",
                         **(SIZE | {"height_cm": "50"} | times)))
    made = small(root, sheet, logs, **more)
    day = made.day()
    found = estimate_all(day, made.passes)
    return day, found, groups(day.name, found, DRAWS, coverage=0.95)


def rows(root, **more):
    day, _, found = survey(root, **more)
    return derived(day, found, DRAWS, 0.95).set_index(["product", "form"])


def test_nothing_asked_nothing_derived(tmp_path):
    assert rows(tmp_path).empty


def test_sri_by_both_ways(tmp_path):
    day, _, found = survey(tmp_path, derived=["sri"])
    albedo = next(g.value for g in found if g.quantity == "albedo")
    made = derived(day, found, DRAWS, 0.95).set_index(["form"])
    want = solar_reflectance_index(albedo, 0.95, 12.0)
    assert made.value["balance, medium wind"] == pytest.approx(want.balance, abs=1e-6)
    assert made.value["equation, medium wind"] == pytest.approx(want.regression, abs=1e-6)
    # 1.3 per .01 of albedo and .43 per .01 of emissivity (method's slopes, computed)
    u_albedo = summarise(next(g for g in found if g.quantity == "albedo").result, 0.95).u
    assert made.u["balance, medium wind"] == pytest.approx(
        np.hypot(127 * u_albedo, 43 * 0.01), rel=0.1)
    assert "SRI-like" in made.note["balance, medium wind"]


def test_longwave_and_net_radiation_follow_from_the_surface(tmp_path):
    made = rows(tmp_path, derived=["longwave_up", "net_radiation", "surface_minus_air"])
    up = made.loc["longwave_up", "stand-off"]
    above = made.loc["surface_minus_air", "stand-off"]
    surface = above.value + 303.15
    down = 0.807 * 5.670374419e-8 * 303.15**4  # table of the sky model at 30 degC, 30 %
    assert up.value == pytest.approx(0.95 * 5.670374419e-8 * surface**4 + 0.05 * down, rel=2e-3)
    net = made.loc["net_radiation", "stand-off"]
    assert net.value == pytest.approx(0.8 * 900 + down - up.value, abs=4)
    assert net.u > 25  # the modelled sky's 30 W m-2 dominates
    assert "modelled" in net.note


def test_daily_albedo_lies_above_noon(tmp_path):
    day, _, found = survey(tmp_path, derived=["daily_albedo"])
    noon = next(g.value for g in found if g.quantity == "albedo")
    (made,) = derived(day, found, DRAWS, 0.95).to_dict("records")
    assert 1.02 < made["value"] / noon < 1.05  # d .1 in June: 1.036 at 40 N (computed)


def test_what_is_missing_is_named(tmp_path):
    made = rows(tmp_path, derived=["sri"], surfaces={"court": {
        "label": "Court", "emissivity": {"value": 0.95, "u": 0.01, "source": "invented"},
        "around": {"albedo": 0.2, "u": 0.03}}})
    assert made.status.tolist() == ["not evaluated"]
    assert made.note.tolist() == ["surfaces.court.emissivity_broadband is missing"]


# ---- caution

def caution_of(root, limit, **more):
    day, found, pooled = survey(root, caution={
        "temperature_degC": limit, "source": "rule 7, invented"}, **more)
    made = derived(day, pooled, DRAWS, 0.95).set_index(["product", "form"])
    group = next(g for g in pooled if g.quantity == "temperature")
    return made.loc["caution", "stand-off"], group, day, found


def test_a_caution_looks_at_the_hottest_records_not_at_the_mean(tmp_path):
    """15 s of every pass 10 K hotter, a tenth of it: the 95th percentile lies among them, by
    numpy's own quantile of the balance made record by record; U is that of the mean.
    """
    hot = np.where((np.arange(N) % 180 >= 60) & (np.arange(N) % 180 < 75), 57.0, 47.0)
    hot += np.resize([0.05, -0.05], N)
    one, group, day, _ = caution_of(tmp_path, 55.0, target=hot)
    window, air = band(8.0, 14.0), 303.15
    sky = float(sky_radiance(window, air, 0.30))
    each = standoff_temperature_k(window, hot + 273.15, 0.95, sky) - 273.15
    used = np.concatenate([day.quality.passes[p.this.name].index for p in group.used])
    assert one.value == pytest.approx(np.quantile(each[used], 0.95), abs=0.1)
    assert one.value > group.value - 273.15 + 8
    interval = summarise(group.result, 0.95)
    assert one.upper - one.value == pytest.approx(interval.upper - group.value)
    assert one.note == (
        f"caution: upper bound {one.upper:.1f} degC (95th percentile of the records, plus U) "
        "exceeds the 55 degC entered (rule 7, invented), consult local codes and the safety "
        "officer")


@pytest.mark.parametrize(("above", "over"), [(0.2, False), (-0.2, True)])
def test_a_caution_counts_the_uncertainty(tmp_path, above, over):
    """The limit a little above or below the upper bound, far above the value itself."""
    first, *_ = caution_of(tmp_path / "a", 60.0)
    one, *_ = caution_of(tmp_path / "b", float(first.upper) + above)
    assert one.note.startswith("caution") == over
    assert one.value < first.upper - 0.5
    assert not any(word in one.note.lower().replace("safety officer", "")
                   for word in ("safe", "compl", "harmless"))


def test_one_pass_has_no_upper_bound_and_is_cautioned_by_itself(tmp_path):
    one, group, *_ = caution_of(tmp_path, 40.0, passes=1)
    assert group.result is None
    assert np.isnan(one.upper)
    assert one.status == "value only"
    assert one.note == (
        f"caution: 95th percentile of the records {one.value:.1f} degC (one pass, so U is not "
        "known) exceeds the 40 degC entered (rule 7, invented), consult local codes and the "
        "safety officer")
    cold, *_ = caution_of(tmp_path / "b", 70.0, passes=1)
    assert not cold.note.startswith("caution")


# ---- indices

def test_savi_has_its_own_budget(tmp_path):
    """Factors .05 and .40, L .5: (1.5 * .35) / .95 = .5526; a common gain of 5 % moves it, unlike
    NDVI, by d SAVI = .0136 (hand arithmetic: 1.5 * .3675 / .9725 - .5526).
    """
    sheet = [row(**NDVI | {"start": f"12:0{m}:10", "stop": f"12:0{m + 2}:30"}) for m in (0, 3, 6)]
    kit = KIT | {name: KIT[name] | {"columns": {
        c: flux(f"{c}_{way}", u_gain=0.05, u_offset=0.0) for c in ("red", "nir")}}
        for name, way in (("rednir-sky", "down"), ("rednir-ground", "up"))}
    logs = {name: lines(name, n=600, kit=kit) for name in HEADS}
    made = small(tmp_path, sheet, logs, kit=kit, derived=["savi", "vegetation_fraction"])
    day = made.day()
    pooled = groups(day.name, estimate_all(day, made.passes), DRAWS, coverage=0.95)
    rows = derived(day, pooled, DRAWS, 0.95).set_index("product")
    savi = rows.loc["savi"]
    assert savi.value == pytest.approx(0.5526, abs=1e-3)
    red, nir = (1.5 * (n - r) / (n + r + 0.5) for r, n in ((0.0525, 0.4), (0.05, 0.42)))
    assert savi.u == pytest.approx(np.sqrt(2) * np.hypot(red - 0.5526, nir - 0.5526), rel=0.1)
    assert savi.lower < savi.value < savi.upper
    # NDVI .778 between .2 and .86, linear: .875; both ends u .03
    fraction = rows.loc["vegetation_fraction"]
    assert fraction.value == pytest.approx((0.778 - 0.2) / 0.66, abs=2e-3)
    u_ndvi = summarise(pooled[0].result, 0.95).u
    ends = 0.03 * np.array([0.778 - 0.86, 0.2 - 0.778]) / 0.66**2
    assert fraction.u == pytest.approx(np.hypot(u_ndvi / 0.66, np.hypot(*ends)), rel=0.1)


def test_heights_used_and_best(tmp_path):
    """The best height of a head of 1.2 cm over 4 m is where shade and contamination weigh least."""
    day, found, _ = survey(tmp_path)
    table = geometry(day, found)
    one = table[table["pass"] == "C1-albedo-1"].set_index("role")
    assert one.height_m["used"] == 0.5
    assert one.effect.min() == one.effect["best"]
    assert one.loc["used", "shade"] == pytest.approx(
        float(self_shade(0.012, 0.5, found[0].zenith_deg, 0.85)), rel=1e-6)
    assert "E1918-like" in one.note["used"]
    assert disc_share(2.0, 0.5) == pytest.approx(0.941, abs=5e-4)


def test_a_caution_of_a_longwave_pair(tmp_path):
    """600 W m-2 up, 380 down, emissivity .95: (581 / .95 / sigma)^(1/4) record by record."""
    sheet = [row(**LONGWAVE | {"start": f"12:0{m}:10", "stop": f"12:0{m + 2}:30"})
             for m in (0, 3, 6)]
    made = small(tmp_path, sheet, {"longwave": lines("longwave", n=600)}, caution={
        "temperature_degC": 40, "source": "rule 7, invented"})
    day = made.day()
    pooled = groups(day.name, estimate_all(day, made.passes), DRAWS, coverage=0.95)
    (one,) = derived(day, pooled, DRAWS, 0.95).to_dict("records")
    log = made.records["longwave"].channels
    used = np.concatenate([day.quality.passes[p.name].index for p in made.passes])
    each = ((log["up"] - 0.05 * log["down"]) / 0.95 / 5.670374419e-8) ** 0.25 - 273.15
    assert one["value"] == pytest.approx(np.quantile(each[used], 0.95), abs=1e-6)
    assert one["form"] == "longwave"
    assert one["note"].startswith("caution: upper bound")


def test_savi_does_not_hang_on_a_conversion_of_ndvi(tmp_path):
    """A line for NDVI says nothing of the reflectances: the same value and u with it and without.
    """
    sheet = [row(**NDVI | {"start": f"12:0{m}:10", "stop": f"12:0{m + 2}:30"}) for m in (0, 3, 6)]
    line = {"slope": 0.5, "intercept": 0.4, "u": 0.0, "source": "invented",
            "centres_nm": {"red": 670, "nir": 780}, "widths_nm": {"red": 50, "nir": 50}}
    found = []
    for name, more in (("plain", {}), ("converted", {"band_conversion": line})):
        kit = {key: value | {"columns": {c: column | {"u_gain": 0.0, "u_offset": 0.0}
                                         for c, column in value["columns"].items()}}
               if key in HEADS else value for key, value in KIT.items()}
        kit["rednir-ground"] = kit["rednir-ground"] | more
        logs = {head: lines(head, n=600, kit=kit) for head in HEADS}
        made = small(tmp_path / name, sheet, logs, kit=kit, derived=["savi"])
        day = made.day()
        pooled = groups(day.name, estimate_all(day, made.passes), DRAWS, coverage=0.95)
        found.append(derived(day, pooled, DRAWS, 0.95).iloc[0])
    assert found[1].value == pytest.approx(found[0].value, rel=1e-12)
    assert found[1].u == pytest.approx(found[0].u, rel=1e-9)
