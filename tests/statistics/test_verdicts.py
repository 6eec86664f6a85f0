"""Families of comparisons and the words they end with."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats
from statsmodels.stats.multitest import multipletests

from surveykit.statistics import verdicts

shares = st.lists(st.floats(0, 1), min_size=1, max_size=12)


def test_holm_worked_example():
    # computed by two scripts
    assert verdicts.holm([0.001, 0.012, 0.02, 0.03, 0.2, 0.6]) == pytest.approx(
        [0.006, 0.06, 0.08, 0.09, 0.4, 0.6])


@settings(max_examples=25, deadline=None)  # the other library takes 40 ms a call
@given(shares)
def test_holm_agrees_with_statsmodels(p):
    # independent library: statsmodels multipletests
    assert verdicts.holm(p) == pytest.approx(multipletests(p, method="holm")[1])


@given(shares, st.integers(0, 12))
def test_what_was_not_compared_does_not_count(p, place):
    place = min(place, len(p))
    adjusted = verdicts.holm(p[:place] + [np.nan] + p[place:])
    assert np.isnan(adjusted[place])
    assert np.delete(adjusted, place) == pytest.approx(verdicts.holm(p))


def test_empty_family():
    assert verdicts.holm([]).shape == (0,)


@pytest.mark.parametrize(("dof", "expected"), [(np.inf, 1.6), (4, 2.1)])
def test_could_have_missed(dof, expected):
    # computed by two scripts: u .566 K, 80 % power
    assert verdicts.could_have_missed(0.566, dof) == pytest.approx(expected, abs=0.05)


def test_could_have_missed_against_the_power_it_claims():
    # scipy's noncentral t: the customary sum of two quantiles, at 20 dof within a point of 80 %
    dof = 20
    shift = verdicts.could_have_missed(1.0, dof)
    edge = stats.t.ppf(0.975, dof)
    power = stats.nct.sf(edge, dof, shift) + stats.nct.cdf(-edge, dof, shift)
    assert power == pytest.approx(0.80, abs=0.01)


def test_could_have_missed_is_unknown_without_uncertainty():
    assert np.isnan(verdicts.could_have_missed(np.nan, 4))


@pytest.mark.parametrize(("value", "p", "word"), [
    (1.4, 0.01, "higher"), (-1.4, 0.01, "lower"),
    (1.0, 0.01, "higher"),                       # as large as what matters: it matters
    (0.4, 0.01, "higher, small"), (-0.4, 0.01, "lower, small"),
    (9.0, 0.06, "no difference shown"), (0.0, 1.0, "no difference shown"),
    (np.nan, 0.01, "not evaluated"), (1.4, np.nan, "not evaluated"),
])
def test_words(value, p, word):
    # the closed list of words, a relevant difference of 1
    assert verdicts.verdict(value, p, 1.0) == word


@given(st.floats(-5, 5), st.floats(0, 1), st.floats(0, 3))
def test_exchanging_the_two_sides_exchanges_the_words(value, p, relevant):
    word = verdicts.verdict(value, p, relevant)
    other = verdicts.verdict(-value, p, relevant)
    if value != 0:
        swapped = word.replace("higher", "?").replace("lower", "higher").replace("?", "lower")
        assert other == swapped


def test_refusals():
    for p in ([-0.1], [1.2], [[0.1]]):
        with pytest.raises(ValueError, match="holm needs"):
            verdicts.holm(p)
    for relevant in (-1.0, np.nan):
        with pytest.raises(ValueError, match="relevant"):
            verdicts.verdict(1.0, 0.01, relevant)
