"""Draws keyed by scope, and results combined from them."""

from __future__ import annotations

import numpy as np
import pytest
from checks import check
from hypothesis import given
from hypothesis import strategies as st
from scipy import integrate, stats

from surveykit.statistics import streams
from surveykit.statistics.draws import Draws, Result, Sampling, combine, observed, summarise

M = 20_000
DRAWS = Draws(20251, M)
scopes = st.text(max_size=12)


def flat(value: float, *sampling: Sampling) -> Result:
    return observed(value, np.full(M, value), sampling, DRAWS)


def difference(a, b):
    return a - b


# ---- the streams

@given(scopes, st.integers(0, 2**32))
def test_same_scope_and_seed_give_the_same_vector(scope, seed):
    first, second = Draws(seed, 50), Draws(seed, 50)
    second.standard("called before")
    assert np.array_equal(first.standard(scope), second.standard(scope))
    assert np.array_equal(first.student(scope, 3), second.student(scope, 3))
    assert not np.array_equal(first.standard(scope), Draws(seed + 1, 50).standard(scope))
    assert not np.array_equal(first.standard(scope), first.standard(scope + "x"))


def test_other_scopes_are_independent():
    vectors = [DRAWS.standard(f"scope {i}") for i in range(12)]
    vectors += [DRAWS.student(f"scope {i}", np.inf) for i in range(12)]
    between = np.corrcoef(vectors)[~np.eye(24, dtype=bool)]
    assert np.abs(between).max() < 4.5 / np.sqrt(M)


def test_normal_and_rectangular_follow_their_laws():
    # scipy's laws; the two vectors of a scope are one, rank by rank
    normal = DRAWS.standard("sky")
    flat_ = DRAWS.standard("sky", "rectangular")
    assert stats.kstest(normal, "norm").statistic < 1e-3
    assert stats.kstest(flat_, "uniform", (-np.sqrt(3), 2 * np.sqrt(3))).statistic < 1e-3
    assert flat_ == pytest.approx(np.sqrt(3) * (2 * stats.norm.cdf(normal) - 1), abs=1e-12)
    assert [normal.std(), flat_.std()] == pytest.approx([1, 1], abs=2e-3)


@pytest.mark.parametrize("dof", [1, 2, 3, 4.5, 30, np.inf])
def test_student_quantiles(dof):
    # scipy.stats.t
    shares = [0.005, 0.025, 0.25, 0.5, 0.8, 0.975, 0.995]
    ours = np.quantile(DRAWS.student("lawn", dof), shares)
    assert ours == pytest.approx(stats.t.ppf(shares, dof), rel=0.02, abs=1e-3)


def test_vectors_let_go_come_back_the_same(monkeypatch):
    monkeypatch.setattr(streams, "HELD_BYTES", 3 * 8 * 100)
    monkeypatch.setattr(streams, "_held", {})
    draws = Draws(1, 100)
    first = draws.standard("a").copy()
    for name in "bcdefg":
        draws.standard(name)
    assert len(streams._held) <= 3
    assert np.array_equal(draws.standard("a"), first)


def test_vectors_cannot_be_changed_by_who_borrows_them():
    with pytest.raises(ValueError, match="read-only"):
        DRAWS.standard("sky")[0] = 0


# ---- published cases

@pytest.mark.parametrize("name", ["jcgm101_9_4_0", "jcgm101_9_4_0.01"])
def test_jcgm_101_clause_9_4(name):
    # JCGM 101:2008, 9.4 (mass comparison, x1^2 + x2^2): where first order fails, draws hold
    given_, expected, _, _ = check(name)
    u = given_["u"]
    x1, x2 = (observed(x, x + u * DRAWS.standard(scope), (), DRAWS)
              for x, scope in [(given_["x1"], "x1"), (0.0, "x2")])
    result = combine(lambda a, b: a**2 + b**2, x1, x2)
    assert result.total.mean() * 1e6 == pytest.approx(expected["y_e-6"], rel=0.01)
    assert summarise(result, 0.95).u * 1e6 == pytest.approx(expected["u_e-6"], rel=0.02)
    assert result.value * 1e6 == pytest.approx(expected["first_order_y_e-6"])


