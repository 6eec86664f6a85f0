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
    "higher": "Coated court is 7.9 ± 1.6 K higher than Worn asphalt",
    "lower": "Coated court is 7.9 ± 1.6 K lower than Worn asphalt",
    "higher, small": "Coated court is 7.9 ± 1.6 K higher than Worn asphalt, less than the "
                     "relevant 1.0 K",
    "lower, small": "Coated court is 7.9 ± 1.6 K lower than Worn asphalt, less than the "
                    "relevant 1.0 K",
    "equivalent": "Coated court and Worn asphalt are equivalent within ±1.0 K",
    "no difference shown": "no difference is shown between Coated court and Worn asphalt (could "
                           "have missed up to 2.2 K)",
}
SINCE = "12 June 2025"
WHAT, CONTROL = "temperature (contact)", "than the control, Worn asphalt, leads to expect"
CHANGES = {
    "higher": f"{WHAT} is 7.9 ± 1.6 K higher {CONTROL}",
    "lower": f"{WHAT} is 7.9 ± 1.6 K lower {CONTROL}",
    "higher, small": f"{WHAT} is 7.9 ± 1.6 K higher {CONTROL}, less than the relevant 1.0 K",
    "lower, small": f"{WHAT} is 7.9 ± 1.6 K lower {CONTROL}, less than the relevant 1.0 K",
}


def plain(text: str) -> str:
    return text.replace(NO_BREAK, " ")


@pytest.mark.parametrize("verdict", PAIRS)
def test_each_verdict_on_a_pair_is_a_sentence(verdict: str) -> None:
    row = {**ROW, "verdict": verdict, "difference": -7.94}
    assert plain(sentences.pair_part(row, FACTS)) == PAIRS[verdict]


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
    assert sentences.pair_part(row, facts) == (
        "Coated court and Worn asphalt are equivalent within the relevant change")


def test_the_abstract_says_in_a_line_each_what_a_reader_asks_first() -> None:
    lines = [plain(line) for line in sentences.abstract(sample.tables(), FACTS)]
    assert [line.partition(":")[0] for line in lines] == [
        "Surveyed", "Found, value ± U (95 %)", "Changed", "To do next"]
    assert lines[0] == (
        "Surveyed: temperature (contact), temperature (stand-off), albedo (clear) and NDVI of "
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


def test_nothing_is_called_unchanged_where_nothing_could_be_judged() -> None:
    tables = sample.tables()
    changes = tables["changes"].assign(verdict="not comparable")
    lines = sentences.abstract({**tables, "changes": changes}, FACTS)
    assert "Changed: no change could be judged." in lines


def test_without_any_value_the_abstract_points_to_the_reasons() -> None:
    tables = sample.tables()
    gone = {**tables, "surfaces": tables["surfaces"].assign(
        value=math.nan, lower=math.nan, upper=math.nan, status="not evaluated")}
    assert sentences.abstract(gone, FACTS)[-1] == (
        "To do next: see below what could not be evaluated, and why.")


def test_reasons_tell_names_by_their_labels() -> None:
    tables = sample.tables()
    note = f"coated-court: the sky differs: clear now, overcast on {sample.EARLIER}"
    told = "Coated court: the sky differs: clear now, overcast on 12 June 2025"
    rows = tables["changes"].iloc[[0]]
    barred = rows.assign(verdict="not comparable", note=note)
    lines = sentences.not_evaluated({**sample.empty_tables(), "changes": barred}, FACTS["labels"])
    assert lines == [f"{told}: temperature (contact) of Coated court is not comparable with "
                     "12 June 2025."]
    shown = sentences.changed(rows.assign(verdict="lower", note=note), FACTS)
    assert shown[0].endswith(f"Conditions partly matched: {told}.")


def test_flags_are_counted_by_passes_and_alike_ones_told_once() -> None:
    passes = sample.tables()["passes"].iloc[:3].assign(quantity="ndvi", kind="", flags=[
        "edge disagrees (stop +18 s); edge disagrees (stop -3 s)", "edge disagrees (stop -7 s)",
        "no swap"])
    assert sentences.flagged(passes) == [
        "NDVI: edge disagrees (stop +18 s) and the like (2 of 3 passes); no swap (1 of 3 passes)."]


def test_not_evaluated_is_gathered_by_reason() -> None:
    lines = sentences.not_evaluated(sample.tables(), FACTS["labels"])
    assert lines[0] == (
        "No contact dwell settled for 3 s: temperature (contact) of Lawn was not evaluated; the "
        "temperature (contact) differences of 3 pairs were not evaluated; temperature (contact) of "
        "Lawn was not evaluated against 12 June 2025.")
    assert any(line.startswith("The control was 5.2 K above the air") and
               "is not comparable with 12 June 2025" in line for line in lines)


def test_cautions_defer_and_lead_with_the_hottest_upper_end() -> None:
    lines = standing.cautions(sample.tables()["surfaces"], sample.LABELS)
    assert "59.6" in lines[0]  # 58.34 + 1.22
    assert "local codes and licensed practice" in lines[0]
    assert lines[-1].startswith("This report certifies nothing")
    assert len(standing.cautions(sample.empty_tables()["surfaces"])) == 2


def test_no_sentence_claims_more_than_was_measured() -> None:
    tables = sample.tables()
    lines = [*sentences.abstract(tables, FACTS), *sentences.changed(tables["changes"], FACTS),
             *sentences.differs(tables["differences"], FACTS), *standing.reading(FACTS, tables),
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


def test_the_draws_own_error_is_told_of_the_worst_interval():
    """Hand arithmetic: .03 of a half-width of 1.2 is 2.5 %, .002 and .01 of others are less."""
    made = {name: frame.copy() for name, frame in sample.tables().items()}
    for name in ("surfaces", "differences", "changes"):
        made[name]["end_error"] = 0.0
    made["changes"].loc[0, ["lower", "upper", "end_error"]] = -0.2, 2.2, 0.03
    made["surfaces"].loc[0, ["lower", "upper", "end_error"]] = 10.0, 14.0, 0.01
    assert "a standard error of at most 2 % of U." in told(made)
    bare = {name: frame.iloc[:0] for name, frame in made.items()}
    assert "standard error" not in told(bare)


def told(tables):
    return " ".join(standing.reading(FACTS, tables)).replace("\N{NO-BREAK SPACE}", " ").replace(
        "\N{NARROW NO-BREAK SPACE}", " ")
