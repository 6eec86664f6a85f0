"""Each verdict word reads as a correct sentence; sentences hold the tables' own numbers."""

from __future__ import annotations

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
    "higher": "Coated court is higher than Worn asphalt by 7.9 ± 1.6 K.",
    "lower": "Coated court is lower than Worn asphalt by 7.9 ± 1.6 K.",
    "higher, small": "Coated court is higher than Worn asphalt by 7.9 ± 1.6 K, less than the "
                     "relevant 1.0 K.",
    "lower, small": "Coated court is lower than Worn asphalt by 7.9 ± 1.6 K, less than the "
                    "relevant 1.0 K.",
    "equivalent": "Coated court and Worn asphalt are equivalent within ±1.0 K.",
    "no difference shown": "no difference is shown between Coated court and Worn asphalt (could "
                           "have missed up to 2.2 K).",
    "not comparable": "Coated court and Worn asphalt are not comparable: wind not stated.",
    "not evaluated": "Coated court and Worn asphalt were not evaluated: wind not stated.",
    "": "",
}
SINCE = "mill-yard-2025-06-12"
SURE = "(conditions partly matched: wind not stated)"
CONTROL = f"than the control, Worn asphalt, leads to expect from {SINCE}"
CHANGES = {
    "higher": f"Coated court: temperature (contact) is higher by 7.9 ± 1.6 K {CONTROL} {SURE}.",
    "lower": f"Coated court: temperature (contact) is lower by 7.9 ± 1.6 K {CONTROL} {SURE}.",
    "higher, small": f"Coated court: temperature (contact) is higher by 7.9 ± 1.6 K {CONTROL}, "
                     f"less than the relevant 1.0 K {SURE}.",
    "lower, small": f"Coated court: temperature (contact) is lower by 7.9 ± 1.6 K {CONTROL}, "
                    f"less than the relevant 1.0 K {SURE}.",
    "equivalent": f"Coated court: temperature (contact) is equivalent to {SINCE} within ±1.0 K "
                  f"{SURE}.",
    "no difference shown": f"Coated court: no difference of temperature (contact) from {SINCE} is "
                           f"shown (could have missed up to 2.2 K) {SURE}.",
    "not comparable": f"Coated court: temperature (contact) is not comparable with {SINCE}: wind "
                      "not stated.",
    "not evaluated": f"Coated court: temperature (contact) was not evaluated against {SINCE}: "
                     "wind not stated.",
    "": "",
}


def plain(text: str) -> str:
    return text.replace(NO_BREAK, " ")


@pytest.mark.parametrize("verdict", PAIRS)
def test_each_verdict_on_a_pair_is_a_sentence(verdict: str) -> None:
    row = {**ROW, "verdict": verdict, "difference": -7.94}
    assert plain(sentences.pair_sentence(row, sample.LABELS, FACTS)) == PAIRS[verdict]


@pytest.mark.parametrize("verdict", CHANGES)
def test_each_verdict_on_a_change_is_a_sentence(verdict: str) -> None:
    row = {**ROW, "verdict": verdict}
    assert plain(sentences.change_sentence(row, FACTS)) == CHANGES[verdict]


def test_the_method_decides_what_a_change_is_measured_against() -> None:
    raw = {**ROW, "verdict": "lower", "method": "raw", "control": ""}
    both = {**ROW, "verdict": "lower", "method": "difference in differences"}
    assert f"7.9 ± 1.6 K than in {SINCE} (" in plain(sentences.change_sentence(raw, FACTS))
    assert "the change of Worn asphalt taken off" in sentences.change_sentence(both, FACTS)


def test_a_missing_relevant_change_leaves_a_whole_sentence() -> None:
    row = {**ROW, "verdict": "equivalent"}
    facts = {**FACTS, "relevant_change": {}}
    assert sentences.pair_sentence(row, sample.LABELS, facts) == (
        "Coated court and Worn asphalt are equivalent within the relevant change.")