def test_gum_h_1_effective_degrees_of_freedom():
    # JCGM 100:2008, H.1 (from memory): 32 nm, 16 degrees of freedom (16.7 cut), U99 = 93 nm
    given_, expected, tol, _ = check("gum_h1")
    terms = [flat(0.0, Sampling(f"component {i}", se, dof))
             for i, (se, dof) in enumerate(zip(given_["components_nm"], given_["dof"],
                                               strict=True))]
    summary = summarise(combine(lambda *parts: sum(parts), *terms), 0.99)
    assert summary.u == pytest.approx(expected["uc"], abs=tol)
    assert summary.dof == pytest.approx(expected["veff"], abs=tol)
    u99 = stats.t.ppf(0.995, int(summary.dof)) * summary.u
    assert u99 == pytest.approx(expected["U99"], abs=tol)
    # The draws keep the long tail of the component with 2 degrees of freedom (JCGM 101, 6.4.9).
    assert (summary.upper - summary.lower) / 2 > u99


def impedance() -> dict[str, Result]:
    """Return R, X and Z of GUM H.2, the means' correlation carried by three scopes."""
    given_ = check("gum_h2").input
    means = [np.mean(given_[name]) for name in ("V", "I", "phi")]
    root = np.linalg.cholesky(np.cov([given_[name] for name in ("V", "I", "phi")]) / 5)
    scopes_ = ("first", "second", "third")
    inputs = [flat(mean, *(Sampling(scope, se, np.inf)
                           for scope, se in zip(scopes_, row, strict=True)))
              for mean, row in zip(means, root, strict=True)]
    return {"R": combine(lambda v, i, phi: v / i * np.cos(phi), *inputs),
            "X": combine(lambda v, i, phi: v / i * np.sin(phi), *inputs),
            "Z": combine(lambda v, i, phi: v / i, *inputs)}


def test_gum_h_2_correlated_inputs():
    # JCGM 100:2008, H.2 (from memory): R, X, Z with u and their correlations
    _, expected, tol, _ = check("gum_h2")
    results = impedance()
    se = {name: np.array([term.se for term in result.sampling])
          for name, result in results.items()}
    for name, result in results.items():
        assert result.value == pytest.approx(expected[name], abs=tol)
        assert summarise(result, 0.95).u == pytest.approx(expected[f"u{name}"], abs=tol)
        assert result.total.std() == pytest.approx(expected[f"u{name}"], rel=0.02)
    for pair in ("RX", "RZ", "XZ"):
        a, b = se[pair[0]], se[pair[1]]
        by_terms = a @ b / np.sqrt(a @ a * (b @ b))
        by_draws = np.corrcoef(results[pair[0]].total, results[pair[1]].total)[0, 1]
        assert by_terms == pytest.approx(expected[f"r{pair}"], abs=tol)
        assert by_draws == pytest.approx(expected[f"r{pair}"], abs=0.02)


def test_gum_h_2_modulus_is_made_of_its_parts():
    # identity: Z^2 = R^2 + X^2, so the difference has no uncertainty at all
    results = impedance()
    nothing = combine(lambda r, x, z: np.hypot(r, x) - z, *results.values())
    assert nothing.value == pytest.approx(0, abs=1e-10)
    assert summarise(nothing, 0.95).u == pytest.approx(0, abs=1e-7)
    assert np.abs(nothing.total).max() < 1e-10


# ---- shared errors

