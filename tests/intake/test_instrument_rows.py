"""Rows of the sheet about instruments: swaps, panels, checks; faults and clean twins."""

from __future__ import annotations

import pytest
from invented import COLUMNS, PASS, parameters, text_of, write

from surveykit.core import InputError
from surveykit.intake.capped import windows
from surveykit.intake.fieldsheet import read_sheet

WHERE = {"instrument": "pair", "surface": "asphalt", "patch": "A1"}


def swap(start, word):
    return {"entry": "swap", **WHERE, "start": f"13:0{start}:00", "stop": f"13:0{start}:50",
            "reading": word}


def entries(tmp_path, *rows, columns=COLUMNS):
    study = parameters(tmp_path)
    first = next(iter(study.campaign.loggers))
    rows = [{**r, "instrument": first} if r.get("instrument") == "pair" else r for r in rows]
    return read_sheet(write(tmp_path, "sheet.csv", text_of(PASS, *rows, columns=columns)),
                      study).entries


def test_swaps_are_read_as_signs(tmp_path):
    found = [e.reading for e in entries(tmp_path, swap(0, "normal"), swap(1, "Inverted"))
             if e.entry == "swap"]
    assert found == [1.0, -1.0]


@pytest.mark.parametrize(("rows", "sentence"), [
    ([swap(0, "normal")], "the inverted row of this pair is missing"),
    ([swap(0, "inverted"), swap(1, "normal")], "the rows go in pairs, normal then inverted"),
    ([swap(0, "normal"), swap(1, "sideways")], "write normal or inverted")])
def test_swaps_go_in_pairs(tmp_path, rows, sentence):
    with pytest.raises(InputError, match=sentence):
        entries(tmp_path, *rows)


@pytest.mark.parametrize(("kind", "good", "bad"), [
    ("panel", "0,98", "1.2"), ("check", "0.0", "150"), ("foil", "35", "200"), ("lid", "60", "300"),
    ("reference", "48.5", "warm")])
def test_readings_have_their_limits(tmp_path, kind, good, bad):
    given = {"entry": kind, **WHERE, "start": "13:00:00", "stop": "13:00:40", "reading_u": "0.3"}
    (one,) = [e for e in entries(tmp_path, {**given, "reading": good}) if e.entry == kind]
    assert one.reading == float(good.replace(",", "."))
    with pytest.raises(InputError, match="row 3: reading"):
        entries(tmp_path, {**given, "reading": bad})


def test_a_reference_needs_its_uncertainty(tmp_path):
    given = {"entry": "reference", **WHERE, "start": "13:00:00", "stop": "13:00:40",
             "reading": "48"}
    with pytest.raises(InputError, match="a reference row needs reading_u; the cell is empty"):
        entries(tmp_path, given)


@pytest.mark.parametrize(("quantity", "concerned"), [
    ("", {"brightness_temperature", "longwave_up", "shortwave_down", "red_up", "nir_down"}),
    ("temperature", {"brightness_temperature", "longwave_up"}),
    ("albedo", {"shortwave_down"}), ("ndvi", {"red_up", "nir_down"})])
def test_a_row_concerns_the_channels_of_its_quantity(tmp_path, quantity, concerned):
    cover = {"entry": "cover", "quantity": quantity, "start": "13:00:00", "stop": "13:00:10"}
    study = parameters(tmp_path)
    sheet = read_sheet(write(tmp_path, "sheet.csv", text_of(PASS, cover)), study)
    found = {name for name in ("brightness_temperature", "longwave_up", "shortwave_down", "red_up",
                               "nir_down") if windows(sheet, "cover", "any", name)}
    assert found == concerned
