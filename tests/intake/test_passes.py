"""Passes: names, channels, edges by hand, coverage; settled placements of a synthetic record."""

from __future__ import annotations

from math import log, sqrt

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from invented import (
    ALBEDO,
    KIT,
    PASS,
    SHORTWAVE,
    THERMAL,
    instrument,
    pair,
    parameters,
    text_of,
    write,
)
from numpy.testing import assert_allclose

from surveykit.core import InputError
from surveykit.intake.clocks import Clock
from surveykit.intake.fieldsheet import read_sheet
from surveykit.intake.loggers import read_logger
from surveykit.intake.passes import check_coverage, find_dwells, match_passes

NDVI = {**ALBEDO, "quantity": "ndvi", "width_m": "", "length_m": "", "lanes": ""}


def clocks(**u_s: float) -> dict[str, Clock]:
    return {name: Clock(name, "declared", 0, u_s.get(name.replace("-", "_"), 0.5), 0, "ok", "")
            for name in [*KIT, "station", "thermal-2"]}


def passes(tmp_path, *rows, kit=None, u_s=None, **changed):
    study = parameters(tmp_path, kit, **changed)
    sheet = read_sheet(write(tmp_path, "sheet.csv", text_of(*rows)), study)
    return match_passes(sheet, study, clocks(**(u_s or {})))


def at(row, start, stop, **changed):
    return {**row, "start": start, "stop": stop, **changed}


# ---- names, channels, sizes

def test_names_count_a_patchs_passes_in_order_of_time(tmp_path):
    rows = (at(PASS, "13:00:00", "13:05:00"), at(PASS, "12:00:00", "12:05:00"),
            at(PASS, "12:10:00", "12:15:00", mode="stand-off", height_cm="120"),
            at(ALBEDO, "12:00:00", "12:05:00"), at(NDVI, "12:00:00", "12:05:00", patch="A2"))
    found = passes(tmp_path, *rows)
    assert [(one.name, one.row) for one in found] == [
        ("A1-contact-1", 3), ("A1-albedo-1", 5), ("A2-ndvi-1", 6), ("A1-standoff-1", 4),
        ("A1-contact-2", 2)]
    assert [one.kind for one in found] == ["contact", "", "", "stand-off", "contact"]


def test_channels_come_from_the_only_logger_that_offers_them(tmp_path):
    (one,) = passes(tmp_path, NDVI)
    assert {name: channel.logger for name, channel in one.channels.items()} == {
        "red_down": "rednir-sky", "nir_down": "rednir-sky",
        "red_up": "rednir-ground", "nir_up": "rednir-ground"}
    assert one.loggers == ("rednir-sky", "rednir-ground")


def test_the_named_instrument_comes_first_the_rest_from_the_others(tmp_path):
    kit = {**KIT, "rednir-2": pair("red_up", "nir_up")}
    u_s = clocks() | {"rednir-2": Clock("rednir-2", "declared", 0, 0.5, 0, "ok", "")}
    study = parameters(tmp_path, kit)
    sheet = read_sheet(write(tmp_path, "sheet.csv", text_of({**NDVI, "instrument": "rednir-2"})),
                       study)
    (one,) = match_passes(sheet, study, u_s)
    assert one.loggers == ("rednir-sky", "rednir-2")


def test_a_four_component_logger_serves_two_quantities_at_once(tmp_path):
    kit = {"station": {**pair("shortwave_down", "shortwave_up", "longwave_down", "longwave_up")}}
    found = passes(tmp_path, ALBEDO, {**PASS, "mode": ""}, kit=kit)
    assert [(one.quantity, one.kind) for one in found] == [("albedo", ""),
                                                           ("temperature", "longwave")]


def test_infrared_beside_a_longwave_pair(tmp_path):
    kit = {**KIT, "station": pair("longwave_down", "longwave_up")}
    (one,) = passes(tmp_path, PASS, kit=kit)
    assert one.channels.keys() == {"brightness_temperature"}
    (one,) = passes(tmp_path, {**PASS, "mode": "", "instrument": "station"}, kit=kit)
    assert one.kind == "longwave"
    with pytest.raises(InputError, match="write contact or stand-off, or instrument station for"):
        passes(tmp_path, {**PASS, "mode": ""}, kit=kit)


