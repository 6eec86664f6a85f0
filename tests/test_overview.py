"""Frames for the notebooks: what of the day is drawn, by hand on a small invented survey."""

from __future__ import annotations

import pandas as pd
import pytest
from small_survey import ALBEDO, KIT, STAND_OFF, lines, row, small

from surveykit import overview


def test_a_stretch_of_faulty_readings_is_shown_once_from_its_first_to_its_last(tmp_path):
    """Records 30 to 59 (12:00:29 to 12:00:58) say 2,500 W m-2; three more alone are too short."""
    log = lines("pair")
    for i in (*range(30, 60), 80, 81, 82):
        time, _, ground = log[i].split(",")
        log[i] = f"{time},2500,{ground}"
    survey = small(tmp_path, [row(**ALBEDO)], {"pair": log})
    found = overview.excluded(survey.day(), survey.passes)
    assert found["reason"].tolist() == ["pair: out of range"]
    assert found["start_utc"].tolist() == [pd.Timestamp("2025-06-11T12:00:29Z")]
    assert found["stop_utc"].tolist() == [pd.Timestamp("2025-06-11T12:00:58Z")]


def test_of_two_loggers_the_first_that_tells_is_drawn_as_it_is_used(tmp_path):
    """Air of 30 degC from the first, of 10 degC from the second; estimates take the first."""
    kit = KIT | {"station": KIT["weather"]}
    dark = row(entry="dark", start="12:00:02", stop="12:00:12")  # of heads for light, not of air
    survey = small(tmp_path, [row(**STAND_OFF), dark], {
        "thermal": lines("thermal"), "weather": lines("weather", n=4, step_s=60),
        "station": lines("station", n=4, step_s=60, kit=kit, air=10.0)}, kit=kit)
    day = survey.day()
    drawn = overview.day_course(day, survey.passes)["weather"]["air_temperature_degc"].dropna()
    used = day.weather("air_temperature", survey.passes[0]).value - 273.15
    assert drawn.mean() == pytest.approx(30.0, abs=0.2)
    assert used == pytest.approx(30.0, abs=0.2)
