"""Streams of draws, one for each thing that an error belongs to."""

from __future__ import annotations

import hashlib
from itertools import islice

import numpy as np
from scipy.special import ndtri, stdtrit

from surveykit.core import Distribution, FloatArray

HELD_BYTES = 128_000_000  # of vectors kept; a vector let go comes back the same
_held: dict[tuple[int, int, str, str, float], FloatArray] = {}  # for all dates of one study


class Draws:
    """One vector of draws a scope, the same in every pass, surface and campaign.

    Each scope has a stream of its own, seeded by SHA-256 of the study seed and the scope's name:
    nothing is stored, and neither the order of the calls nor other scopes change a vector. A
    vector is stratified (one draw in each of `size` equally likely strata, in random order), so
    that its own quantiles carry almost no Monte Carlo error.

    Parameters
    ----------
    seed : int
        The study seed.
    size : int
        Number of draws M, at least 2.

    Raises
    ------
    ValueError
        If size is below 2.

    References
    ----------
    JCGM 101:2008 (propagation of distributions); McKay, Beckman & Conover, Technometrics 21
    (1979) 239-245 (stratified draws; from memory).

    Examples
    --------
    >>> draws = Draws(seed=20251, size=1000)
    >>> gain = draws.standard("kit-2025:sky:gain")
    >>> bool(np.array_equal(gain, Draws(20251, 1000).standard("kit-2025:sky:gain")))
    True
    >>> bool(abs(gain.mean()) < 0.01), bool(abs(gain.std() - 1) < 0.01)
    (True, True)
    """

    def __init__(self, seed: int, size: int) -> None:
        if size < 2:
            raise ValueError(f"draws need a size of at least 2, got {size!r}")
        self.seed = seed
        self.size = size

    def standard(self, scope: str, distribution: Distribution = "normal") -> FloatArray:
        """Return the draws of a scope, of mean 0 and variance 1.

        Parameters
        ----------
        scope : str
            What the error belongs to.
        distribution : {"normal", "rectangular"}, optional
            The rectangular vector is the normal one carried over rank by rank.

        Returns
        -------
        ndarray, shape (size,)
            Draws [1], read-only.

        Raises
        ------
        ValueError
            If the distribution is not known.

        References
        ----------
        JCGM 101:2008, 6.4.2 (rectangular) and 6.4.7 (normal).
        """
        key = (self.seed, self.size, distribution, scope, np.inf)
        if key not in _held:
            share = self._strata(scope)
            if distribution == "normal":
                _keep(key, ndtri(share))
            elif distribution == "rectangular":
                _keep(key, np.sqrt(3) * (2 * share - 1))
            else:
                raise ValueError(f"distribution must be normal or rectangular, "
                                 f"got {distribution!r}")
        return _held[key]

    def student(self, scope: str, dof: float) -> FloatArray:
        """Return draws of Student's t for the sampling of a scope (not scaled to variance 1).

        Parameters
        ----------
        scope : str
            What the sampling belongs to; its stream is apart from that of `standard`.
        dof : float
            Degrees of freedom, above 0; infinity gives normal draws.

        Returns
        -------
        ndarray, shape (size,)
            Draws [1], read-only.

        Raises
        ------
        ValueError
            If dof is not above 0.

        References
        ----------
        JCGM 101:2008, 6.4.9.
        """
        if not dof > 0:
            raise ValueError(f"Student's t needs dof > 0, got {dof!r} for scope {scope!r}")
        key = (self.seed, self.size, "student", scope, float(dof))
        if key not in _held:
            _keep(key, stdtrit(float(dof), self._strata(f"student|{scope}")))
        return _held[key]

    def _strata(self, scope: str) -> FloatArray:
        digest = hashlib.sha256(f"{self.seed}|{scope}".encode()).digest()
        stream = np.random.Generator(np.random.PCG64(int.from_bytes(digest, "big")))
        share = (stream.permutation(self.size) + stream.random(self.size)) / self.size
        return np.clip(share, 2.0**-53, 1 - 2.0**-53)


def _keep(key: tuple[int, int, str, str, float], vector: FloatArray) -> None:
    largest = max([vector.nbytes, *(one.nbytes for one in islice(_held.values(), 1))])
    while _held and (len(_held) + 1) * largest > HELD_BYTES:
        _held.pop(next(iter(_held)))  # the oldest; made anew when asked for again
    vector.flags.writeable = False
    _held[key] = vector