def test_what_was_measured_spans_lowest_to_highest() -> None:
    lines = [plain(line) for line in sentences.measured(sample.tables(), FACTS)]
    assert lines[0] == "5 surfaces at Mill Yard were surveyed in 44 passes on 24 July 2025."
    assert lines[1] == ("Temperature, contact: from 47.9 ± 2.2 °C for Pale concrete slabs to "
                        "58.3 ± 1.2 °C for Worn asphalt.")
    assert lines[4] == "NDVI: from 0.031 ± 0.010 for Worn asphalt to 0.781 ± 0.021 for Lawn."


def test_what_differs_counts_judged_pairs_and_names_the_largest() -> None:
    lines = [plain(line) for line in sentences.differs(sample.tables()["differences"], FACTS)]
    # hand count: contact has three pairs with two values; 58.34 - 47.93 = 10.41 is the largest
    assert lines[0].startswith(
        "Temperature, contact: 2 of 3 pairs differ by at least the relevant 1.0 K, the largest: "
        "Worn asphalt is higher than Pale concrete slabs by 10.4")
    assert "no difference is shown between Coated court and Pale concrete slabs (could have " in (
        lines[0])
    assert "Coated court is lower than Pale concrete slabs by 0.014" in lines[2]


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
    lines = sentences.not_evaluated(sample.tables(), sample.LABELS)
    assert lines[0] == (
        "No contact dwell settled for 3 s: temperature (contact) of Lawn was not evaluated; the "
        "temperature (contact) differences of 3 pairs were not evaluated; temperature (contact) of "
        "Lawn was not evaluated against mill-yard-2025-06-12.")
    assert any(line.startswith("The control was 5.2 K above the air") and
               "is not comparable with mill-yard-2025-06-12" in line for line in lines)


def test_narrowing_names_the_largest_mean_share() -> None:
    # hand arithmetic: shares of source a 0.2 and 0.8, of b 0.8 and 0.2, of c 0 and 0.6 out of 1.6:
    # means a 0.5, b 0.5; with b raised to 0.9, 0.55 wins; its most is 0.9 of surface x
    budget = sample.tables()["budget"].iloc[:4].copy()
    budget["surface"] = ["lawn", "worn-asphalt", "lawn", "worn-asphalt"]
    budget["source"], budget["share"] = ["a", "a", "b", "b"], [0.2, 0.8, 0.9, 0.2]
    assert [plain(line) for line in sentences.narrowing(budget, sample.LABELS)] == [
        "Temperature, contact: the largest part of the variance is “b”, 55 % on average over the "
        "surfaces, most of all for Lawn (90 %)."]


def test_cautions_defer_and_lead_with_the_hottest_upper_end() -> None:
    lines = standing.cautions(sample.tables()["surfaces"], sample.LABELS)
    assert "59.6" in lines[0]  # 58.34 + 1.22
    assert "local codes and licensed practice" in lines[0]
    assert lines[-1].startswith("This report certifies nothing")
    assert len(standing.cautions(sample.empty_tables()["surfaces"])) == 2


def test_no_sentence_claims_more_than_was_measured() -> None:
    tables = sample.tables()
    lines = [*sentences.measured(tables, FACTS), *sentences.changed(tables["changes"], FACTS),
             *sentences.differs(tables["differences"], FACTS), *standing.reading(FACTS),
             *sentences.not_evaluated(tables), *sentences.narrowing(tables["budget"]),
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
    assert sentences.measured(tables, FACTS) == [
        "No surface at Mill Yard was surveyed on 24 July 2025."]
    assert sentences.differs(tables["differences"], FACTS) == []
    assert sentences.not_evaluated(tables) == []
    assert sentences.narrowing(tables["budget"]) == []
    bare = sentences.measured(sample.bare_tables(), FACTS)
    assert bare == ["1 surface at Mill Yard was visited on 24 July 2025, but no pass could be "
                    "matched with records."]