@pytest.mark.parametrize(("second_gain", "u"), [("gain", 0.00825), ("other gain", 0.01105)])
def test_difference_of_albedos_under_a_common_gain(second_gain, u):
    # by hand: sqrt((.2 x .03)^2 + 2 x .004^2) shared; sqrt((.3 x .03)^2 + (.1 x .03)^2 +
    # 2 x .004^2) with two gains
    bright, dark = (
        observed(albedo, albedo * (1 + 0.03 * DRAWS.standard(gain)),
                 (Sampling(f"patch {albedo}", 0.004, np.inf),), DRAWS)
        for albedo, gain in [(0.30, "gain"), (0.10, second_gain)])
    result = combine(difference, bright, dark)
    summary = summarise(result, 0.95)
    assert summary.value == pytest.approx(0.20)
    assert summary.u == pytest.approx(u, rel=0.01)
    assert result.total.std() == pytest.approx(u, rel=0.02)
    assert summary.k == pytest.approx(1.96, rel=0.02)
    assert summary.dof == np.inf


def test_ratio_of_albedos_under_a_common_gain():
    # by hand: the gain cancels, sqrt((.004/.30)^2 + (.004/.10)^2) = .0422 relative
    bright, dark = (observed(a, a * (1 + 0.03 * DRAWS.standard("gain")),
                             (Sampling(f"patch {a}", 0.004, np.inf),), DRAWS) for a in (0.3, 0.1))
    summary = summarise(combine(lambda a, b: a / b, bright, dark), 0.95)
    assert summary.u / summary.value == pytest.approx(0.0422, abs=5e-5)


@given(st.floats(-50, 50), st.floats(0, 5), st.floats(-20, 20))
def test_what_is_shared_cancels_exactly(value, u, apart):
    # property: two results with the same scopes differ by a constant
    error = u * DRAWS.standard("calibration")
    pair = [observed(v, v + error, (Sampling("control", 0.4, 2),), DRAWS)
            for v in (value, value + apart)]
    summary = summarise(combine(difference, *pair), 0.95)
    assert summary.u == pytest.approx(0, abs=1e-9)
    assert [summary.lower, summary.upper] == pytest.approx([-apart] * 2, abs=1e-9)
    assert summary.dof == np.inf or summary.u < 1e-9


def test_signs_of_sampling_survive_a_chain():
    a, b = flat(3.0, Sampling("a", 0.3, 3)), flat(2.0, Sampling("b", 0.4, 4))
    back = combine(lambda x, y: x + y, combine(difference, a, b), b)
    terms = {term.scope: term.se for term in back.sampling}
    assert terms["a"] == pytest.approx(0.3)
    assert terms["b"] == pytest.approx(0, abs=1e-9)
    assert back.total == pytest.approx(a.total)


@pytest.mark.parametrize(("n", "spread"), [((3, 4), (1.0, 2.0)), ((8, 8), (0.4, 0.5)),
                                           ((2, 9), (3.0, 0.2)), ((2, 2), (1.0, 1.0))])
def test_two_means_have_the_interval_of_welch(n, spread):
    # scipy.stats.ttest_ind(equal_var=False).confidence_interval
    rng = np.random.default_rng([*n])
    some = [scale * rng.standard_normal(count) for count, scale in zip(n, spread, strict=True)]
    means = [flat(float(y.mean()), Sampling(f"mean {i}", y.std(ddof=1) / np.sqrt(y.size),
                                            y.size - 1)) for i, y in enumerate(some)]
    summary = summarise(combine(difference, *means), 0.95)
    expected = stats.ttest_ind(*some, equal_var=False)
    wide = expected.confidence_interval(0.95)
    half = (wide.high - wide.low) / 2
    assert [summary.lower, summary.upper] == pytest.approx([wide.low, wide.high], abs=0.02 * half)
    assert summary.dof == pytest.approx(expected.df)


def test_four_means_of_eight_hold_the_truth_as_often_as_they_say():
    """A double difference: plain sums of t draws held it in 97.2 %."""
    rng = np.random.default_rng(3)
    draws, hits, plain, n = Draws(1, 4000), 0, 0, 3000
    for _ in range(n):
        values = rng.standard_normal((4, 8))
        means = [observed(float(y.mean()), np.full(4000, y.mean()), (
            Sampling(str(i), float(y.std(ddof=1) / np.sqrt(8)), 7),), draws)
            for i, y in enumerate(values)]
        made = combine(lambda a, b, c, d: a - b - c + d, *means)
        summary = summarise(made, 0.95)
        hits += summary.lower <= 0 <= summary.upper
        low, high = np.quantile(made.total, [0.025, 0.975])
        plain += low <= 0 <= high
    three = 3 * np.sqrt(0.95 * 0.05 / n)
    assert 0.95 - three < hits / n < 0.95 + three < plain / n


