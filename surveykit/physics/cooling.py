"""Ground that cools under a head pressed onto it: the fit that leads back to before the touch."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from scipy.optimize import minimize_scalar
from scipy.special import dawsn

from surveykit.core import FloatArray

WIDEST = 4.0  # factor by which a fitted time constant may differ from the stated one


class CoolingFit(NamedTuple):
    """Result of `fit_placements`.

    `before_k` and `u_k`, shape (placements,): temperature at the touch and its standard error;
    `mean_k`, `u_mean_k`: their mean, with what the placements share; `rate`, `u_rate`: b and its
    standard error [K s-1/2].
    """

    before_k: FloatArray
    u_k: FloatArray
    mean_k: float
    u_mean_k: float
    rate: float
    u_rate: float


def fit_placements(time_s: Sequence[FloatArray], temperature_k: Sequence[FloatArray], *,
                   time_constant_s: float, fit_time_constant: bool, lagged: bool) -> CoolingFit:
    """Fit T0 - b sqrt(t) + A exp(-t / tau) to the placements of one pass.

    Every placement has its own T0 and A; b belongs to ground and sun and is common to all. Records
    before 2 tau are left out.

    Parameters
    ----------
    time_s, temperature_k : sequence of ndarray
        One pair a placement: seconds since the head was put down, and what it read [K].
    time_constant_s : float
        Time constant of the head [s]; with 0 the head follows at once and A is left out.
    fit_time_constant : bool
        Whether tau is fitted as well, within a factor of 4 of the stated one.
    lagged : bool
        Whether sqrt(t) is replaced by what a first-order head makes of it,
        sqrt(t) - sqrt(tau) D(sqrt(t / tau)) with Dawson's integral D: without that the head's lag
        of a falling temperature raises T0 (by .1 K for tau .5 s and b .5 K s-1/2).

    Returns
    -------
    CoolingFit
        NaN standard errors where no record is left over.

    Raises
    ------
    ValueError
        If fewer records are left than there are unknowns, or the sequences differ in shape.

    References
    ----------
    Carslaw & Jaeger, Conduction of Heat in Solids (from memory): semi-infinite solid under a step
    of flux. Standard errors: JCGM 100:2008, H.3 (least squares). Dawson's integral: NIST Digital
    Library of Mathematical Functions, 7.2 (the response is computed from its equation).

    Examples
    --------
    >>> t = np.arange(0.5, 15, 0.2)
    >>> found = fit_placements([t], [333.15 - 0.52 * np.sqrt(t)], time_constant_s=0.0,
    ...                        fit_time_constant=False, lagged=False)
    >>> print(f"{found.mean_k:.2f} {found.rate:.2f}")
    333.15 0.52
    """
    times = [np.asarray(t, dtype=np.float64) for t in time_s]
    read = [np.asarray(v, dtype=np.float64) for v in temperature_k]
    if not times or [t.shape for t in times] != [v.shape for v in read]:
        raise ValueError("every placement needs as many times as temperatures")
    keep = [t >= 2 * time_constant_s for t in times]
    times = [t[k] for t, k in zip(times, keep, strict=True)]
    read = [v[k] for v, k in zip(read, keep, strict=True)]
    values = np.concatenate(read)
    unknowns = len(times) * (2 if time_constant_s > 0 else 1) + 1 + fit_time_constant
    if values.size < unknowns or min(t.size for t in times) < 2:
        raise ValueError(f"{unknowns} unknowns need as many records, got {values.size}")
    tau = time_constant_s
    if fit_time_constant and tau > 0:
        def misfit(log_tau: float) -> float:
            return float(np.sum(_solve(times, values, np.exp(log_tau), lagged)[1] ** 2))

        found = minimize_scalar(misfit, bounds=(np.log(tau / WIDEST), np.log(tau * WIDEST)),
                                method="bounded", options={"xatol": 1e-7})
        tau = float(np.exp(found.x))
    solution, residual, design = _solve(times, values, tau, lagged)
    if fit_time_constant and tau > 0:
        step = 1e-4 * tau
        moved = _design(times, tau + step, lagged) @ solution - design @ solution
        design = np.column_stack([design, moved / step])
    spare = values.size - unknowns
    variance = float(residual @ residual) / spare if spare > 0 else np.nan
    cover = variance * np.linalg.pinv(design.T @ design)
    n = len(times)
    before, ones = solution[1:1 + n], np.full(n, 1 / n)
    return CoolingFit(
        before, np.sqrt(np.diag(cover)[1:1 + n]), float(before.mean()),
        float(np.sqrt(ones @ cover[1:1 + n, 1:1 + n] @ ones)), float(-solution[0]),
        float(np.sqrt(cover[0, 0])))


def first_described(time_s: FloatArray, temperature_k: FloatArray, settled: int, *,
                    time_constant_s: float, tolerance_k: float) -> int:
    """Return the first record from which on the law of `fit_placements` describes a placement.

    Backward from the settled records, one more is taken as long as the law, begun there, passes
    all of them within `tolerance_k` (or four standard deviations of the settled ones about it):
    the touch lies between the record found and the one before.

    Parameters
    ----------
    time_s, temperature_k : ndarray, shape (n,)
        Times [s], ascending, and readings [K]; the last records are settled ones.
    settled : int
        Index of the first settled record.
    time_constant_s : float
        Time constant of the head [s].
    tolerance_k : float
        Distance from the law [K] that is allowed whatever the noise.

    Returns
    -------
    int
        Index, at most `settled`.

    References
    ----------
    See `fit_placements`.

    Examples
    --------
    >>> t = np.arange(0.0, 10.0, 0.5)
    >>> on = np.where(t < 3, 300.0, 320 - np.exp(-(t - 3) / 0.3) * 15 - 0.4 * np.sqrt(abs(t - 3)))
    >>> first_described(t, on, 12, time_constant_s=0.3, tolerance_k=0.2)
    6
    """
    def distance(first: int, least: int) -> FloatArray:
        times = time_s[first:] - time_s[first]
        if times.size <= least:
            return np.zeros(0)
        return _solve([times], temperature_k[first:], time_constant_s, time_constant_s > 0)[1]

    own = distance(settled, 4)
    limit = max(tolerance_k, 4 * float(own.std())) if own.size else tolerance_k
    first = settled
    while first > 0 and (np.abs(distance(first - 1, 3)) <= limit).all():
        first -= 1
    return first


def root_time(time_s: FloatArray, time_constant_s: float, lagged: bool) -> FloatArray:
    """Return sqrt(t) [s1/2], or what a first-order head makes of it.

    References
    ----------
    See `fit_placements`.

    Examples
    --------
    >>> print(root_time(np.array([4.0]), 0.5, True).round(3), root_time(np.array([4.0]), 0, False))
    [1.864] [2.]
    """
    root = np.sqrt(np.asarray(time_s, dtype=np.float64))
    if not lagged or time_constant_s <= 0:
        return np.asarray(root)
    return np.asarray(root - np.sqrt(time_constant_s) * dawsn(root / np.sqrt(time_constant_s)))


def _design(times: Sequence[FloatArray], tau: float, lagged: bool) -> FloatArray:
    place = np.repeat(np.arange(len(times)), [t.size for t in times])
    all_times = np.concatenate(list(times))
    own = (place[:, None] == np.arange(len(times))).astype(np.float64)
    columns = [root_time(all_times, tau, lagged)[:, None], own]
    if tau > 0:
        start = np.array([t[0] for t in times])[place]
        columns.append(own * np.exp(-(all_times - start) / tau)[:, None])
    return np.hstack(columns)


def _solve(times: Sequence[FloatArray], values: FloatArray, tau: float,
           lagged: bool) -> tuple[FloatArray, FloatArray, FloatArray]:
    design = _design(times, tau, lagged)
    solution = np.asarray(np.linalg.lstsq(design, values, rcond=None)[0], dtype=np.float64)
    return solution, values - design @ solution, design
