"""Contact placements: where the head stood settled on the ground within a contact pass."""

from __future__ import annotations

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view

from surveykit.core import BoolArray, FloatArray

MAX_WINDOW = 15


def find_dwells(time_s: FloatArray, temperature_k: FloatArray, *, settle_s: float, min_s: float,
                max_rate_k_s: float) -> list[slice]:
    """Return the settled placements of a contact pass.

    A record is settled where the local rate of change is at most `max_rate_k_s`: the median of the
    slopes between all pairs (Theil-Sen) of the records around it, as many as cover a third of
    `min_s`, at least 3. As noise over so short a stretch may look like change, up to as many
    unsettled records between settled ones count as well where they rise or fall at twice that rate
    at most and none lies further from the line across them than that rate leads. Runs of settled
    records, without a gap longer than that stretch, lose their first `settle_s`; what is left
    counts if it lasts `min_s`.

    Parameters
    ----------
    time_s : ndarray, shape (n,)
        Times [s], ascending.
    temperature_k : ndarray, shape (n,)
        Readings [K]; a NaN ends a run.
    settle_s : float
        Taken off the beginning of each run [s].
    min_s : float
        Shortest placement [s].
    max_rate_k_s : float
        Fastest settled change [K s-1].

    Returns
    -------
    list of slice
        Into the arrays, in order of time.

    References
    ----------
    P. K. Sen, Estimates of the regression coefficient based on Kendall's tau, J. Am. Stat. Assoc.
    63 (1968) 1379-1389 (from memory).

    Examples
    --------
    >>> import numpy as np
    >>> t = np.arange(0.0, 20.0, 0.5)
    >>> find_dwells(t, np.where(t < 10, 300 + 5 * t, 350.0), settle_s=1, min_s=3, max_rate_k_s=0.5)
    [slice(23, 40, None)]
    """
    time_s, temperature_k = np.asarray(time_s, float), np.asarray(temperature_k, float)
    if time_s.size < 3:
        return []
    steps = np.diff(time_s)
    step_s = float(np.median(steps))
    half = int(np.clip(round(min_s / 3 / step_s / 2) if step_s > 0 else 1, 1, MAX_WINDOW // 2))
    width = 2 * half + 1
    if time_s.size < width:
        half, width = 1, 3
    rate = _local_rate(time_s, temperature_k, width)
    rate = np.pad(rate, half, mode="edge")
    settled = (np.abs(rate) <= max_rate_k_s) & np.isfinite(temperature_k)
    _bridge(settled, time_s, temperature_k, width, max_rate_k_s)
    breaks = np.flatnonzero((settled[1:] != settled[:-1]) | (steps > width * step_s)) + 1
    dwells = []
    for first, last in zip([0, *breaks], [*breaks, time_s.size], strict=True):
        first, last = int(first), int(last)
        if not settled[first]:
            continue
        begin = first + int(np.searchsorted(time_s[first:last], time_s[first] + settle_s))
        if begin < last and time_s[last - 1] - time_s[begin] >= min_s:
            dwells.append(slice(begin, last))
    return dwells


def _bridge(settled: BoolArray, time_s: FloatArray, temperature_k: FloatArray, width: int,
            max_rate_k_s: float) -> None:
    """Settle up to `width` records between settled ones that lie about on the line across them."""
    known = np.flatnonzero(settled)
    for first, last in zip(known[:-1], known[1:], strict=True):
        if 1 < last - first <= width + 1:
            ends = [first, last]
            part = slice(first, last + 1)
            across = np.interp(time_s[part], time_s[ends], temperature_k[ends])
            away = np.abs(temperature_k[part] - across).max()
            rise, lapse_s = abs(temperature_k[last] - temperature_k[first]), np.ptp(time_s[ends])
            settled[part] |= max(away, rise / 2) <= max_rate_k_s * lapse_s


def _local_rate(time_s: FloatArray, temperature_k: FloatArray, width: int) -> FloatArray:
    times = sliding_window_view(time_s, width)
    values = sliding_window_view(temperature_k, width)
    late, early = np.tril_indices(width, -1)
    with np.errstate(divide="ignore", invalid="ignore"):
        slopes = (values[:, late] - values[:, early]) / (times[:, late] - times[:, early])
    rate = np.full(len(slopes), np.nan)
    whole = np.isfinite(slopes).all(axis=1)
    rate[whole] = np.median(slopes[whole], axis=1)
    return rate
