"""One scatter between passes for all surfaces of a quantity, where the parameters ask for it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from scipy.special import fdtrc

from surveykit.core import FloatArray
from surveykit.evidence.estimates import PassEstimate
from surveykit.evidence.moving import Moves
from surveykit.statistics.pooling import Common, common_scatter

EXCEEDS = 0.05  # level of the F test that warns
Key = tuple[str, str, str]


class Spreads:
    """The common scatter between passes of one patch, by quantity and kind."""

    def __init__(self, campaign: str, found: Mapping[Key, Sequence[PassEstimate]]) -> None:
        self._own: dict[Key, tuple[float, int]] = {}
        units: dict[tuple[str, str], list[tuple[FloatArray, FloatArray]]] = {}
        for key, passes in found.items():
            used = tuple(p for p in passes if p.evaluated)
            own_u, square, dof = Moves(campaign, used).own_u, 0.0, 0
            values = np.array([p.value for p in used])
            for rows in rows_by_patch(used).values():
                units.setdefault(key[1:], []).append((values[rows], own_u[rows]))
                square += float(((values[rows] - values[rows].mean()) ** 2).sum())
                dof += len(rows) - 1
            self._own[key] = square, dof
        self._common = {family: common_scatter(some) for family, some in units.items()}

    def common(self, key: Key) -> Common | None:
        """Return the scatter a surface borrows; None where no patch has two passes."""
        return self._common.get(key[1:])

    def words(self, key: Key, single: bool) -> str:
        """Return the sentence that names the loan, and warns where the own spread is larger.

        It says what is borrowed: the interval of a single patch, or the scatter within patches.
        The own variance is held against that of the other surfaces (F, 5 %, one-sided); the
        interval is not switched by it, for that would not keep its coverage.
        """
        square, dof = self._own[key]
        others = [v for k, v in self._own.items() if k[1:] == key[1:] and k != key]
        rest, rest_dof = sum(s for s, _ in others), sum(d for _, d in others)
        every = float(np.sqrt((square + rest) / (dof + rest_dof)))
        unit = " K" if key[1] == "temperature" else ""
        what = "interval borrows" if single else "passes within its patches borrow"
        text = f"{what} the common spread of passes, {every:.2g}{unit}"
        if not dof:
            return f"{text} (its own is not known)"
        text += f" (its own {np.sqrt(square / dof):.2g}{unit})"
        if rest_dof and rest > 0 and fdtrc(
                dof, rest_dof, (square / dof) / (rest / rest_dof)) < EXCEEDS:
            text += ", which its own exceeds: the interval may be too narrow"
        return text


def rows_by_patch(passes: Sequence[PassEstimate]) -> dict[str, list[int]]:
    """Return the rows of each patch, in order."""
    patches: dict[str, list[int]] = {}
    for row, p in enumerate(passes):
        patches.setdefault(p.this.patch, []).append(row)
    return patches
