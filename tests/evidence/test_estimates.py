"""What every estimate of a pass holds: inputs with their scopes, flags, refusals."""

from __future__ import annotations

import numpy as np
import pytest
from one_estimate import HEADS, albedo, changed, made, stand_off
from pass_values import evaluate
from small_survey import ALBEDO, CONTACT, LONGWAVE, NDVI, lines, readings, row, small

from surveykit.evidence.hills import TWO_KINDS
from surveykit.evidence.surfaces import pass_tables

CASES = {
    "stand-off": lambda root: stand_off(root),
    "contact": lambda root: stand_off(root, CONTACT),
    "longwave": lambda root: made(root, LONGWAVE, "longwave"),
    "albedo": lambda root: albedo(root),
    "ndvi": lambda root: made(root, NDVI, *HEADS),
}


@pytest.mark.parametrize("model", CASES)
def test_a_pass_is_what_its_model_makes_of_its_inputs(tmp_path, model):
    """The mean over the records is the model at the mean inputs, nearly; every input that has an
    uncertainty says whose error it is and what it is called.
    """
    one = CASES[model](tmp_path)
    assert one.evaluated, one.note
    assert one.model == model
    assert one.value == pytest.approx(evaluate(model, one.inputs), rel=1e-5)
    assert one.n_records == 120
    for i in one.inputs:
        assert i.u == 0 or (i.scope and i.source), i.name
    assert len({i.name for i in one.inputs}) == len(one.inputs)
    assert one.u_within > 0


# ---- few effective records

def test_few_effective_records_are_flagged(tmp_path):
    """Readings that drift through the pass are worth a few: below 10 by default."""
    drifting = readings("sky", 160, 1) * 0 + 900
    ground = 180 + 10 * np.sin(np.arange(160) / 60) + readings("ground", 160, 1) * 0.01
    log = {"pair": lines("pair", sky=drifting + readings("sky", 160, 1) * 0.01, ground=ground)}
    survey = small(tmp_path, [row(**ALBEDO)], log)
    one = survey.by_name()["C1-albedo-1"]
    assert one.n_effective < 10
    assert "few effective records" in one.flags
    lax = survey.with_settings(statistics={"few_effective": 1.0}).by_name()["C1-albedo-1"]
    assert "few effective records" not in lax.flags
    assert "few effective records" not in albedo(tmp_path / "clean").flags


def test_a_pass_over_two_kinds_of_ground_shows_its_histogram(tmp_path):
    """A third of the records over ground as bright again: flagged, shown, and not corrected."""
    rng = np.random.default_rng(6)
    two = readings("ground", 160, 1) * np.where(rng.random(160) < 1 / 3, 2.0, 1.0)
    one = small(tmp_path, [row(**ALBEDO)], {"pair": lines("pair", ground=two)}).estimates()[0]
    assert TWO_KINDS in one.flags
    bars = pass_tables("yard", [one])["histograms"]
    assert bars["n_records"].sum() == one.n_records
    assert (bars["lower"].iloc[1:].to_numpy() == bars["upper"].iloc[:-1].to_numpy()).all()
    assert bars["n_records"].iloc[5:15].sum() < 5  # two hills, nothing between
    middle = (bars["lower"] + bars["upper"]) / 2
    assert np.average(middle, weights=bars["n_records"]) == pytest.approx(one.value, rel=0.02)
    plain = albedo(tmp_path / "one kind")
    assert TWO_KINDS not in plain.flags
    assert pass_tables("yard", [plain])["histograms"].empty


# ---- calibrations, refusals of the records

def test_an_expired_calibration_is_flagged(tmp_path):
    old = {"id": "pair-2020", "date": "2020-01-20", "valid_days": 365}
    assert "calibration expired" in albedo(tmp_path, kit=changed("pair", calibration=old)).flags
    none = albedo(tmp_path / "none", kit=changed("pair", calibration=None))
    assert "no calibration stated" in none.flags


def test_readings_beyond_the_model_are_told(tmp_path):
    """Up less than what would be reflected of down: no temperature, and no crash."""
    log = {"longwave": lines("longwave", down=readings("down", 160, 1) / 380 * 690,
                             up=readings("up", 160, 1) / 600 * 60)}
    one = made(tmp_path, LONGWAVE, "longwave", logs=log, surfaces={"court": {
        "label": "Court", "emissivity_broadband": {"value": 0.9, "u": 0.01, "source": "invented"}}})
    assert one.note == "the readings lie outside the range of the model"


def test_a_refused_pass_says_the_qualitys_reason(tmp_path):
    one = albedo(tmp_path, ALBEDO | {"start": "12:00:20", "stop": "12:00:40"})
    assert not one.evaluated
    assert one.note == "20 s of the pass lie between its uncertain edges, less than 30 s"
    assert one.inputs == ()
    assert np.isnan(one.value)
