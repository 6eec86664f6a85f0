"""Standard error of the mean of a correlated series by the stationary bootstrap, in closed form."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike
from scipy.fft import irfft, next_fast_len, rfft

from surveykit.core import FloatArray


def as_series(x: ArrayLike) -> FloatArray:
    """Return records in order of time, shape (n,), or refuse what is no series.

    Raises
    ------
    ValueError
        If x is empty, not one-dimensional, or holds a NaN or an infinity.
    """
    values = np.asarray(x, dtype=np.float64)
    if values.ndim != 1 or values.size == 0:
        raise ValueError(f"a series needs shape (n,) with n >= 1, got {values.shape}")
    if not np.isfinite(values).all():
        raise ValueError(f"a series may not hold a NaN or an infinity, got "
                         f"{np.count_nonzero(~np.isfinite(values))} of {values.size}: "
                         "leave such records out first")
    return values


def autocovariance(x: ArrayLike) -> FloatArray:
    """Return the sample autocovariance at lags 0 to n - 1, each lag's sum divided by n.

    Raises
    ------
    ValueError
        If x is not of shape (n,) with n >= 2, or holds a NaN or an infinity.
    """
    values = as_series(x)
    if values.size < 2:
        raise ValueError("the scatter of a series needs n >= 2, got one record")
    length = next_fast_len(2 * values.size - 1, real=True)
    spectrum = rfft(values - values.mean(), length)
    return np.asarray(irfft(np.abs(spectrum) ** 2, length)[: values.size] / values.size)


def block_length(covariance: FloatArray) -> float:
    """Return the automatic mean block length of a series from its autocovariance.

    Parameters
    ----------
    covariance : ndarray, shape (n,)
        From `autocovariance`.

    Returns
    -------
    float
        Records, at least 1 and at most ceil(min(3 sqrt n, n / 3)); 1 where they are all equal.

    References
    ----------
    Politis & White, Econometric Reviews 23 (2004) 53-70; corrected by Patton, Politis & White,
    Econometric Reviews 28 (2009) 372-375 (both from memory; agrees with an independent library).
    """
    n = covariance.size
    most = float(np.ceil(min(3 * np.sqrt(n), n / 3)))
    if covariance[0] <= 0:
        return 1.0
    run = max(5, int(np.log10(n)))
    reach = min(int(np.ceil(np.sqrt(n))) + run, n - 1)
    small = np.abs(covariance[1: reach + 1] / covariance[0]) < 2 * np.sqrt(np.log10(n) / n)
    width = reach
    for lag in range(1, reach - run + 1):  # the first of `run` small ones, as the authors' program
        if small[lag - 1: lag - 1 + run].all():
            width = min(2 * lag, reach)
            break
    lags = np.arange(1, width + 1)
    taper = np.clip(2 * (1 - lags / width), 0, 1)
    some = taper * covariance[1: width + 1]
    spread = covariance[0] + 2 * float(some.sum())
    lean = 2 * float(lags @ some)
    if spread <= 0:
        return 1.0
    return float(np.clip(np.cbrt((lean / spread) ** 2 * n), 1.0, max(most, 1.0)))


def stationary_u(x: ArrayLike, mean_block: float | None = None) -> float:
    """Return the standard error of the mean that endless stationary resampling would give.

    Parameters
    ----------
    x : array_like, shape (n,)
        Records in order of time, none missing, n >= 2.
    mean_block : float, optional
        Mean block length [records], at least 1; not given, the automatic one.

    Returns
    -------
    float
        Standard error in the unit of x.

    Raises
    ------
    ValueError
        If x is no series (see `autocovariance`) or mean_block is below 1.

    References
    ----------
    Politis & Romano, Journal of the American Statistical Association 89 (1994) 1303-1313, lemma 1
    (from memory): n var = C(0) + 2 sum over k < n of b_k C(k), with the autocovariance C and
    b_k = (1 - k / n)(1 - p)^k + (k / n)(1 - p)^(n - k), p the inverse of the mean block length.

    Examples
    --------
    >>> round(stationary_u([1.0, 2.0, 3.0, 4.0], mean_block=1.0), 4)  # sd / sqrt(n), sd over n
    0.559
    """
    covariance = autocovariance(x)
    block = block_length(covariance) if mean_block is None else mean_block
    if not block >= 1:
        raise ValueError(f"mean_block must be 1 or more records, got {mean_block!r}")
    n = covariance.size
    share, keep = np.arange(1, n) / n, 1 - 1 / block
    kept = keep ** np.arange(1, n)
    weights = (1 - share) * kept + share * kept[::-1]
    variance = (covariance[0] + 2 * float(weights @ covariance[1:])) / n
    return float(np.sqrt(max(variance, 0.0)))
