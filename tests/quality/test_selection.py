"""Which records a pass may use: edges, partners, placements, refusals, what is noted."""

from __future__ import annotations

import numpy as np
import pytest
from small_survey import (
    ALBEDO,
    DAY,
    KIT,
    NDVI,
    lines,
    readings,
    row,
    small,
)

from surveykit.accounting import primary
from surveykit.quality.checks import stuck
from surveykit.quality.series import nearest

NS = 1_000_000_000
PASS = [row(**ALBEDO)]
LIMITS = {"min_s": 10, "false_alarms": 1e-3, "max_repeat": 0.98}


def albedo(root, log=None, sheet=PASS, **more):
    return small(root, sheet, {"pair": log or lines("pair")}, **more)


def told(quality, check):
    return quality.checks[quality.checks.check == check]


# ---- edges

def test_the_trim_of_a_pass(tmp_path):
    """Hand arithmetic: 5 + hypot(.5, 2) + 5 * .2 = 8.06 s off each end of 120 s leaves 103 records
    at whole seconds (8.06 to 111.94: seconds 9 to 111).
    """
    kit = {"pair": KIT["pair"] | {"time_constant_s": 0.2}}
    survey = albedo(tmp_path, kit=kit, clock_u_s=0.5, settings={},
                    watch={"offset_s": 0, "u_s": 2})
    chosen = survey.quality().passes["C1-albedo-1"]
    assert chosen.index.size == 103
    assert chosen.reasons == {"pass edge": 17}


def test_a_pass_too_short_between_its_edges_is_refused(tmp_path):
    """30 s is the least by default (engineering default); 40 s less 2 * 5 s is enough."""
    edges = {"passes": {"sheet_u_s": 5.0}}
    kept = albedo(tmp_path / "a", sheet=[row(**ALBEDO, stop="12:01:00")], settings=edges)
    lost = albedo(tmp_path / "b", sheet=[row(**ALBEDO, stop="12:00:59")], settings=edges)
    assert kept.quality().passes["C1-albedo-1"].index.size == 30
    refusal = lost.quality().passes["C1-albedo-1"].refusal
    assert refusal == "29 s of the pass lie between its uncertain edges, less than 30 s"
    assert told(lost.quality(), "records of a pass").severity.tolist() == ["refuse"]
    # 29.6 s is not told as 30 s, less than 30 s
    nearly = albedo(tmp_path / "c", sheet=[row(**ALBEDO, stop="12:01:00")],
                    settings={"passes": {"sheet_u_s": 5.2}}).quality().passes["C1-albedo-1"]
    assert nearly.refusal.startswith("29 s of the pass lie")


# ---- partners

def test_nearest_is_what_every_pair_compared_says():
    rng = np.random.default_rng(3)
    time, other = (np.sort(rng.integers(0, 10**11, n)) for n in (50, 40))
    gap = np.abs(time[:, None] - other[None, :])
    want = np.where(gap.min(axis=1) <= 0.5 * NS, gap.argmin(axis=1), -1)
    got = nearest(time, other, 0.5)
    assert np.array_equal(got < 0, want < 0)
    assert np.array_equal(np.abs(other[got] - time)[got >= 0], gap.min(axis=1)[got >= 0])


def test_nearest_of_nothing_is_nothing():
    assert nearest(np.array([1, 2]), np.array([], dtype=np.int64), 1.0).tolist() == [-1, -1]


def test_records_without_a_time_do_not_disturb_the_partners(tmp_path):
    """They stand last, at the smallest integer: a search must not see them."""
    ground = lines("rednir-ground")
    for i in (70, 71, 72, 110):
        ground[i] = "soon," + ground[i].split(",", 1)[1]
    survey = small(tmp_path, [row(**NDVI)],
                   {"rednir-sky": lines("rednir-sky"), "rednir-ground": ground})
    chosen = survey.quality().passes["C1-ndvi-1"]
    assert chosen.index.size == 116
    main, other = (survey.records[name].time_ns for name in ("rednir-sky", "rednir-ground"))
    assert np.array_equal(main[chosen.index], other[chosen.partners["rednir-ground"]])


