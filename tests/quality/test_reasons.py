"""Each reason to leave a record out: a small faulty survey raises it alone, its clean twin none.

Limits named beside a case are from Long & Shi (2008) or this project's engineering defaults.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from make_broken import BROKEN
from small_survey import (
    ALBEDO,
    CERTAIN,
    CONTACT,
    NDVI,
    lines,
    readings,
    row,
    small,
)

from surveykit.accounting import REASONS

PASS = [row(**ALBEDO)]
AT = 60  # a line inside the pass


def pair(**given):
    return {"pair": lines("pair", **given)}


def spoil(change):
    """Return the pair's logs with its list of lines changed in place."""
    logs = pair()
    change(logs["pair"])
    return logs


def cell(text, column=1):
    def change(log):
        cells = log[AT].split(",")
        cells[column] = text
        log[AT] = ",".join(cells)
    return change


def stepped(log):
    log.insert(AT, log[AT - 20].replace(".000,", ".500,"))


def twice(log):
    log.insert(AT, log[AT])


def conflicting(log):
    log.insert(AT, log[AT].replace(log[AT].split(",")[1], "901.2345"))


def frozen(log):
    sky = log[AT].split(",")[1]
    for i in range(AT, AT + 30):
        time, _, ground = log[i].split(",")
        log[i] = f"{time},{sky},{ground}"


def steady(sky, ground=180.0):
    """Twenty records alive about other levels, so that none of them is a spike."""
    at = np.arange(160)
    return pair(**{name: np.where((at >= AT) & (at < AT + 20),
                                  level + readings(name, 160, 1) - readings(name, 160, 1).mean()
                                  if level > 500 else level + 0.001 * at, readings(name, 160, 1))
                   for name, level in (("sky", sky), ("ground", ground))})


def low_sun():
    """About 10 degrees high where it is still early; the light is as weak as it then is."""
    return pair(sky=readings("sky", 160, 1) / 6, ground=readings("ground", 160, 1) / 6)


def two_heads(missing=()):
    ground = lines("rednir-ground")
    return {"rednir-sky": lines("rednir-sky"),
            "rednir-ground": [line for i, line in enumerate(ground) if i not in missing]}


def pressed(*lifts):
    """A contact log at 1 Hz: 47 degC, dropping where the head is lifted."""
    target = readings("target", 160, 1)
    target = 47 + (target - 47) * 0.5
    for start, stop in lifts:
        target[start:stop] -= 15 * np.sin(np.pi * (np.arange(stop - start) + 0.5) / (stop - start))
    return {"thermal": lines("thermal", target=target)}


EDGES = {"passes": {"sheet_u_s": 5.0}}
DARK = {"entry": "dark", "instrument": "pair", "start": "12:01:00", "stop": "12:01:10"}
EARLY = {"site": {"name": "Further west", "latitude": 41.3, "longitude": -95.0, "elevation_m": 120,
                  "time_zone": "UTC"}}
# reason: (faulty survey, clean twin); each is the arguments of `small`
CASES = {
    "unreadable line": ((PASS, spoil(lambda log: log.__setitem__(AT, log[AT] + ",7"))),),
    "unreadable time": ((PASS, spoil(cell("noon", 0))),),
    "repeated record": ((PASS, spoil(twice)),),
    "conflicting records": ((PASS, spoil(conflicting)),),
    "time stepped back": ((PASS, spoil(stepped)),),
    "no reading": ((PASS, spoil(cell(""))),),
    "unreadable value": ((PASS, spoil(cell("?"))),),
    # the range is -20 to 2200 W m-2 by default
    "out of range": ((PASS, spoil(cell("2201"))), (PASS, steady(1600.0))),
    # zenith 18 deg: 1.5 * 1318 * .951**1.2 + 100 = 1961 W m-2
    "physically impossible": ((PASS, spoil(cell("1990"))), (PASS, steady(1930.0))),
    "stuck reading": ((PASS, spoil(frozen)),),
    "capped": ((
        [*PASS, row(**DARK)],
        pair(sky=np.where((np.arange(160) >= 60) & (np.arange(160) < 70), -2,
                          readings("sky", 160, 1)))),
        ([*PASS, row(**DARK | {"start": "12:02:25", "stop": "12:02:35"})],
         pair(sky=np.where(np.arange(160) >= 144, -2, readings("sky", 160, 1))))),
    "sun too low": ((PASS, low_sun(), EARLY),
                    (PASS, low_sun(), {"settings": CERTAIN})),
    "too little light": ((PASS, steady(49.0, 10.0)), (PASS, steady(51.0, 10.0))),
    "no partner": (([row(**NDVI)], two_heads(missing=(AT, AT + 1))),
                   ([row(**NDVI)], two_heads())),
    # a head at 40 cm needs 53 cm to the edge for nine tenths: (1 + x / sqrt(x^2 + h^2)) / 2
    "foreign ground in view": (([row(**ALBEDO, lanes="1")], pair()),),
    "turn": (([row(**ALBEDO, lanes="4")], pair(),
              {"settings": CERTAIN | {"albedo": {"min_footprint": 0.1}}}),),
    "pass edge": ((PASS, pair(), {"settings": EDGES}),),
    "between placements": (([row(**CONTACT)], pressed((60, 70), (100, 110))),
                           ([row(**CONTACT)], pressed())),
}


