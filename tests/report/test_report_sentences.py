"""Each verdict word reads as a correct sentence; sentences hold the tables' own numbers."""

from __future__ import annotations

import math
import re

import pandas as pd
import pytest
import sample

from surveykit.report import sentences, standing
from surveykit.report.wording import NO_BREAK

FACTS = sample.facts()
FORBIDDEN = re.compile(
    r"\b([Ss]afe|[Cc]omplian(t|ce)|[Pp]roves?|[Ss]ignificant|nan|NaN|None|inf)\b")
ROW = {
    "quantity": "temperature", "kind": "contact", "surface": "coated-court",
    "other": "worn-asphalt", "unit": "K", "difference": -8.47, "change": -7.94, "lower": -9.56,
    "upper": -6.32, "could_have_missed": 2.23, "control": "worn-asphalt",
    "earlier": "mill-yard-2025-06-12", "method": "ratio to control",
    "comparability": "partly matched", "note": "wind not stated",
}
PAIRS = {
    "higher": "Coated court is 7.9 ± 1.6 K higher than Worn asphalt.",
    "lower": "Coated court is 7.9 ± 1.6 K lower than Worn asphalt.",
    "higher, small": "Coated court is 7.9 ± 1.6 K higher than Worn asphalt, less than the "
                     "relevant 1.0 K.",
    "lower, small": "Coated court is 7.9 ± 1.6 K lower than Worn asphalt, less than the "
                    "relevant 1.0 K.",
    "equivalent": "Coated court and Worn asphalt are equivalent within ±1.0 K.",
    "no difference shown": "no difference is shown between Coated court and Worn asphalt (could "
                           "have missed up to 2.2 K).",
    "not comparable": "Coated court and Worn asphalt are not comparable: wind not stated.",
    "not evaluated": "Coated court and Worn asphalt were not evaluated: wind not stated.",
    "": "",
}
SINCE = "12 June 2025"
WHAT, CONTROL = "temperature (contact)", "than the control, Worn asphalt, leads to expect"
CHANGES = {
    "higher": f"{WHAT} is 7.9 ± 1.6 K higher {CONTROL}",
    "lower": f"{WHAT} is 7.9 ± 1.6 K lower {CONTROL}",
    "higher, small": f"{WHAT} is 7.9 ± 1.6 K higher {CONTROL}, less than the relevant 1.0 K",
    "lower, small": f"{WHAT} is 7.9 ± 1.6 K lower {CONTROL}, less than the relevant 1.0 K",
    "equivalent": f"{WHAT} is equivalent within ±1.0 K",
    "no difference shown": f"no difference of {WHAT} is shown (could have missed up to 2.2 K)",
    "not comparable": f"{WHAT} is not comparable: wind not stated",
    "not evaluated": f"{WHAT} was not evaluated: wind not stated",
    "": "",
}


def plain(text: str) -> str:
    return text.replace(NO_BREAK, " ")


@pytest.mark.parametrize("verdict", PAIRS)
def test_each_verdict_on_a_pair_is_a_sentence(verdict: str) -> None:
    row = {**ROW, "verdict": verdict, "difference": -7.94}
    assert plain(sentences.pair_sentence(row, FACTS)) == PAIRS[verdict]


@pytest.mark.parametrize("verdict", CHANGES)
def test_each_verdict_on_a_change_is_a_sentence(verdict: str) -> None:
    row = {**ROW, "verdict": verdict}
    assert plain(sentences.change_part(row, FACTS)) == CHANGES[verdict]


def test_the_method_decides_what_a_change_is_measured_against() -> None:
    raw = {**ROW, "verdict": "lower", "method": "raw", "control": ""}
    both = {**ROW, "verdict": "lower", "method": "difference in differences"}
    assert plain(sentences.change_part(raw, FACTS)).endswith("7.9 ± 1.6 K lower than before")
    assert "the change of Worn asphalt taken off" in sentences.change_part(both, FACTS)


def test_a_missing_relevant_change_leaves_a_whole_sentence() -> None:
    row = {**ROW, "verdict": "equivalent"}
    facts = {**FACTS, "relevant_change": {}}
    assert sentences.pair_sentence(row, facts) == (
        "Coated court and Worn asphalt are equivalent within the relevant change.")


