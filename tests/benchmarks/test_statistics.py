"""Bootstrap and Monte Carlo: the same numbers as the plain way, at a fraction of its time."""

from __future__ import annotations

import sys
import tracemalloc
from pathlib import Path
from time import perf_counter

import numpy as np
import pytest
from arch.bootstrap import StationaryBootstrap, optimal_block_length

sys.path.insert(0, str(Path(__file__).parents[1] / "evidence"))

from pass_values import error, ndvi, one_pass

from surveykit.evidence import models
from surveykit.evidence.moving import Moves
from surveykit.statistics.bootstrap import stationary_u
from surveykit.statistics.draws import Draws


def timed(action):
    start = perf_counter()
    made = action()
    return perf_counter() - start, made


@pytest.mark.slow
def test_bootstrap_error_costs_a_seventh_of_resampling():
    """n 3600, AR(1) phi .8; arch with its automatic block and 1,000 resamples; at most .15."""
    rng = np.random.default_rng(1)
    x = np.zeros(3600)
    for i in range(1, 3600):
        x[i] = 0.8 * x[i - 1] + rng.standard_normal()
    block = float(optimal_block_length(x)["stationary"].iloc[0])
    pairs = [(timed(lambda: stationary_u(x)), timed(lambda: float(StationaryBootstrap(
        block, x, seed=np.random.default_rng(2)).apply(np.mean, 1000).std()))) for _ in range(5)]
    ratio = np.median([a[0] for a, _ in pairs]) / np.median([b[0] for _, b in pairs])
    assert pairs[0][0][1] == pytest.approx(pairs[0][1][1], rel=0.06)
    assert ratio <= 0.15, f"{ratio:.3f} of arch"


@pytest.mark.slow
def test_monte_carlo_of_sixty_passes_costs_a_fifth_of_the_loop():
    """60 passes, 20 shared inputs, 20,000 draws, against 200 draws of the loop a hundredfold."""
    names = [f"{band}_{way}_{what}" for band in ("red", "nir") for way in ("up", "down")
             for what in ("gain_error", "zero_error")]
    names += [f"switched_off_{number}_left" for number in range(12)]
    assert len(names) == 20
    shared = [error(name, 0.01, name) for name in names]
    passes = [one_pass(ndvi(0.1 + 0.001 * i, 0.4, *shared), quantity="ndvi", n=i)
              for i in range(60)]
    weights = np.full(60, 1 / 60)

    def ours():
        return Moves("yard", passes).systematic(weights, Draws(20251, 20000))

    draws = Draws(20251, 20000)
    vectors = {i.scope: i.u * draws.standard(i.scope) for i in shared}

    def loop():
        out = []
        for m in range(200):
            total = 0.0
            for w, p in zip(weights, passes, strict=True):
                x = {i.name: i.value + (vectors[i.scope][m] if i.u else 0.0) for i in p.inputs}
                total += w * float(models.MODELS["ndvi"](x))
            out.append(total)
        return np.array(out)

    made = ours()
    plain = loop()
    centre = sum(w * p.value for w, p in zip(weights, passes, strict=True))
    assert made[:200] - made[:200].mean() == pytest.approx(
        plain - centre - (plain - centre).mean(), abs=1e-3 * made.std())
    times = [(timed(ours)[0], 100 * timed(loop)[0]) for _ in range(3)]
    ratio = np.median([a for a, _ in times]) / np.median([b for _, b in times])
    tracemalloc.start()
    ours()
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert ratio <= 0.2, f"{ratio:.3f} of the loop"
    assert peak <= 150e6