# ---- what is reported

def test_two_passes_stay_finite_and_wide():
    # t with 1 degree of freedom: 12.706 (any t table); u is the standard error, not an sd of t
    summary = summarise(flat(20.0, Sampling("patch", 0.5, 1)), 0.95)
    assert summary.u == pytest.approx(0.5)
    assert summary.dof == pytest.approx(1)
    assert summary.k == pytest.approx(12.706, rel=0.01)
    assert (summary.lower + summary.upper) / 2 == pytest.approx(20.0, abs=0.1)
    assert summary.p_two_sided == pytest.approx(2 * stats.t.sf(40.0, 1), rel=0.01)


def test_systematic_and_sampling_add_in_quadrature():
    # by hand: sqrt(.3^2 + .4^2) = .5; dof = .5^4 / (.4^4 / 3) = 7.324
    result = observed(1.2, 1.2 + 0.3 * DRAWS.standard("cal"), (Sampling("p", 0.4, 3),), DRAWS)
    summary = summarise(result, 0.95)
    assert summary.u == pytest.approx(0.5, rel=2e-3)
    assert summary.dof == pytest.approx(7.324, rel=5e-3)
    # the sum of both laws by quadrature (computed); t with 7.324 degrees of freedom says .046
    beyond = integrate.quad(lambda z: stats.norm.pdf(z) * (
        stats.t.sf((1.2 - 0.3 * z) / 0.4, 3) + stats.t.cdf((-1.2 - 0.3 * z) / 0.4, 3)), -8, 8)[0]
    assert beyond > 2 * stats.t.sf(2.4, 7.324)
    assert summary.p_two_sided == pytest.approx(beyond, rel=0.05)


@given(st.floats(-1000, 1000))
def test_a_constant_moves_value_and_interval_alone(offset):
    here = flat(20.0, Sampling("patch", 0.5, 3))
    there = combine(lambda x: x + offset, here)
    a, b = summarise(here, 0.95), summarise(there, 0.95)
    assert [b.value, b.lower, b.upper] == pytest.approx([a.value + offset, a.lower + offset,
                                                         a.upper + offset])
    assert b.u == pytest.approx(a.u, rel=1e-6)


def test_nothing_uncertain():
    assert summarise(flat(0.0), 0.95).p_two_sided == 1
    certain = summarise(flat(2.0), 0.95)
    assert (certain.u, certain.lower, certain.upper, certain.p_two_sided) == (0, 2, 2, 0)
    assert np.isnan(certain.k)


def test_refusals():
    with pytest.raises(ValueError, match="at least 2"):
        Draws(1, 1)
    with pytest.raises(ValueError, match="normal or rectangular"):
        DRAWS.standard("x", "triangular")
    for dof in (0, np.nan, -1):
        with pytest.raises(ValueError, match="dof > 0"):
            DRAWS.student("x", dof)
        with pytest.raises(ValueError, match="dof > 0"):
            Sampling("x", 0.1, dof)
    with pytest.raises(ValueError, match="finite se"):
        Sampling("x", np.nan, 3)
    with pytest.raises(ValueError, match="needs 20000 draws"):
        observed(1.0, np.ones(3), (), DRAWS)
    with pytest.raises(ValueError, match="one length"):
        Result(1.0, np.ones(3), np.ones(4))
    with pytest.raises(ValueError, match="3 and with 4 degrees"):
        combine(difference, flat(1.0, Sampling("x", 1, 3)), flat(1.0, Sampling("x", 1, 4)))
    with pytest.raises(ValueError, match="coverage"):
        summarise(flat(1.0), 95)