def test_a_slower_partner_serves_every_record_within_half_its_interval(tmp_path):
    kit = {name: KIT[name] for name in ("rednir-sky", "rednir-ground")}
    kit["rednir-sky"] = kit["rednir-sky"] | {"interval_s": 4}
    survey = small(tmp_path, [row(**NDVI)], {
        "rednir-sky": lines("rednir-sky", n=40, step_s=4), "rednir-ground": lines("rednir-ground")},
        kit=kit)
    chosen = survey.quality().passes["C1-ndvi-1"]
    assert chosen.logger == "rednir-sky"
    assert chosen.index.size == 30
    assert chosen.partners["rednir-ground"].size == 30


# ---- stuck readings

def test_a_coarse_living_channel_is_not_stuck():
    """Whole numbers once a minute, equal to their neighbour two times in three."""
    rng = np.random.default_rng(5)
    values = np.round(20 + np.cumsum(rng.normal(0, 0.25, 600)))
    assert not stuck(values, np.arange(600) * 60 * NS, **LIMITS).any()


def test_a_fine_channel_that_stops_is_stuck_from_its_first_repeat():
    values = np.random.default_rng(5).normal(20, 1, 600)
    values[300:330] = values[300]
    marked = stuck(values, np.arange(600) * NS, **LIMITS)
    assert np.flatnonzero(marked).tolist() == list(range(300, 330))


def test_a_channel_that_never_moves_is_stuck():
    assert stuck(np.ones(2000), np.arange(2000) * NS, **LIMITS).all()


def test_a_short_repeat_is_not_stuck():
    values = np.random.default_rng(5).normal(20, 1, 600)
    values[300:309] = values[300]  # 8 s, below flatline_min_s
    assert not stuck(values, np.arange(600) * NS, **LIMITS).any()


def test_records_without_a_time_are_not_stuck(tmp_path):
    log = lines("pair")
    for i in (-3, -2, -1):
        log[i] = f"{log[i].split(',')[0] if i == -3 else 'soon'},900.0000,180.0000"
    quality = albedo(tmp_path, log).quality()
    assert "stuck reading" not in set(quality.ledger.reason)


def test_the_first_of_several_marks_is_the_lowest_bit():
    assert primary(np.array([0, 1, 6, 1 << 15], dtype=np.uint32)).tolist() == [-1, 0, 1, 15]


# ---- what is noted

def test_missing_records_are_flagged_from_a_tenth_on(tmp_path):
    """Of 120 records due, 13 missing are 11 %, 12 are 10 %: the limit is .10."""
    def gone(n):
        log = lines("pair")
        del log[60:60 + n]
        return log

    rows = told(albedo(tmp_path / "a", gone(13)).quality(), "missing records")
    assert rows["pass"].tolist() == ["C1-albedo-1"]
    assert rows.records.tolist() == [13]
    assert "11 % of the records expected" in rows.message.iloc[0]
    assert told(albedo(tmp_path / "b", gone(12)).quality(), "missing records").empty


def test_a_record_logged_twice_makes_up_for_none_missing(tmp_path):
    log = lines("pair")
    del log[60:80]
    for _ in range(20):
        log.insert(50, log[50])
    assert told(albedo(tmp_path, log).quality(), "missing records").records.tolist() == [20]


def test_few_records_a_pass_are_not_called_missing(tmp_path):
    """A station of one record a minute has one or two in 110 s."""
    kit = {"pair": KIT["pair"] | {"interval_s": 60}}
    log = lines("pair", start="11:58:30", n=8, step_s=60)
    quality = albedo(tmp_path, log, [row(**ALBEDO, start="12:00:35", stop="12:02:25")],
                     kit=kit).quality()
    assert told(quality, "missing records").empty


def test_the_extremely_rare_limit_is_noted_and_can_be_switched_off(tmp_path):
    """Zenith 18 deg: 1.2 * 1318 * .951**1.2 + 50 = 1539 W m-2 (Long & Shi 2008)."""
    level = readings("sky", 160, 1) / 900
    survey = albedo(tmp_path / "a", lines("pair", sky=1600 * level))
    assert told(survey.quality(), "extremely rare irradiance").records.tolist() == [120]
    quiet = survey.with_settings(quality={"rare_limit_warning": False})
    assert told(quiet.quality(), "extremely rare irradiance").empty
    fewer = albedo(tmp_path / "b", lines("pair", sky=1500 * level))
    assert told(fewer.quality(), "extremely rare irradiance").empty


def test_gaps_are_noted_with_the_longest(tmp_path):
    log = lines("pair")
    del log[60:70]
    rows = told(albedo(tmp_path, log).quality(), "gap")
    assert rows.records.tolist() == [1]
    assert "the longest 11.0 s" in rows.message.iloc[0]


