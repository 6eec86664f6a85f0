"""Clocks: the sign of an offset by its meaning, drift by hand, days covered."""

from __future__ import annotations

import numpy as np
import pytest
from invented import instrument, parameters, write
from numpy.testing import assert_allclose, assert_array_equal

from surveykit.core import InputError
from surveykit.intake.clocks import check_days, set_clock
from surveykit.intake.loggers import NO_TIME_NS, read_logger
from surveykit.intake.params import LoggerUse, Settings

NS = 10**9


def records(tmp_path, *times):
    rows = "".join(f"{time},40.0,30.0\n" for time in times)
    path = write(tmp_path, "thermal.csv", "time,target,body\n" + rows)
    return read_logger("thermal", instrument(), [path], tmp_path)


def use(**clock) -> LoggerUse:
    return LoggerUse.model_validate({"files": "x.csv", **({"clock": clock} if clock else {})})


def test_positive_offset_means_a_slow_logger(tmp_path):
    # at 12:00:12 UTC a logger that is 12 s slow writes 12:00:00
    log = records(tmp_path, "2025-07-24T12:00:00")
    true = records(tmp_path, "2025-07-24T12:00:12")
    moved, clock = set_clock(log, use(offset_s=12.0, u_s=0.5), Settings())
    assert_array_equal(moved.time_ns, true.time_ns)
    assert (clock.method, clock.offset_s, clock.u_s, clock.status) == ("declared", 12, 0.5, "ok")


def test_value_and_u_together(tmp_path):
    log = records(tmp_path, "2025-07-24T12:00:00")
    _, clock = set_clock(log, use(offset_s={"value": -3.5, "u": 0.25}), Settings())
    assert (clock.offset_s, clock.u_s) == (-3.5, 0.25)


def test_no_clock_leaves_times_and_says_so(tmp_path):
    log = records(tmp_path, "2025-07-24T12:00:00")
    moved, clock = set_clock(log, use(), Settings())
    assert_array_equal(moved.time_ns, log.time_ns)
    assert (clock.method, clock.offset_s, clock.u_s) == ("not checked", 0.0, 2.0)
    assert clock.status == "qualified"


def test_drift_worked_by_hand(tmp_path):
    # 50 ppm over 8 h = 28800 s x 50e-6 = 1.44 s; nothing where the drift begins
    log = records(tmp_path, "2025-07-24T08:00:00", "2025-07-24T16:00:00", "never")
    moved, clock = set_clock(log, use(offset_s=2.0, u_s=1.0, drift_ppm=50.0,
                                      drift_from="2025-07-24T08:00:00Z"), Settings())
    assert_allclose((moved.time_ns - log.time_ns)[:2] / NS, [2.0, 3.44], atol=1e-9)
    assert moved.time_ns[2] == NO_TIME_NS
    assert clock.drift_ppm == 50


def test_a_logger_of_another_day_is_refused_with_its_days(tmp_path):
    study = parameters(tmp_path)
    good = records(tmp_path, "2025-07-23T23:00:00")  # 24 July 00:00 in Lisbon
    check_days({"thermal": good}, study)
    bad = records(tmp_path, "2025-07-23T22:59:59", "2025-07-22T12:00:00", "2025-07-25T12:00:00")
    with pytest.raises(InputError) as caught:
        check_days({"thermal": bad, "other": good}, study)
    (fault,) = caught.value.faults
    assert fault.startswith("loggers.thermal: no record falls on 2025-07-24 (Europe/Lisbon); its "
                            "files cover 2025-07-22 to 2025-07-23 and 2025-07-25;")


def test_records_of_neighbouring_days_are_kept(tmp_path):
    log = records(tmp_path, "2025-07-23T12:00:00", "2025-07-24T12:00:00", "2025-07-25T12:00:00")
    check_days({"thermal": log}, parameters(tmp_path))
    assert len(log) == 3
    assert not np.any([mark.any() for mark in log.marks.values()])
