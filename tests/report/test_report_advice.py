"""What would narrow U most: sources of one remedy weigh together, by hand arithmetic."""

from __future__ import annotations

import math

import pytest
import sample

from surveykit.report import sentences
from surveykit.report.wording import NO_BREAK

FACTS = sample.facts()
EMISSIVITY = "emissivity of the surface (handbook)"


def test_a_refused_pass_of_a_surface_that_has_a_value_is_told() -> None:
    passes = sample.tables()["passes"].iloc[:3].assign(
        surface="lawn", quantity="albedo", kind="clear", note="sun too low")
    surfaces = sample.tables()["surfaces"].query("surface == 'lawn' and quantity == 'albedo'")
    for words, told in ((["ok", "not evaluated", "ok"], f"pass {passes['pass'].iloc[1]}"),
                        (["ok", "not evaluated", "not evaluated"], "2 passes")):
        tables = {**sample.empty_tables(), "surfaces": surfaces,
                  "passes": passes.assign(status=words)}
        assert sentences.not_evaluated(tables, FACTS["labels"]) == [
            f"Sun too low: albedo (clear) of Lawn in {told} was not evaluated."]


def narrowed(narrower: list[float], sources: list[str] | None = None) -> list[str]:
    tables = sample.tables()
    budget = tables["budget"].iloc[:4].copy()
    budget["surface"] = ["pale-slabs", "worn-asphalt", "pale-slabs", "worn-asphalt"]
    budget["source"] = sources or [EMISSIVITY, EMISSIVITY, "b", "b"]
    budget["share"] = [0.2, 0.8, 0.9, 0.2]
    budget["narrower"] = narrower
    surfaces = tables["surfaces"].assign(needed=[math.inf, 12.0, 6.0] + [math.nan] * 13)
    return [_plain(line) for line in sentences.narrowing(
        {**tables, "budget": budget, "surfaces": surfaces}, FACTS)]


def test_narrowing_names_the_source_whose_halving_gains_most_and_what_it_takes() -> None:
    # hand arithmetic: halving gains 0.1 + 0.5 by the emissivity, 0.3 + 0.1 by b: the first, of
    # which the asphalt gains most, from 1.22 to 0.72; shares 0.2 and 0.8, mean 50 %
    assert narrowed([0.1, 0.5, 0.3, 0.1]) == [
        "Temperature, contact: halving “emissivity of the surface (handbook)” (50 % of the "
        "variance on average) would narrow U most, that of Worn asphalt from 1.2 to 0.7 K. Next: a "
        "surer emissivity, from a sample or a reference thermometer on the spot. For U within "
        "±1.0 K: Coated court 12 patches (2 read) and Pale concrete slabs 6 passes (2 made). No "
        "number of passes brings U of Worn asphalt within ±1.0 K: what they share is wider."]


def test_sources_of_one_remedy_weigh_together() -> None:
    # hand arithmetic, slabs: two gains that take 0.5 each off U = 2.18 leave
    # sqrt(2.18^2 - 2 (2.18^2 - 1.68^2)) = 0.945; alone, each is beaten by the 0.8 of "b"
    gains = ["calibration gain of x, a", "calibration gain of x, a", "calibration gain of x, b",
             "b"]
    assert narrowed([0.5, 0.0, 0.5, 0.8], gains)[0].startswith(
        "Temperature, contact: halving “calibration of the heads” (2 sources, 95 % of the variance "
        "on average) would narrow U most, that of Pale concrete slabs from 2.2 to 0.9 K. Next: a "
        "fresh calibration of the heads")


@pytest.mark.parametrize(("source", "says"), [
    ("zero of shortwave, sky_mV (dark readings)", "capped readings"),
    ("calibration gain of rednir-sky, red_sky", "a fresh calibration"),
    ("modelled clear-sky radiance in the band", "a reading of the sky itself"),
    ("form of the law of cooling under the head", "read stand-off on sunlit ground"),
    ("scatter within the one pass", "more passes"),
    ("emissivity from NDVI 0.21 (linear vegetation fraction)", "a surer emissivity")])
def test_a_remedy_follows_from_the_source_not_from_the_name_of_a_channel(
        source: str, says: str) -> None:
    assert f". Next: {says}" in narrowed([0.1, 0.5, 0.3, 0.1], [source, source, "b", "b"])[0]


def test_a_source_without_a_remedy_gets_none() -> None:
    bore = ["emissivity of the bore"] * 2
    assert "Next: " not in narrowed([0.1, 0.5, 0.3, 0.1], [*bore, "b", "b"])[0]


def test_many_passes_are_told_without_false_precision() -> None:
    surfaces = sample.tables()["surfaces"].assign(needed=[math.nan, 100.0, 263.0] + [math.nan] * 13)
    tables = {**sample.tables(), "surfaces": surfaces}
    assert ("For U within ±1.0 K: Coated court 100 patches (2 read) and Pale concrete slabs over "
            "100 passes (2 made).") in _plain(sentences.narrowing(tables, FACTS)[0])


def test_what_is_needed_is_told_only_where_it_is_more_than_was_made() -> None:
    """U of the court is 1.41 K of 4 patches: that 3 would do for 1.0 K is no news to act on."""
    tables = sample.tables()
    surfaces = tables["surfaces"].assign(needed=[math.nan, 3.0] + [math.nan] * 14, n_patches=4)
    assert "For U within" not in sentences.narrowing({**tables, "surfaces": surfaces}, FACTS)[0]


def test_narrowing_falls_back_on_shares_where_no_interval_is_known() -> None:
    # shares of b 0.9 and 0.2, mean 0.55, beat the emissivity's 0.50
    assert narrowed([math.nan] * 4)[0].startswith(
        "Temperature, contact: “b” weighs most, 55 % of the known variance.")


def _plain(text: str) -> str:
    return text.replace(NO_BREAK, " ")