def test_a_dark_row_without_seconds_that_leaves_nothing_is_noted(tmp_path):
    """One minute, its ends known to a minute each, holds no record that is certainly dark."""
    dark = {"entry": "dark", "instrument": "pair", "start": "12:01", "stop": "12:02"}
    quality = albedo(tmp_path, sheet=[row(**ALBEDO, start="12:02:05", stop="12:02:38"), row(**dark)]
                     ).quality()
    assert told(quality, "dark reading").column.tolist() == ["sky", "ground"]


def test_many_excluded_records_are_flagged_before_the_pass_is_refused(tmp_path):
    def spoiled(n):
        log = lines("pair")
        for i in range(30, 30 + n):
            log[i] = log[i].split(",")[0] + ",2500,180"
        return log

    assert told(albedo(tmp_path / "a", spoiled(36)).quality(), "records of a pass").empty
    rows = told(albedo(tmp_path / "b", spoiled(37)).quality(), "records of a pass")
    assert rows.severity.tolist() == ["flag"]
    assert told(albedo(tmp_path / "c", spoiled(72)).quality(),
                "records of a pass").severity.tolist() == ["flag"]
    assert told(albedo(tmp_path / "d", spoiled(73)).quality(),
                "records of a pass").severity.tolist() == ["refuse"]


# ---- refusals

def test_a_pass_without_any_record(tmp_path):
    quality = albedo(tmp_path, sheet=[*PASS, row(**ALBEDO, start="13:00:00", stop="13:02:00")]
                     ).quality()
    assert quality.passes["C1-albedo-2"].refusal == "no record of its logger falls into the pass"


def test_one_low_sun_does_not_hide_the_real_fault(tmp_path):
    """Most records out of range, some where the sun falls below a limit set to pass in between."""
    log = lines("pair")
    for i in range(21, 121):
        log[i] = log[i].split(",")[0] + ",2500,180"
    survey = albedo(tmp_path, log)
    zenith = survey.day().sun(survey.records["pair"].time_ns).zenith_deg
    limit = float(zenith[30])  # ten of the pass's records stand above it: morning
    lower = survey.with_settings(albedo={"zenith_max_deg": limit, "zenith_standard_deg": limit,
                                         "zenith_qualified_deg": limit})
    assert "out of range" in lower.quality().passes["C1-albedo-1"].refusal


@pytest.mark.parametrize(("hour", "words"), [
    ("23:00:00", "the sun is below the horizon: an albedo read in the dark is the ratio of two"),
    ("05:55:00", "the sun is only 9 degrees high, lower than the method's limit")])
def test_albedo_is_refused_without_sun(tmp_path, hour, words):
    """Hand arithmetic: declination 23.1, hour angle -98.6 deg give a height of 9.0 deg."""
    light = 100.0 if hour < "12" else -2.0
    log = lines("pair", start=hour, sky=readings("sky", 160, 1) / 900 * light,
                ground=readings("ground", 160, 1) / 900 * light)
    begin = np.datetime64(f"{DAY}T{hour}") + np.array([20, 140])
    start, stop = (str(t).split("T")[1] for t in begin)
    survey = albedo(tmp_path, log, [row(**ALBEDO, start=start, stop=stop)])
    assert words in survey.quality().passes["C1-albedo-1"].refusal


def test_bright_light_with_the_computed_sun_down_asks_for_longitude_zone_or_clock(tmp_path):
    site = {"name": "Wrong side", "latitude": 41.3, "longitude": 172.0, "elevation_m": 120,
            "time_zone": "UTC"}
    refusal = albedo(tmp_path, site=site).quality().passes["C1-albedo-1"].refusal
    assert refusal == ("computed sun below the horizon while the pair reads 900 W m-2: "
                       "check longitude, zone or clock")


def test_a_few_spoilt_readings_are_no_measure_of_the_days_light(tmp_path):
    """Three of 160 say 99,999: 1.9 %, more than lie above the quantile .99 that stands for noon."""
    sky = lines("rednir-sky")
    for i in (10, 11, 12):
        sky[i] = sky[i].split(",")[0] + ",99999,99999"
    survey = small(tmp_path, [row(**NDVI)],
                   {"rednir-sky": sky, "rednir-ground": lines("rednir-ground")})
    assert survey.quality().passes["C1-ndvi-1"].index.size == 120
