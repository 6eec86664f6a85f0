"""Passes: one timed coverage of a patch, with the channels that served it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from surveykit.intake.params import Channel


@dataclass(frozen=True)
class Pass:
    """One timed coverage of a patch by one quantity."""

    name: str
    surface: str
    patch: str
    quantity: str
    kind: str
    mode: str
    row: int
    start_ns: int
    stop_ns: int
    trim_s: float
    from_ns: int
    to_ns: int
    channels: dict[str, Channel]
    height_m: float
    width_m: float
    length_m: float
    lanes: int
    reading: float
    notes: tuple[str, ...] = ()
