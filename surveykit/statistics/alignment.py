"""Two clocks brought together by events: edges of a cover, the line through them.

Times are seconds from an origin of the caller's choice; sizes stay small enough for float64.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from surveykit.core import FloatArray

MAX_GAP = 2.5  # steps: what lies further apart is not joined
FLAT = 1e-12


class Cover(NamedTuple):
    """One stretch under cover: when it began and ended [s], the steps there [s], its clearness.

    `contrast` is the smaller of the two changes of level, in robust standard deviations.
    """

    start_s: float
    stop_s: float
    start_step_s: float
    stop_step_s: float
    contrast: float


class Line(NamedTuple):
    """offset + slope (t - origin), with the variances of both; they are uncorrelated."""

    origin_s: float
    offset_s: float
    slope: float
    var_offset: float
    var_slope: float

    def at(self, time_s: FloatArray | float) -> FloatArray:
        """Return the line's value [s] at times [s]."""
        return self.offset_s + self.slope * (np.asarray(time_s, float) - self.origin_s)

    def u(self, time_s: FloatArray | float) -> FloatArray:
        """Return the standard uncertainty [s] of the line's value at times [s]."""
        away = np.asarray(time_s, float) - self.origin_s
        return np.sqrt(self.var_offset + self.var_slope * away**2)


def edge_u_s(step_s: float, other_step_s: float) -> float:
    """Return the standard uncertainty [s] of the difference of one edge seen by two loggers.

    Each sees the edge somewhere within its own step: step/sqrt(12) each.

    Examples
    --------
    >>> print(f"{edge_u_s(1.0, 1.0):.2f} {edge_u_s(0.2, 0.2):.3f} {edge_u_s(0.1, 0.1):.3f}")
    0.41 0.082 0.041
    """
    return float(np.hypot(step_s, other_step_s) / np.sqrt(12.0))


def find_covers(time_s: FloatArray, values: FloatArray, width_s: float, *, dark: bool,
                min_contrast: float) -> list[Cover]:
    """Return the stretches of about `width_s` under cover, clearest first.

    The level under a cover differs from the levels before and after it to the same side; each
    edge is where the signal crosses half height between the level outside and that under cover.

    Parameters
    ----------
    time_s, values : ndarray, shape (n,)
        Times [s], ascending, and readings; NaN readings are left out.
    width_s : float
        How long the head was covered, to within a third.
    dark : bool
        Whether the reading falls under a cover; else it may go either way.
    min_contrast : float
        Least change of level in robust standard deviations of the readings outside.

    Returns
    -------
    list of Cover
        Those at least half as clear as the clearest; none where a gap hides an edge.
    """
    good = np.isfinite(values)
    time_s, values = np.asarray(time_s, float)[good], np.asarray(values, float)[good]
    if time_s.size < 8:
        return []
    step_s = float(np.median(np.diff(time_s)))
    total = np.concatenate([[0.0], np.cumsum(values)])

    def level(start: FloatArray, stop: FloatArray) -> FloatArray:
        first, last = np.searchsorted(time_s, start), np.searchsorted(time_s, stop)
        with np.errstate(invalid="ignore", divide="ignore"):
            return np.where(last > first, (total[last] - total[first]) / (last - first), np.nan)

    guard = min(width_s / 4, 1.5 * step_s)
    under = level(time_s + guard, time_s + width_s - guard)
    before = level(time_s - guard - width_s, time_s - guard) - under
    after = level(time_s + width_s + guard, time_s + 2 * width_s + guard) - under
    clear = np.where(np.sign(before) == np.sign(after),
                     np.minimum(np.abs(before), np.abs(after)), 0.0)
    clear = np.where(np.isfinite(clear) & ((before > 0) | (not dark)), clear, 0.0)
    noise = max(float(np.median(np.abs(np.diff(values)))) * 1.4826 / np.sqrt(2), FLAT)
    found: list[Cover] = []
    enough = max(float(clear.max()) / 2, min_contrast * noise)
    while clear.max() >= enough and len(found) < 20:
        k = int(np.argmax(clear))
        middle = time_s[k] + width_s / 2
        start, stop = (_crossing(time_s, values, middle, float(under[k] + step / 2), way, width_s)
                       for step, way in ((before[k], -1), (after[k], 1)))
        if start is not None and stop is not None and max(start[1], stop[1]) <= MAX_GAP * step_s:
            found.append(Cover(start[0], stop[0], start[1], stop[1], float(clear[k] / noise)))
        clear[np.abs(time_s - time_s[k]) < width_s] = 0.0
    return found


