"""The demo's clocks against the truth they were made with (demo_data/truth.json)."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import pytest

from surveykit.intake.aligning import align, read_logs
from surveykit.intake.edges import look
from surveykit.intake.params import load

NS = 10**9
ROOT = Path(__file__).parent.parent.parent
DEMO = [f"pellowick-yard-2025-{day}" for day in ("06-11", "07-16", "09-17")]


@pytest.fixture(scope="module")
def truth():
    return json.loads((ROOT / "demo_data/truth.json").read_text(encoding="utf-8"))


@pytest.fixture(scope="module", params=DEMO)
def found(request):
    parameters = load(ROOT / "params" / f"{request.param}.yml")
    return request.param, align(parameters, *read_logs(parameters))


def deviations(clock, campaign, truth):
    """Return found minus true offset [s] with u [s] at both ends of the events, and middle."""
    (true,) = [row for row in truth["clocks"]
               if (row["campaign"], row["logger"]) == (campaign, clock.logger)]
    (piece,) = clock.pieces
    for at_ns in (*piece.known_ns, piece.at_ns):
        logged_s = at_ns / NS
        offset = true["offset_s"] + 1e-6 * true["drift_ppm"] * (logged_s - true["from_s"])
        mine = float(piece.line.at((at_ns - piece.origin_ns) / NS - piece.line.offset_s))
        yield mine - offset, piece.u_s(at_ns)


def test_every_found_clock_holds_its_truth(found, truth):
    campaign, ingested = found
    clocks = {clock.logger: clock for clock in ingested.clocks}
    assert clocks["thermal"].method == "cover events"
    assert clocks["rednir-ground"].method == "aligned with rednir-sky, by covers"
    watch = next(row["drawn"] for row in truth["errors"] if row["scope"] == f"{campaign}:watch")
    for away, u_s in deviations(clocks["thermal"], campaign, truth):
        assert abs(away + watch) < 3 * u_s  # the sheet's times lack the watch's error
    sky = next(row["offset_s"] for row in truth["clocks"]
               if (row["campaign"], row["logger"]) == (campaign, "rednir-sky"))
    for away, u_s in deviations(clocks["rednir-ground"], campaign, truth):
        assert abs(away - (clocks["rednir-sky"].offset_s - sky)) < 3 * u_s


def test_no_clock_of_the_demo_is_refused(found):
    _, ingested = found
    assert not [clock.logger for clock in ingested.clocks if clock.status == "refused"]
    assert not [this.name for this in ingested.passes if this.refusal]


def miscounted(passes):
    return [this.name for this in passes if any("placements found" in n for n in this.notes)]


def test_placements_of_the_demo_agree_with_its_sheet(found):
    assert miscounted(found[1].passes) == []


@pytest.mark.parametrize("away", [-4, 4])
def test_a_sheet_that_counts_four_more_or_fewer_is_told(found, away):
    """Written times of 5 s leave up to two placements of 7 s open at the pass's edges."""
    campaign, ingested = found
    contact = [replace(this, reading=this.reading + away, notes=())
               for this in ingested.passes if this.kind == "contact"]
    parameters = load(ROOT / f"params/{campaign}.yml")
    looked = look(contact, ingested.records, ingested.sheet.entries, parameters,
                  {clock.logger: clock for clock in ingested.clocks}, ingested.sheet.path)
    assert len(miscounted(looked)) >= 0.9 * len(contact)
