"""Which channels serve a pass, told on the field sheet: each refusal with its repair."""

from __future__ import annotations

import pytest
from invented import KIT, PASS, pair, parameters, text_of, write

from surveykit.core import InputError
from surveykit.intake.fieldsheet import read_sheet


def test_two_candidates_ask_for_the_instrument(tmp_path):
    kit = {**KIT, "thermal-2": KIT["thermal"]}
    study = parameters(tmp_path, kit)

    def sheet(**changed):
        return read_sheet(write(tmp_path, "sheet.csv", text_of({**PASS, **changed})), study)

    with pytest.raises(InputError, match="thermal and thermal-2 both offer "
                                         "brightness_temperature; name the one that was used"):
        sheet()
    assert sheet(instrument="thermal-2").entries[0].instrument == "thermal-2"


def test_none_says_what_is_not_offered(tmp_path):
    study = parameters(tmp_path, {"rednir-sky": pair("red_down", "nir_down")})
    for changed, sentence in (
            ({}, "no logger of the campaign offers brightness_temperature, which a contact "
                 "temperature pass needs"),
            ({"quantity": "ndvi", "mode": "", "height_cm": "50"},
             "no logger of the campaign offers red_up and nir_up, which an ndvi pass needs"),
            ({"quantity": "albedo", "mode": "", "height_cm": "50", "instrument": "rednir-sky"},
             "instrument 'rednir-sky' has no column of shortwave_down or shortwave_up")):
        with pytest.raises(InputError) as caught:
            read_sheet(write(tmp_path, "sheet.csv", text_of({**PASS, **changed})), study)
        assert sentence in caught.value.faults[0]


def test_a_longwave_pair_has_no_mode(tmp_path):
    study = parameters(tmp_path, {"station": pair("longwave_up", "longwave_down")})
    path = write(tmp_path, "sheet.csv", text_of({**PASS, "mode": ""}))
    assert read_sheet(path, study).entries[0].mode == ""
    with pytest.raises(InputError, match="a longwave pair serves this pass, and it has none"):
        read_sheet(write(tmp_path, "sheet.csv", text_of(PASS)), study)
