"""The mean of a correlated series and how many independent records it is worth."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from surveykit.core import Estimate, FloatArray
from surveykit.statistics.bootstrap import as_series, autocovariance, stationary_u


def autocorrelation(x: ArrayLike) -> FloatArray:
    """Return the sample autocorrelation of an evenly spaced series.

    Parameters
    ----------
    x : array_like, shape (n,)
        Records in order of time, any unit, none missing.

    Returns
    -------
    ndarray, shape (n,)
        Autocorrelation [1] at lags 0 to n - 1, each lag's sum divided by n (not by n - lag);
        NaN at every lag where the records are all equal, for then it does not exist.

    Raises
    ------
    ValueError
        If x is empty, not one-dimensional, or holds a NaN or an infinity.

    References
    ----------
    Box, Jenkins & Reinsel, Time Series Analysis, 3rd ed. 1994, section 2.1.5 (from memory).

    Examples
    --------
    >>> autocorrelation([1.0, 2.0, 3.0, 4.0]).round(3)
    array([ 1.  ,  0.25, -0.3 , -0.45])
    """
    values = as_series(x)
    if np.ptp(values) == 0:
        return np.full(values.size, np.nan)
    # Scaled first: the squares of very small or very large records stay within range.
    covariance = autocovariance((values - values.mean()) / np.ptp(values))
    return covariance / covariance[0]


def integrated_time(correlation: ArrayLike) -> float:
    """Return how many records of a series are worth one independent record.

    The sum 1 + 2 (rho_1 + rho_2 + ...) is cut where the sum of two neighbouring lags is no longer
    positive (the initial positive sequence): further lags hold noise only.

    Parameters
    ----------
    correlation : array_like, shape (n,)
        Autocorrelation [1] at lags 0 to n - 1; the first is 1.

    Returns
    -------
    float
        Integrated autocorrelation time in records [1]; below 1 where neighbours alternate.

    References
    ----------
    Geyer, Statistical Science 7 (1992) 473-483, section 3.3 (from memory).

    Examples
    --------
    >>> integrated_time([1.0, 0.5, 0.25, -0.3, 0.1, 0.1])
    2.0
    """
    rho = np.asarray(correlation, dtype=np.float64)
    pairs = np.append(rho, 0.0)[: 2 * ((rho.size + 1) // 2)].reshape(-1, 2).sum(axis=1)
    ends = np.flatnonzero(pairs <= 0)
    kept = pairs[: ends[0]] if ends.size else pairs
    return float(2 * kept.sum() - 1)


def effective_sample_size(x: ArrayLike) -> float:
    """Return how many independent records the mean of a correlated series is worth.

    Parameters
    ----------
    x : array_like, shape (n,)
        Records in order of time, any unit, none missing.

    Returns
    -------
    float
        n over the integrated autocorrelation time, held within 1 and n [1]. Records that are all
        equal show nothing of their correlation and count as one.

    Raises
    ------
    ValueError
        If x is empty, not one-dimensional, or holds a NaN or an infinity.

    References
    ----------
    Geyer, Statistical Science 7 (1992) 473-483 (from memory).

    Examples
    --------
    >>> effective_sample_size([5.0, 5.0, 5.0])
    1.0
    """
    values = as_series(x)
    if np.ptp(values) == 0:
        return 1.0
    time = integrated_time(autocorrelation(values))
    return values.size if time <= 1 else max(1.0, values.size / time)


def mean_of_series(x: ArrayLike, unit: str, method: str) -> Estimate:
    """Return the mean of a correlated series with the standard uncertainty of sampling.

    Parameters
    ----------
    x : array_like, shape (n,)
        Records in order of time, none missing, n >= 2.
    unit : str
        Unit of the records.
    method : str
        How the records were made, for the report.

    Returns
    -------
    Estimate
        Mean; n; n_eff; u the larger of sd / sqrt(n_eff), sd over n - 1, and of the stationary
        bootstrap's standard error, which by itself is too small for strongly correlated records
        (at a first-order correlation of .95: .73 of the truth for 600, .57 for 200).

    Raises
    ------
    ValueError
        If x holds fewer than two records, a NaN or an infinity, or is not one-dimensional.

    References
    ----------
    JCGM 100:2008, 4.2.3 (independent records) with n replaced by the effective number;
    `bootstrap.stationary_u`.

    Examples
    --------
    >>> mean_of_series([1.0, 2.0, 1.0, 2.0], "K", "alternating").n_eff
    4.0
    """
    values = as_series(x)
    if values.size < 2:
        raise ValueError("the spread of a series needs at least two records, got one")
    n_eff = float(effective_sample_size(values))
    u = max(float(values.std(ddof=1) / np.sqrt(n_eff)), stationary_u(values))
    return Estimate(value=float(values.mean()), u=u, unit=unit, n=values.size, n_eff=n_eff,
                    method=method)
