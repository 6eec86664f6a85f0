"""Estimates as tables and back: what one notebook hands to the next is all of it."""

from __future__ import annotations

from dataclasses import fields

import numpy as np
import pytest
from pass_values import DRAWS
from small_survey import ALBEDO, CONTACT, NDVI, STAND_OFF, lines, row, small

from surveykit.evidence.handing import from_frames, to_frames
from surveykit.evidence.surfaces import groups, surface_table
from surveykit.handover import load_table, save_table

TABLES_ONLY = {"steps", "dwells"}  # handed on as tables of their own


@pytest.fixture
def estimates(tmp_path):
    logs = {name: lines(name) for name in ("pair", "thermal", "rednir-sky", "rednir-ground")}
    logs["weather"] = lines("weather", n=5, step_s=60)
    sheet = [row(**ALBEDO), row(**NDVI), row(**STAND_OFF, stop="12:01:20"),
             row(**CONTACT, start="12:01:21"),
             row(**ALBEDO, patch="C2", start="12:02:21", stop="12:02:30")]
    survey = small(tmp_path, sheet, logs)
    made = survey.estimates()
    assert [e.evaluated for e in made].count(False) == 1  # the last, too short
    return survey, made


def same(one, two):
    assert type(one) is type(two) or np.isscalar(one)
    assert one == two or (one != one and two != two)


@pytest.mark.parametrize("through_file", [False, True])
def test_round_trip(estimates, tmp_path, through_file):
    survey, made = estimates
    frames = to_frames(made)
    if through_file:
        for name, frame in frames.items():
            save_table(tmp_path / f"{name}.npz", frame)
        frames = {name: load_table(tmp_path / f"{name}.npz") for name in frames}
    back = from_frames(frames, survey.passes)
    assert len(back) == len(made)
    for one, two in zip(made, back, strict=True):
        for field in fields(one):
            a, b = getattr(one, field.name), getattr(two, field.name)
            if field.name in TABLES_ONLY:
                continue
            if field.name == "sky":
                for part in fields(a):
                    same(getattr(a, part.name), getattr(b, part.name))
            else:
                same(a, b)


def test_what_comes_back_gives_the_same_surfaces(estimates):
    survey, made = estimates
    back = from_frames(to_frames(made), survey.passes)
    one, two = (surface_table(groups("yard", some, DRAWS, coverage=0.95), 0.95)
                for some in (made, back))
    assert one.equals(two)


def test_nothing_evaluated_is_handed_on_too(tmp_path):
    survey = small(tmp_path, [row(**ALBEDO, stop="12:00:30")], {"pair": lines("pair")})
    made = survey.estimates()
    frames = to_frames(made)
    for name, frame in frames.items():
        save_table(tmp_path / f"{name}.npz", frame)
    back = from_frames({n: load_table(tmp_path / f"{n}.npz") for n in frames}, survey.passes)
    assert back[0].note == made[0].note
    assert back[0].inputs == ()
    assert back[0].air is None