def test_the_abstract_says_in_a_line_each_what_a_reader_asks_first() -> None:
    lines = [plain(line) for line in sentences.abstract(sample.tables(), FACTS)]
    assert [line.partition(":")[0] for line in lines] == [
        "Measured", "Found, value ± U (95 %)", "Changed", "To do next"]
    assert lines[0] == (
        "Measured: temperature (contact), temperature (stand-off), albedo (clear) and NDVI of "
        "5 surfaces at Mill Yard, in 44 passes on 24 July 2025.")
    assert ("temperature (contact) from 47.9 ± 2.2 °C (Pale concrete slabs) to 58.3 ± 1.2 °C "
            "(Worn asphalt)") in lines[1]
    assert lines[1].endswith("NDVI from 0.031 ± 0.010 (Worn asphalt) to 0.781 ± 0.021 (Lawn).")
    assert "Coated court since 12 June 2025 (temperature (contact) −7.9 ± 1.6 K, " in lines[2]
    assert lines[2].endswith("; no other change is shown.")


def test_changes_shown_are_gathered_by_surface_and_date() -> None:
    lines = [plain(line) for line in sentences.changed(sample.tables()["changes"], FACTS)]
    assert lines[0].startswith(
        f"Coated court since {SINCE}: {WHAT} is 7.9 ± 1.6 K lower {CONTROL}; temperature "
        "(stand-off) is 0.6 ± 0.4 K lower")
    assert lines[0].endswith("Conditions partly matched and matched.")


def test_trends_are_told_only_where_established() -> None:
    trends = sample.tables()["trends"]
    assert [plain(line) for line in sentences.trending(trends, FACTS)] == [
        "Trend of albedo (clear) of Coated court: +0.310 ± 0.210 a⁻¹ over 3 dates, higher."]
    none = trends.assign(verdict=["no difference shown", ""])
    assert sentences.trending(none, FACTS) == [
        "No trend is established over 3 dates (1 series judged)."]
    assert sentences.trending(trends.iloc[:0], FACTS) == []


def test_what_differs_counts_judged_pairs_and_names_the_largest() -> None:
    lines = [plain(line) for line in sentences.differs(sample.tables()["differences"], FACTS)]
    # hand count: contact has three pairs with two values; 58.34 - 47.93 = 10.41 is the largest
    assert lines[0].startswith(
        "Temperature, contact: 2 of 3 pairs differ by at least the relevant 1.0 K, the largest: "
        "Worn asphalt is 10.4")
    assert "no difference is shown between Coated court and Pale concrete slabs (could have " in (
        lines[0])
    assert "Coated court is 0.014 ± 0.014 lower than Pale concrete slabs" in lines[2]


def test_changes_not_shown_are_gathered_by_quantity() -> None:
    changes = sample.tables()["changes"]
    row = changes[changes["verdict"] == "no difference shown"].iloc[[0]]
    more = [row.assign(surface=name, could_have_missed=size) for name, size in [
        ("lawn", 4.84), ("worn-asphalt", 5.91)]]
    ndvi = row.assign(quantity="ndvi", kind="", unit="1", could_have_missed=0.0291)
    lines = sentences.changed(pd.concat([*more, ndvi]), FACTS)
    assert [plain(line) for line in lines] == [
        f"No difference shown since {SINCE}, with what could have been missed: temperature "
        "(contact) of Lawn (4.8 K) and Worn asphalt (5.9 K); NDVI of Pale concrete slabs (0.029)."]


def test_many_pairs_without_a_difference_are_counted() -> None:
    rows = sample.tables()["differences"]
    row = rows[rows["verdict"] == "no difference shown"].iloc[[0]]
    three = pd.concat([row.assign(could_have_missed=size) for size in (2.0, 4.72, 3.0)])
    assert [plain(line) for line in sentences.differs(three, FACTS)] == [
        "Temperature, contact: 0 of 3 pairs differ by at least the relevant 1.0 K; 3 pairs: no "
        "difference shown (could have missed up to 4.7 K)."]


