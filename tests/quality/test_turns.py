"""Turns of a walk over lanes: counted in the ledger by their own reason, no fault of the pass.

A turn lasts 1 s and three time constants either side of its middle (engineering default).
"""

from __future__ import annotations

import numpy as np
import pytest
from small_survey import ALBEDO, CERTAIN, CONTACT, KIT, NDVI, lines, row, small

NAME = "C1-albedo-1"
TO_THE_EDGE = {"albedo": {"min_footprint": 0.1}}  # or the walk's ends see too much beyond


def walked(root, lanes, *, log=None, time_constant_s=0.0, **settings):
    """Take a pass of 120 s over lanes as far as its records; "" writes none."""
    kit = {"pair": KIT["pair"] | {"time_constant_s": time_constant_s}}
    passes = {"sheet_u_s": 0.0} | settings.pop("passes", {})
    survey = small(root, [row(**ALBEDO, lanes=lanes)], {"pair": log or lines("pair")}, kit=kit,
                   settings={"passes": passes} | TO_THE_EDGE | settings)
    quality = survey.quality()
    return quality, quality.passes[NAME]


def told(quality, check):
    rows = quality.checks[quality.checks.check == check]
    return list(zip(rows.severity, rows.records, strict=True))


@pytest.mark.parametrize(("time_constant_s", "each"), [(0.0, 3), (1.0, 9)])
def test_turns_by_hand(tmp_path, time_constant_s, each):
    """Four lanes of 30 s: turns at 30, 60 and 90 s; +-1 s holds 3 records, +-(1 + 3) s 9."""
    quality, chosen = walked(tmp_path, "4", time_constant_s=time_constant_s)
    edges = int(2 * 5 * time_constant_s)  # five time constants off each end
    assert chosen.reasons == {"turn": 3 * each} | ({"pass edge": edges} if edges else {})
    assert chosen.index.size == 120 - 3 * each - edges
    ledger = quality.ledger.set_index("reason").records
    assert ledger["turn"] == 3 * each
    assert quality.ledger.records.sum() == 160
    since = chosen.index - 20  # the pass begins at the log's record 20
    assert (np.abs(since[:, None] - [30, 60, 90]).min(axis=1) > 1 + 3 * time_constant_s).all()


@pytest.mark.parametrize(("lanes", "passes"), [
    ("", {}), ("1", {}), ("4", {"exclude_turns": False})])
def test_without_lanes_or_switched_off_every_record_counts(tmp_path, lanes, passes):
    quality, chosen = walked(tmp_path, lanes, passes=passes)
    assert chosen.index.size == 120
    assert "turn" not in set(quality.ledger.reason)


def test_a_contact_pass_has_no_turns(tmp_path):
    sheet = [row(**CONTACT | {"lanes": "4", "width_m": "4", "length_m": "4"})]
    quality = small(tmp_path, sheet, {"thermal": lines("thermal")}).quality()
    assert "turn" not in set(quality.ledger.reason)


def test_the_partner_loses_the_same_seconds(tmp_path):
    logs = {name: lines(name) for name in ("rednir-sky", "rednir-ground")}
    quality = small(tmp_path, [row(**NDVI, lanes="4")], logs,
                    settings=CERTAIN | TO_THE_EDGE).quality()
    turned = quality.ledger[quality.ledger.reason == "turn"].set_index("logger").records
    assert turned.to_dict() == {"rednir-sky": 9, "rednir-ground": 9}


def test_many_short_lanes_refuse_no_pass_but_are_flagged(tmp_path):
    """Twelve lanes of 10 s at a time constant of 1 s: of 110 s between the edges 90 s are turns."""
    quality, chosen = walked(tmp_path / "a", "12", time_constant_s=1.0)
    assert chosen.refusal == ""
    assert chosen.reasons["turn"] > 0.6 * 110
    assert told(quality, "turns") == [("flag", chosen.reasons["turn"])]
    assert told(quality, "records of a pass") == []
    quality, chosen = walked(tmp_path / "b", "4", time_constant_s=1.0)
    assert told(quality, "turns") == []


def test_faults_are_a_share_of_the_lanes(tmp_path):
    """Twelve lanes: 2 s of each lane are left; nothing but faults there refuses, one lane not."""
    def spoiled(stop):
        log = lines("pair")
        for i in range(21, stop):
            log[i] = log[i].split(",")[0] + ",2500,180"
        return log

    _, all_bad = walked(tmp_path / "a", "12", log=spoiled(141), time_constant_s=1.0)
    assert "100 % of the records are excluded, most as: out of range" in all_bad.refusal
    quality, few = walked(tmp_path / "b", "12", log=spoiled(31), time_constant_s=1.0)
    assert few.refusal == ""
    assert few.reasons["out of range"] == 10  # a fault is the first reason, in a turn as well
    assert told(quality, "records of a pass") == []


def test_lanes_shorter_than_their_turns_are_refused_by_name(tmp_path):
    _, chosen = walked(tmp_path, "20", time_constant_s=1.0)
    assert chosen.refusal == ("its 20 lanes of 6 s are shorter than their turns: walk longer or "
                              "fewer lanes, or check lanes")
