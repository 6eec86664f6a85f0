"""Two clocks brought together by what both loggers saw: the lag of a common signal."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.fft import irfft, rfft

from surveykit.core import FloatArray

MAX_GAP = 2.5  # steps: what lies further apart is not joined
CLIP = 10.0  # robust standard deviations of a difference; beyond, a cap or a spike
ASIDE = 3  # samples on either side of a peak that belong to it
FLAT = 1e-9
LEAST_OVERLAP = 0.5  # of the shorter signal: a lag with less is not looked at


class Lag(NamedTuple):
    """Correlation of two differenced signals over lags [s], and what it says.

    `lag_s` is added to the second signal's times to match the first's; `peak` the largest
    correlation, `second` the largest outside its neighbourhood, `halves_s` the lags of the two
    halves alone; NaN where there was nothing to correlate. `step_s` is the grid's step.
    """

    lags_s: FloatArray
    r: FloatArray
    lag_s: float
    peak: float
    second: float
    halves_s: tuple[float, float]
    step_s: float

    def refusal(self, *, min_peak: float, max_second: float, max_halves_s: float) -> str:
        """Return why the lag is not to be believed, or an empty text."""
        if not np.isfinite(self.peak):
            return "the signals do not overlap, or do not change"
        if self.peak < min_peak:
            return f"the peak of the correlation is {self.peak:.2f}, below {min_peak:g}"
        if self.second > max_second * self.peak:
            return (f"the second peak of the correlation is {self.second / self.peak:.2f} of the "
                    f"first, above {max_second:g}")
        apart = abs(self.halves_s[1] - self.halves_s[0])
        if not apart <= max_halves_s + 1e-9:
            return f"the two halves of the records differ by {apart:.1f} s, more than " \
                   f"{max_halves_s:g} s"
        return ""


def correlate(time_s: FloatArray, values: FloatArray, other_time_s: FloatArray,
              other_values: FloatArray, *, search_s: float, step_s: float,
              centre_s: float = 0.0) -> Lag:
    """Return the correlation of two differenced signals over lags of `centre_s` +- `search_s`.

    Both are put on one grid, differenced, freed of jumps beyond 10 robust standard deviations
    (caps, spikes), and correlated; the lag is refined by a parabola through the peak. Lags at which
    less than half of the shorter record overlaps are left out.

    Parameters
    ----------
    time_s, values : ndarray, shape (n,)
        The first signal: times [s], ascending, and readings; NaN readings are left out.
    other_time_s, other_values : ndarray, shape (m,)
        The second.
    search_s, step_s, centre_s : float
        Half-width of the search, step of the grid, middle of the search [s].
    """
    nothing = Lag(np.zeros(0), np.zeros(0), np.nan, np.nan, np.nan, (np.nan, np.nan), step_s)
    other_time_s = np.asarray(other_time_s, float) + centre_s
    if min(time_s.size, other_time_s.size) < 8:
        return nothing
    first = max(time_s[0], other_time_s[0]) - search_s
    last = min(time_s[-1], other_time_s[-1]) + search_s
    n = int((last - first) / step_s) + 1
    if n < 16:
        return nothing
    grid = first + step_s * np.arange(n)
    one, two = (_changes(grid, np.asarray(t, float), np.asarray(v, float), step_s)
                for t, v in ((time_s, values), (other_time_s, other_values)))
    reach = max(int(round(search_s / step_s)), ASIDE + 1)
    found = _peak(one, two, reach)
    if found is None:
        return nothing
    r, place = found
    lags = step_s * np.arange(-reach, reach + 1, dtype=np.float64)
    away = np.abs(np.arange(r.size) - place) > ASIDE
    both = np.flatnonzero((one != 0) | (two != 0))
    middle = int((both[0] + both[-1]) / 2)
    halves = [_peak(one[part], two[part], reach)
              for part in (slice(None, middle), slice(middle, None))]
    at = tuple(float(lags[half[1]]) + centre_s if half else np.nan for half in halves)
    fine = float(lags[place]) + step_s * _parabola(r, place)
    return Lag(np.asarray(lags + centre_s, np.float64), r, fine + centre_s, float(r[place]),
               float(max(r[away].max(initial=0.0), 0.0)), (at[0], at[1]), step_s)


def _changes(grid: FloatArray, time_s: FloatArray, values: FloatArray,
             step_s: float) -> FloatArray:
    """Return the differences of a signal on the grid; 0 where it has a gap or does not reach."""
    good = np.isfinite(values)
    time_s, values = time_s[good], values[good]
    if time_s.size < 2:
        return np.zeros(grid.size - 1)
    at = np.clip(np.searchsorted(time_s, grid), 1, time_s.size - 1)
    own = max(float(np.median(np.diff(time_s))), step_s)
    known = (time_s[at] - time_s[at - 1] <= MAX_GAP * own) & (grid >= time_s[0]) & (
        grid <= time_s[-1])
    change = np.where(known[1:] & known[:-1], np.diff(np.interp(grid, time_s, values)), np.nan)
    if not np.isfinite(change).any():
        return np.zeros(grid.size - 1)
    change = change - np.nanmedian(change)
    scale = 1.4826 * float(np.nanmedian(np.abs(change)))
    if scale > FLAT:
        change[np.abs(change) > CLIP * scale] = 0.0
    return np.nan_to_num(change)


def _peak(one: FloatArray, two: FloatArray, reach: int) -> tuple[FloatArray, int] | None:
    """Return the correlation over lags, each relative to the energy where both overlap."""
    held, other = (one != 0).astype(np.float64), (two != 0).astype(np.float64)
    product, energy, facing, overlap = (
        _lags(a, b, reach) for a, b in ((one, two), (one**2, other), (held, two**2),
                                        (held, other)))
    enough = overlap > LEAST_OVERLAP * min(held.sum(), other.sum())
    known = enough & (energy > FLAT) & (facing > FLAT)
    if not known.any():
        return None
    r = np.zeros(product.size)
    r[known] = product[known] / np.sqrt(energy[known] * facing[known])
    return r, int(np.argmax(r))


def _lags(one: FloatArray, two: FloatArray, reach: int) -> FloatArray:
    # As scipy.signal.correlate by FFT, whose import takes longer than all the rest of `check`.
    n = len(one) + len(two) - 1
    size = 1 << (n - 1).bit_length()
    full = irfft(rfft(one, size) * rfft(two[::-1], size), size)[:n]
    out, zero = np.zeros(2 * reach + 1), two.size - 1
    low, high = max(zero - reach, 0), min(zero + reach + 1, full.size)
    out[low - zero + reach:high - zero + reach] = full[low:high]
    return out


def _parabola(r: FloatArray, place: int) -> float:
    if not 0 < place < r.size - 1:
        return 0.0
    left, top, right = r[place - 1:place + 2]
    bend = left - 2 * top + right
    return float(np.clip((left - right) / (2 * bend), -0.5, 0.5)) if bend < -FLAT else 0.0