def test_not_evaluated_is_gathered_by_reason() -> None:
    lines = sentences.not_evaluated(sample.tables(), FACTS["labels"])
    assert lines[0] == (
        "No contact dwell settled for 3 s: temperature (contact) of Lawn was not evaluated; the "
        "temperature (contact) differences of 3 pairs were not evaluated; temperature (contact) of "
        "Lawn was not evaluated against 12 June 2025.")
    assert any(line.startswith("The control was 5.2 K above the air") and
               "is not comparable with 12 June 2025" in line for line in lines)


def narrowed(narrower: list[float]) -> list[str]:
    tables = sample.tables()
    budget = tables["budget"].iloc[:4].copy()
    budget["surface"] = ["pale-slabs", "worn-asphalt", "pale-slabs", "worn-asphalt"]
    budget["source"], budget["share"] = ["emissivity", "emissivity", "b", "b"], [0.2, 0.8, 0.9, 0.2]
    budget["narrower"] = narrower
    surfaces = tables["surfaces"].assign(needed=[math.inf, 12.0, 6.0] + [math.nan] * 13)
    return [plain(line) for line in sentences.narrowing(
        {**tables, "budget": budget, "surfaces": surfaces}, FACTS)]


def test_narrowing_names_the_source_whose_halving_gains_most_and_what_it_takes() -> None:
    # hand arithmetic: halving gains 0.1 + 0.5 by the emissivity, 0.3 + 0.1 by b: the first, of
    # which the asphalt gains most, from 1.22 to 0.72; shares 0.2 and 0.8, mean 50 %
    assert narrowed([0.1, 0.5, 0.3, 0.1]) == [
        "Temperature, contact: halving “emissivity” (50 % of the variance on average) would narrow "
        "U most, that of Worn asphalt from 1.2 to 0.7 K. Next: a surer emissivity, from a sample "
        "or a reference thermometer on the spot. For U within ±1.0 K: Coated court 12 patches (2 "
        "read) and Pale concrete slabs 6 passes (2 made). No number of passes brings U of Worn "
        "asphalt within ±1.0 K: what they share is wider."]


def test_narrowing_falls_back_on_shares_where_no_interval_is_known() -> None:
    # shares of b 0.9 and 0.2, mean 0.55, beat the emissivity's 0.50
    assert narrowed([math.nan] * 4)[0].startswith(
        "Temperature, contact: “b” weighs most, 55 % of the known variance.")


def test_cautions_defer_and_lead_with_the_hottest_upper_end() -> None:
    lines = standing.cautions(sample.tables()["surfaces"], sample.LABELS)
    assert "59.6" in lines[0]  # 58.34 + 1.22
    assert "local codes and licensed practice" in lines[0]
    assert lines[-1].startswith("This report certifies nothing")
    assert len(standing.cautions(sample.empty_tables()["surfaces"])) == 2


def test_no_sentence_claims_more_than_was_measured() -> None:
    tables = sample.tables()
    lines = [*sentences.abstract(tables, FACTS), *sentences.changed(tables["changes"], FACTS),
             *sentences.differs(tables["differences"], FACTS), *standing.reading(FACTS),
             *sentences.not_evaluated(tables), *sentences.narrowing(tables, FACTS),
             *standing.cautions(tables["surfaces"]), *sentences.two_kinds(tables["surfaces"]),
             *sentences.value_only(tables["surfaces"])]
    assert len(lines) > 25
    for line in lines:
        assert not FORBIDDEN.search(line), line
        assert line.endswith("."), line
        assert ".." not in line, line
        assert "  " not in line, line


def test_nothing_at_all_is_said_in_words() -> None:
    tables = sample.empty_tables()
    assert sentences.abstract(tables, FACTS) == [
        "No surface at Mill Yard was surveyed on 24 July 2025."]
    assert sentences.differs(tables["differences"], FACTS) == []
    assert sentences.not_evaluated(tables) == []
    assert sentences.narrowing(tables, FACTS) == []
    bare = sentences.abstract(sample.bare_tables(), FACTS)
    assert bare == ["1 surface at Mill Yard was visited on 24 July 2025, but no pass could be "
                    "matched with records."]