def test_the_size_of_a_patch_holds_for_all_its_passes(tmp_path):
    rows = (NDVI, at(ALBEDO, "13:00:00", "13:05:00"), at(NDVI, "12:00:00", "12:05:00", patch="B",
                                                         instrument=""))
    with pytest.raises(InputError):  # the same heads cannot be in two places
        passes(tmp_path, *rows)
    found = passes(tmp_path, *rows[:2], at(NDVI, "14:00:00", "14:05:00", patch="B"))
    assert [(one.width_m, one.length_m) for one in found[:2]] == [(4, 5), (4, 5)]
    assert np.isnan(found[2].length_m)


# ---- edges

def test_trimming_worked_by_hand(tmp_path):
    # sheet 5 s + hypot(clock 0.5, watch 2) s + 5 x tau; tau .3 s thermal, 1 s shortwave
    thermal, shortwave = passes(tmp_path, PASS, ALBEDO)
    assert_allclose(thermal.trim_s, 5 + sqrt(0.25 + 4) + 1.5, rtol=1e-12)
    assert_allclose(shortwave.trim_s, 5 + sqrt(0.25 + 4) + 5.0, rtol=1e-12)
    assert_allclose((thermal.from_ns - thermal.start_ns) / 1e9, thermal.trim_s, atol=1e-9)
    assert_allclose((thermal.stop_ns - thermal.to_ns) / 1e9, thermal.trim_s, atol=1e-9)


def test_trimming_takes_the_worst_clock_and_minutes_only(tmp_path):
    (one,) = passes(tmp_path, {**NDVI, "stop": "12:05"}, u_s={"rednir_ground": 3.0},
                    watch={"offset_s": 0, "u_s": 4.0})
    assert_allclose(one.trim_s, 60 + 5.0 + 1.5, rtol=1e-12)  # hypot(3, 4) = 5


def test_the_skew_of_a_pass_is_that_of_the_two_loggers_furthest_apart(tmp_path):
    one, two = passes(tmp_path, PASS, NDVI, u_s={"rednir_ground": 3.0})
    assert (one.skew_u_s, two.skew_u_s) == (0.0, pytest.approx(sqrt(0.25 + 9)))
    kit = {"red": pair("red_down"), "nir": pair("nir_down"),
           "rednir-ground": KIT["rednir-ground"]}  # three clocks
    study = parameters(tmp_path, kit)
    known = {name: Clock(name, "declared", 0, u, 0, "ok", "")
             for name, u in (("red", 0.5), ("nir", 1.0), ("rednir-ground", 3.0))}
    (three,) = match_passes(read_sheet(write(tmp_path, "sheet.csv", text_of(NDVI)), study), study,
                            known)
    assert three.skew_u_s == pytest.approx(sqrt(1 + 9))


def test_t95_counts_as_three_time_constants(tmp_path):
    entry = {name: value for name, value in SHORTWAVE.items() if name != "time_constant_s"}
    (one,) = passes(tmp_path, ALBEDO, kit={"shortwave": {**entry, "t95_s": 6.0}})
    assert_allclose(one.trim_s, 5 + sqrt(0.25 + 4) + 5 * 6 / log(20), rtol=1e-12)


def test_a_short_pass_keeps_its_arithmetic(tmp_path):
    (one,) = passes(tmp_path, at(PASS, "12:00:00", "12:00:10"))
    assert one.to_ns < one.from_ns


# ---- records that miss every pass

def test_a_logger_that_misses_every_pass_is_refused(tmp_path):
    found = passes(tmp_path, PASS, ALBEDO)

    def log_at(hour):
        text = f"time,target,body\n2025-07-24T{hour}:02:00,40,30\n"
        return read_logger("thermal", instrument(THERMAL), [write(tmp_path, "t.csv", text)],
                           tmp_path)

    check_coverage(found, {"thermal": log_at(11)}, "sheet.csv")
    with pytest.raises(InputError) as caught:  # an hour off: the zone was forgotten
        check_coverage(found, {"thermal": log_at(12)}, "sheet.csv")
    assert caught.value.faults[0].startswith(
        "loggers.thermal: its records (2025-07-24 12:02:00 to 2025-07-24 12:02:00 UTC) miss every "
        "pass it serves on sheet.csv (2025-07-24 11:00:00 to 2025-07-24 11:05:00 UTC); check")


