"""Rounding and wording of numbers. Expected texts are hand arithmetic under the page rule:
temperature to 0.1, albedo and NDVI to 0.001; U never prints as zero (common practice, no source);
both ends where the arms of an interval differ by more than a fifth."""

from __future__ import annotations

import math
import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from surveykit.report import wording as w
from surveykit.report.typeset import typeset

NAN = float("nan")


def plain(text: str) -> str:
    return text.replace(w.NO_BREAK, " ").replace(w.NARROW_SPACE, " ")


@pytest.mark.parametrize(("value", "half", "decimals", "expected"), [
    (41.688, 2.115, 1, "41.7 ± 2.1"), (0.30049, 0.0094, 3, "0.300 ± 0.009"),
    (-0.04, 0.26, 1, "0.0 ± 0.3"), (-3.26, 0.61, 1, "−3.3 ± 0.6"),
    (40.0, 0.004, 1, "40.0 ± 0.1"), (0.7812, 0.00001, 3, "0.781 ± 0.001")])
def test_value_and_u_take_the_page_rule(
        value: float, half: float, decimals: int, expected: str) -> None:
    assert plain(w.interval(value, value - half, value + half, decimals)) == expected


def test_arms_that_differ_by_more_than_a_fifth_print_both_ends() -> None:
    # arms 1.0 and 1.24: ratio 0.806, still U; 1.0 and 1.26: ratio 0.794, both ends
    assert plain(w.interval(40.0, 39.0, 41.24, 1)) == "40.0 ± 1.1"
    assert plain(w.interval(40.0, 39.0, 41.26, 1)) == "40.0 (39.0 to 41.3)"


def test_missing_numbers_leave_no_word_behind() -> None:
    assert w.interval(NAN, NAN, NAN, 1) == w.number(NAN, 1) == w.expanded(NAN, 1) == ""
    assert w.interval(36.48, NAN, NAN, 1) == "36.5"
    assert w.percent(NAN) == w.figures(NAN) == w.probability(NAN) == w.with_unit("", "degC") == ""
    assert w.number(math.inf, 0) == "∞"


@given(st.floats(-1e4, 1e4), st.floats(1e-6, 1e3), st.sampled_from([1, 3]))
def test_a_printed_interval_keeps_its_form(value: float, half: float, decimals: int) -> None:
    text = plain(w.interval(value, value - half, value + half, decimals))
    number = rf"\d+\.\d{{{decimals}}}"
    assert re.fullmatch(rf"−?{number} (± {number}|\(−?{number} to −?{number}\))", text)
    assert "-" not in text
    assert not re.match(r"−0\.0+ ", text)
    assert not re.search(r"± 0\.0+$", text)


def test_a_number_keeps_its_unit_on_the_line() -> None:
    gap = w.NO_BREAK
    assert typeset("air 21 degC, light 686 to 810 W m-2, wind 2.7 m s-1, u 2 s") == (
        f"air 21{gap}°C, light 686 to 810{gap}W{gap}m⁻², wind 2.7{gap}m{gap}s⁻¹, u 2{gap}s")
    assert typeset("5 surfaces, 14 min-max pairs, 3 K-types") == (
        "5 surfaces, 14 min-max pairs, 3 K-types")


def test_counts_units_dates() -> None:
    assert plain(w.count(2_418_337)) == "2 418 337"
    assert plain(w.with_unit("3.3", "W m-2")) == "3.3 W m⁻²"
    assert w.date_text("2025-02-01") == "1 February 2025"
    assert w.date_text("some day") == "some day"
    assert w.plural(1, "patch", "patches") == "1 patch"