def _crossing(time_s: FloatArray, values: FloatArray, middle_s: float, half: float, way: int,
              reach_s: float) -> tuple[float, float] | None:
    """Return where the signal crosses `half` nearest to the middle of a cover, and the step."""
    k = int(np.clip(np.searchsorted(time_s, middle_s), 1, time_s.size - 1))
    inside = values[k] > half
    while 0 <= k < time_s.size and (values[k] > half) == inside:
        if abs(time_s[k] - middle_s) > reach_s:
            return None
        k += way
    if not 0 <= k < time_s.size:
        return None
    near, far = k - way, k
    share = (half - values[near]) / (values[far] - values[near])
    return (float(time_s[near] + share * (time_s[far] - time_s[near])),
            float(abs(time_s[far] - time_s[near])))


def fit_line(time_s: FloatArray, offset_s: FloatArray, u_s: FloatArray, *,
             max_slope: float) -> Line:
    """Return the weighted least-squares line through events.

    Where the events lie too close together to tell a slope (its u above `max_slope`), none is
    fitted: 0 is taken with the u of a rectangular distribution of that half-width.

    Parameters
    ----------
    time_s, offset_s, u_s : ndarray, shape (n,)
        Time of each event, offset found there, standard uncertainty, all [s].
    max_slope : float
        Largest credible slope [1].

    Examples
    --------
    Events at 0 and 8 h, two edges 10 s apart, at 5 Hz: u .058, .041, .058 s at 0, 4, 8 h.

    >>> time_s = np.array([0.0, 10.0, 28800.0, 28810.0])
    >>> line = fit_line(time_s, np.zeros(4), np.full(4, edge_u_s(0.2, 0.2)), max_slope=2e-4)
    >>> print(np.round(line.u([0.0, 14400.0, 28800.0]), 3), f"{1e6 * line.var_slope**0.5:.1f}")
    [0.058 0.041 0.058] 2.8
    """
    weight = 1 / np.asarray(u_s, float) ** 2
    origin = float(weight @ time_s / weight.sum())
    away = np.asarray(time_s, float) - origin
    offset = float(weight @ offset_s / weight.sum())
    spread = float(weight @ away**2)
    if spread * max_slope**2 < 1.0:
        return Line(origin, offset, 0.0, float(1 / weight.sum()), max_slope**2 / 3)
    return Line(origin, offset, float(weight @ (away * offset_s) / spread),
                float(1 / weight.sum()), 1 / spread)


def robust_line(time_s: FloatArray, offset_s: FloatArray, slope: float | None) -> FloatArray:
    """Return at each event the value of the line of median slope (Theil-Sen), or of `slope`.

    References
    ----------
    P. K. Sen, J. Am. Stat. Assoc. 63 (1968) 1379-1389 (from memory); scipy.stats.theilslopes.
    """
    if slope is None:
        # As scipy.stats.theilslopes, whose import takes longer than all the rest of `check`.
        one, two = np.triu_indices(len(time_s), 1)
        run_s = time_s[two] - time_s[one]
        slope = float(np.median((offset_s[two] - offset_s[one])[run_s != 0] / run_s[run_s != 0]))
    return np.median(offset_s - slope * time_s) + slope * time_s


def change_point(values: FloatArray, *, min_side: int, min_contrast: float) -> int | None:
    """Return where the level of a series changes most clearly, or None where it does not.

    The split into two means that leaves the least sum of squares (one step of binary
    segmentation, the CUSUM split); the means must lie `min_contrast` pooled standard deviations
    apart.

    References
    ----------
    E. S. Page, Continuous inspection schemes, Biometrika 41 (1954) 100-115 (from memory).

    Examples
    --------
    >>> change_point(np.r_[np.zeros(20), np.ones(30)] + 0.01 * np.arange(50) % 0.05,
    ...              min_side=5, min_contrast=5.0)
    20
    """
    n = values.size
    if n < 2 * min_side:
        return None
    total, square = np.cumsum(values), np.cumsum(values**2)
    k = np.arange(min_side, n - min_side + 1)
    left, right = total[k - 1] / k, (total[-1] - total[k - 1]) / (n - k)
    rest = square[-1] - k * left**2 - (n - k) * right**2
    best = int(np.argmin(rest))
    spread = np.sqrt(max(rest[best], 0.0) / max(n - 2, 1))
    return int(k[best]) if abs(right[best] - left[best]) > max(min_contrast * spread, FLAT) \
        else None
