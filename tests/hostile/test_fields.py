"""A payload in every text a parameter file may hold: refused with its place, or kept as plain text.

The places come from the schema, so that a new key is covered by itself. What papermill makes of
sections handed to it (-f) is read as Python and as IPython, and holds the text and nothing else.
"""

import ast
import os

import pytest
from IPython.core.inputtransformer2 import TransformerManager
from papermill.translators import PythonTranslator
from payloads import PAYLOADS, full_campaign, put, read_document, text_places

from surveykit.core import InputError

PLACES = text_places(full_campaign())


@pytest.fixture
def params(tmp_path, monkeypatch):
    for folder in ("params", "notebooks", "data"):
        (tmp_path / folder).mkdir()
    (tmp_path / "data" / "sheet.csv").write_text("entry\n", encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    yield tmp_path / "params" / "yard.yml"
    assert sorted(os.listdir(tmp_path)) == ["data", "notebooks", "params"]


def test_the_places_are_all_there():
    names = {".".join(map(str, place)) for place in PLACES}
    assert {"title", "notes", "site.name", "crew.0", "surfaces.court.label", "data_folder",
            "surfaces.court.emissivity.source", "instruments.pair.serial",
            "instruments.pair.columns.sky.quantity", "loggers.pair.files.0"} <= names
    assert len(names) > 40


@pytest.mark.parametrize("place", PLACES, ids=lambda place: ".".join(map(str, place)))
def test_a_payload_is_refused_or_plain_text(params, place):
    base = full_campaign()
    for payload in PAYLOADS:
        document = put(base, place, payload)
        faults = faults_of(document, params)
        for fault in faults:
            assert len(fault) < 700, fault
            assert fault.isprintable(), fault  # nothing that a terminal would obey
            assert fault.startswith("params/yard.yml"), fault
        if not faults:
            injected_is_data(document)


def faults_of(document, path):
    try:
        read_document(document, path)
    except InputError as error:
        return error.faults
    return ()


def injected_is_data(document):
    source = PythonTranslator.codify(document, "Parameters")  # what papermill -f injects
    assert TransformerManager().transform_cell(source).rstrip() == source.rstrip()
    got = {}
    for node in ast.parse(source).body:
        assert isinstance(node, ast.Assign)
        got[ast.unparse(node.targets[0])] = ast.literal_eval(node.value)
    assert got == document


@pytest.mark.parametrize("payload", [p for p in PAYLOADS if len(p) < 1000])
def test_a_payload_as_a_name_is_refused(params, payload):
    """Papermill writes top-level keys into code as they stand: such a file must never pass."""
    base = full_campaign()
    for document in ({**base, payload: 1}, put(base, ("surfaces", payload), {"label": "x"}),
                     put(base, ("site", payload), 1), put(base, ("instruments", payload), {}),
                     put(base, ("loggers", payload), {"files": "x"})):
        with pytest.raises(InputError) as refused:
            read_document(document, params)
        assert all(fault.isprintable() for fault in refused.value.faults)