# ---- placements

def placements(rate_hz, tau_s, levels_k, hold_s, noise_k=0.0):
    """Return a first-order response to levels held one after another."""
    time_s = np.arange(0, hold_s * len(levels_k), 1 / rate_hz)
    value, out = levels_k[0], np.empty(time_s.size)
    for i, t in enumerate(time_s):
        goal = levels_k[min(int(t / hold_s), len(levels_k) - 1)]
        value = goal + (value - goal) * np.exp(-1 / rate_hz / tau_s)
        out[i] = value
    return time_s, out + noise_k * np.random.default_rng(2).normal(size=out.size)


@pytest.mark.parametrize("rate_hz", [1, 5, 10])
def test_placements_of_a_first_order_response(rate_hz):
    # rate = (step / tau) exp(-t / tau) falls to r at t = tau ln(step / (tau r)): 30 K, tau 1 s,
    # .5 K/s: 4.1 s after each step (analytic), then 2 s of settling, of 20 s held
    time_s, value = placements(rate_hz, 1.0, [300.0, 330.0, 300.0, 330.0], 20.0)
    found = find_dwells(time_s, value, settle_s=2.0, min_s=3.0, max_rate_k_s=0.5)
    assert len(found) == 4
    for i, part in enumerate(found[1:], start=1):
        begin = time_s[part.start] - 20 * i
        assert begin == pytest.approx(log(30 / 0.5) + 2, abs=max(1.0, 1.5 / rate_hz))
        assert 20 * (i + 1) - 1.5 <= time_s[part.stop - 1] + 1 / rate_hz <= 20 * (i + 1) + 0.01
        assert np.abs(value[part] - [330.0, 300.0, 330.0][i - 1]).max() < 0.5


def test_noise_does_not_break_a_placement():
    # .05 K at 5 Hz: neighbours differ by .35 K/s (one sd), the median of slopes by far less
    time_s, value = placements(5, 0.5, [300.0, 320.0, 300.0], 20.0, noise_k=0.05)
    assert len(find_dwells(time_s, value, settle_s=1.0, min_s=3.0, max_rate_k_s=0.5)) == 3


def test_a_gap_and_a_missing_reading_end_a_placement():
    time_s = np.arange(0, 40, 0.2)
    value = np.full(time_s.size, 300.0)
    one = {"settle_s": 1.0, "min_s": 3.0, "max_rate_k_s": 0.5}
    assert find_dwells(time_s, value, **one) == [slice(5, 200)]
    away = (time_s < 15) | (time_s > 25)
    assert [part.start for part in find_dwells(time_s[away], value[away], **one)] == [5, 80]
    value[100] = np.nan
    assert len(find_dwells(time_s, value, **one)) == 2


def test_too_short_too_few_or_never_settled():
    time_s = np.arange(0, 3.9, 0.2)
    one = {"settle_s": 1.0, "min_s": 3.0, "max_rate_k_s": 0.5}
    assert find_dwells(time_s, np.full(time_s.size, 300.0), **one) == []  # 3.8 - 1 < 3 s
    assert find_dwells(np.arange(2.0), np.full(2, 300.0), **one) == []
    time_s = np.arange(0, 40, 0.2)
    assert find_dwells(time_s, 300 + 0.6 * time_s, **one) == []
    assert find_dwells(time_s, 300 + 0.4 * time_s, **one) == [slice(5, 200)]


@settings(max_examples=50, deadline=None)
@given(st.lists(st.floats(280, 340), min_size=3, max_size=120), st.floats(0, 5),
       st.floats(-1e9, 1e9))
def test_placements_are_apart_long_enough_and_move_with_time(values, settle_s, shift):
    time_s = np.arange(len(values)) * 0.5
    one = {"settle_s": settle_s, "min_s": 3.0, "max_rate_k_s": 2.0}
    found = find_dwells(time_s, np.array(values), **one)
    assert all(time_s[part.stop - 1] - time_s[part.start] >= 3.0 for part in found)
    assert all(a.stop <= b.start for a, b in zip(found, found[1:], strict=False))
    if abs(shift) < 1e6:
        moved = find_dwells(time_s + round(shift), np.array(values) + 0.0, **one)
        assert moved == found
