"""CSV tables and their data package, read back by pandas, csv and the frictionless validator."""

from __future__ import annotations

import csv
import hashlib
import json
from pathlib import Path

import frictionless
import numpy as np
import pandas as pd
import pytest
import sample

from surveykit.core import TABLES
from surveykit.report.datapackage import write_tables


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    write_tables(sample.tables(hostile=True), tmp_path, sample.facts())
    return tmp_path


@pytest.mark.parametrize("tables", [sample.tables(hostile=True), sample.empty_tables()],
                         ids=["full", "empty"])
@pytest.mark.filterwarnings("default")  # the validator's own imports warn
def test_frictionless_finds_nothing_to_mark(tables: dict, tmp_path: Path) -> None:
    write_tables(tables, tmp_path, sample.facts())
    report = frictionless.validate(str(tmp_path / "datapackage.json"))
    assert report.valid, report.flatten(["rowNumber", "fieldName", "type", "note"])
    assert report.stats["tasks"] == len(TABLES)


def test_numbers_keep_every_digit(folder: Path) -> None:
    for name in ("surfaces", "differences", "budget"):
        back = pd.read_csv(folder / f"{name}.csv", keep_default_na=False, na_values={
            column: [""] for column, kind in TABLES[name].items() if kind != "text"})
        for column, kind in TABLES[name].items():
            if kind in ("number", "count"):
                expected = sample.tables()[name][column].to_numpy(float)
                np.testing.assert_array_equal(back[column].to_numpy(float), expected)


def test_cells_are_text_times_and_infinities_as_promised(folder: Path) -> None:
    raw = (folder / "surfaces.csv").read_bytes()
    assert b"\r" not in raw
    with (folder / "surfaces.csv").open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))
    assert rows[3]["note"].startswith("'=HYPERLINK(")
    assert rows[3]["value"] == ""
    assert rows[13]["dof"] == "INF"
    with (folder / "passes.csv").open(encoding="utf-8", newline="") as stream:
        passes = list(csv.DictReader(stream))
    assert passes[0]["start_utc"] == "2025-07-24T10:05:00Z"
    assert passes[0]["note"] == "'@sum <b>note</b>"
    with (folder / "dwells.csv").open(encoding="utf-8", newline="") as stream:
        assert next(csv.DictReader(stream))["stop_utc"] == "2025-07-24T10:05:15Z"


def test_no_text_cell_starts_a_formula(folder: Path) -> None:
    for name, contract in TABLES.items():
        with (folder / f"{name}.csv").open(encoding="utf-8", newline="") as stream:
            for row in csv.DictReader(stream):
                for column, kind in contract.items():
                    if kind == "text":
                        assert not row[column].startswith(("=", "+", "-", "@", "\t", "\r"))


def test_the_package_names_units_hashes_and_cf_names(folder: Path) -> None:
    package = json.loads((folder / "datapackage.json").read_text("utf-8"))
    by_name = {resource["name"]: resource for resource in package["resources"]}
    assert [*by_name] == [*TABLES]
    for name, resource in by_name.items():
        content = (folder / resource["path"]).read_bytes()
        assert resource["hash"] == "sha256:" + hashlib.sha256(content).hexdigest()
        assert resource["bytes"] == len(content)
        assert [field["name"] for field in resource["schema"]["fields"]] == [*TABLES[name]]
        for field in resource["schema"]["fields"]:
            assert (field["type"] == "number") == ("unit" in field)
    fields = {field["name"]: field for field in by_name["passes"]["schema"]["fields"]}
    assert fields["zenith_deg"]["standard_name"] == "solar_zenith_angle"  # CF standard name table
    assert fields["zenith_deg"]["unit"] == "degree"
    assert fields["quantity"]["standard_names"]["albedo"] == "surface_albedo"


def test_each_number_is_described_as_what_it_is(folder: Path) -> None:
    """The edges of a histogram are no interval; an input's u has the input's own unit."""
    package = json.loads((folder / "datapackage.json").read_text("utf-8"))
    told = {(resource["name"], field["name"]): field for resource in package["resources"]
            for field in resource["schema"]["fields"]}
    assert told["surfaces", "lower"]["description"] == "lower end of the interval at `coverage`"
    assert told["histograms", "lower"]["description"].startswith("lower edge of the readings")
    assert told["budget", "u_input"]["unit"] == "of the input"
    assert told["budget", "contribution"]["unit"] == "as the column unit says"
    assert [told["dwells", name]["unit"] for name in ("value", "u")] == ["degC", "K"]
    with pytest.raises(ValueError, match="unknown"):
        write_tables({"unknown": pd.DataFrame()}, folder, sample.facts())


def test_twice_gives_the_same_bytes(tmp_path: Path) -> None:
    first = write_tables(sample.tables(), tmp_path / "a", sample.facts())
    second = write_tables(sample.tables(), tmp_path / "b", sample.facts())
    assert [p.read_bytes() for p in first] == [p.read_bytes() for p in second]
    assert len(first) == len(TABLES) + 1


def test_a_table_off_its_contract_is_refused(tmp_path: Path) -> None:
    broken = sample.tables()["clocks"].drop(columns="u_s")
    with pytest.raises(ValueError, match="u_s"):
        write_tables({"clocks": broken}, tmp_path, sample.facts())