def reasons(root, sheet, logs, more=()):
    quality = small(root, sheet, logs, **dict(more)).quality()
    return set(quality.ledger.reason) - {""}, quality


def test_every_reason_has_a_case():
    assert set(CASES) | set(BROKEN) | {"clock refused"} >= {reason.name for reason in REASONS}


@pytest.mark.parametrize("name", CASES)
def test_a_fault_raises_its_reason_alone(tmp_path, name):
    found, quality = reasons(tmp_path, *CASES[name][0])
    assert found == {name}
    row = quality.ledger[quality.ledger.reason == name].iloc[0]
    assert row.disposition == "excluded"
    assert row.records > 0


@pytest.mark.parametrize("name", CASES)
def test_the_clean_twin_raises_none(tmp_path, name):
    twin = CASES[name][1] if len(CASES[name]) > 1 else (PASS, pair())
    found, quality = reasons(tmp_path, *twin)
    assert found - {"capped"} == set()  # a dark row caps a head outside the pass too
    used = quality.ledger[quality.ledger.disposition == "used"]
    assert used.records.sum() == 120 * used.file.nunique()  # 2 min at 1 Hz, every one of them


@pytest.mark.parametrize("name", [n for n in CASES if n not in (
    "foreign ground in view", "turn", "pass edge", "between placements", "capped", "no partner")])
def test_a_fault_is_told_with_its_number_of_records(tmp_path, name):
    _, quality = reasons(tmp_path, *CASES[name][0])
    told = quality.checks[quality.checks.check == name]
    assert set(told.severity) == {"exclude"}
    sentence = next(reason.sentence for reason in REASONS if reason.name == name)
    assert all(sentence in message for message in told.message)
    assert (told.records > 0).all()


def test_the_first_reason_in_the_fixed_order_is_the_records_only_one(tmp_path):
    """Empty in one column and out of range in the other: counted once, as no reading."""
    def both(log):
        time, _, _ = log[AT].split(",")
        log[AT] = f"{time},,2500"

    _, quality = reasons(tmp_path, PASS, spoil(both))
    excluded = quality.ledger[quality.ledger.disposition == "excluded"]
    assert list(excluded.reason) == ["no reading"]
    assert list(excluded.records) == [1]


def test_a_refused_clock_leaves_out_every_record(tmp_path):
    survey = small(tmp_path, PASS, pair())
    log = survey.records["pair"]
    refused = replace(log, marks=log.marks | {"clock refused": np.ones(160, dtype=bool)})
    quality = replace(survey, records={"pair": refused}).quality()
    assert set(quality.ledger.reason) == {"clock refused"}
    assert quality.ledger.records.sum() == 160


def test_no_reason_depends_on_the_surface(tmp_path):
    """The same log under another surface's name: the same marks, record by record."""
    logs = spoil(frozen)
    one = small(tmp_path / "a", [row(**ALBEDO)], logs).quality()
    two = small(tmp_path / "b", [row(**ALBEDO, surface="lawn")], logs).quality()
    for column, mask in one.masks["pair"].items():
        assert np.array_equal(mask, two.masks["pair"][column])
