"""Every check has one faulty file that triggers exactly it, and a clean twin that does not.

The files stand in tests/data/broken/checks and are made by make_broken.py; the limits they pass are
those of the BSRN tests (Long & Shi 2008, upward and longwave from memory), of file formats, or this
project's engineering defaults.
"""

from __future__ import annotations

from copy import deepcopy

import pytest
import yaml
from make_broken import BESIDE_FILE, BROKEN, FOLDER, file, files
from small_survey import ALBEDO, KIT, LONGWAVE, NDVI, STAND_OFF, row, small

from surveykit.accounting import CHECKS

ALL = ("pair", "thermal", "longwave", "rednir-sky", "rednir-ground", "weather")
TIMES = {"start": "12:00:20", "stop": "12:01:30"}
# what is not a fault of one file, or belongs to the clocks: test_reasons and test_selection
ELSEWHERE = {"capped", "no partner", "foreign ground in view", "turn", "pass edge",
             "between placements", "clock refused"}
SERVED = {"pair": ALBEDO, "thermal": STAND_OFF, "longwave": LONGWAVE, "rednir-ground": NDVI,
          "rednir-sky": NDVI}


BESIDE = yaml.safe_load((FOLDER / BESIDE_FILE).read_text(encoding="utf-8"))


def found(root, sheet, logs, *, rows=(), times=TIMES, head=None, **more):
    kit = deepcopy(KIT)
    for column, keys in (head or {}).items():
        kit["thermal"]["columns"][column] |= keys
    rows = [*(row(**times, **one) for one in sheet), *(row(**one) for one in rows)]
    quality = small(root, rows, logs, kit=kit, **more).quality()
    return set(quality.checks.check) - {"records of a pass"}, quality


def logs(**broken):
    names = {name: f"clean-{name}.csv" for name in ALL} | broken
    return {name: (FOLDER / file).read_text(encoding="utf-8").splitlines()
            for name, file in names.items()}


def sheet(case, logger):
    """Return the passes that the logger serves; after a change of light, temperatures alone."""
    return [STAND_OFF if case == "irradiance history" else SERVED[logger]]


def of_case(root, case):
    logger = BROKEN[case][0]
    return found(root, sheet(case, logger), logs(**{logger: file(case)}), **BESIDE.get(case, {}))


def test_every_check_has_a_file():
    assert set(CHECKS) - ELSEWHERE <= set(BROKEN)


def test_the_files_are_as_make_broken_writes_them():
    assert {path.name: path.read_text(encoding="utf-8") for path in FOLDER.iterdir()} == files()


TWINS = ("dark drift, none", "panel, near", "end of range, stated wide")


@pytest.mark.parametrize("case", [case for case in BROKEN if case not in ("swapped", *TWINS)])
def test_a_faulty_file_triggers_exactly_its_check(tmp_path, case):
    check = case.partition(",")[0]
    names, quality = of_case(tmp_path, case)
    assert names == {check}
    rows = quality.checks[quality.checks.check == check]
    if check in CHECKS:
        assert set(rows.severity) == {CHECKS[check].action}
        assert (rows.records > 0).all()
        assert all(CHECKS[check].sentence in message for message in rows.message)
        excluded = set(quality.ledger.reason[quality.ledger.disposition == "excluded"])
        assert excluded == ({check} if CHECKS[check].action == "exclude" else set())
        flags = {flag for chosen in quality.passes.values() for flag in chosen.flags}
        assert flags == (set() if CHECKS[check].action == "exclude" else {check})


@pytest.mark.parametrize("case", TWINS)
def test_what_holds_triggers_nothing(tmp_path, case):
    assert of_case(tmp_path, case)[0] == set()


@pytest.mark.parametrize("logger", SERVED)
def test_a_clean_file_triggers_none(tmp_path, logger):
    names, quality = found(tmp_path, [SERVED[logger]], logs())
    assert names == set()
    used = quality.ledger[quality.ledger.disposition == "used"]
    assert (used.records[used.logger != "weather"] == 70).any()
    assert (quality.ledger.disposition != "excluded").all()


def test_swapped_columns_are_refused_and_named(tmp_path):
    names, quality = of_case(tmp_path, "swapped")
    assert names == {"more light up than down"}
    assert quality.passes["C1-albedo-1"].refusal == (
        "the head said to look down reads more than the one said to look up in 100 % of the "
        "records: check which column is shortwave_up and which shortwave_down")


@pytest.mark.parametrize("check", ["spike", "far from the air", "improbable albedo", "step",
                                   "irradiance history", "stuck reading"])
def test_no_check_looks_at_the_surfaces_name(tmp_path, check):
    """The same faulty file on a surface of another name: the same marks, flags and sentences."""
    logger = BROKEN[check][0]
    one = logs(**{logger: file(check)})
    kept = []
    for surface in ("court", "lawn", "control"):
        place = {"surface": surface, "patch": "C1"}
        _, quality = found(tmp_path / surface, [s | place for s in sheet(check, logger)], one)
        kept.append(quality)
    for other in kept[1:]:
        for name, columns in kept[0].masks.items():
            for column, mask in columns.items():
                assert (mask == other.masks[name][column]).all()
        assert other.checks.drop(columns="surface").equals(kept[0].checks.drop(columns="surface"))
        assert other.passes.keys() == kept[0].passes.keys()
        for name, chosen in kept[0].passes.items():
            assert (chosen.index == other.passes[name].index).all()
            assert chosen.flags == other.passes[name].flags


def test_a_word_in_the_registry_decides(tmp_path, monkeypatch):
    """What is a flag there excludes nothing; the same check read as exclude leaves records out."""
    from dataclasses import replace

    from surveykit import accounting
    one = logs(thermal="spike.csv")
    monkeypatch.setitem(accounting.CHECKS, "spike",
                        replace(accounting.CHECKS["spike"], action="flag"))
    _, quality = found(tmp_path, [STAND_OFF], one)
    assert (quality.ledger.disposition != "excluded").all()
    assert quality.passes["C1-standoff-1"].flags == ("spike",)
