"""What quality hands to evidence: reasons, marks, the records of each pass, and the account."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from surveykit.core import IntArray

Mask = NDArray[np.uint32]
NS = 1_000_000_000


@dataclass(frozen=True)
class Reason:
    """Why a record is left out: the word in the tables, the sentence, where the limit is from."""

    name: str
    sentence: str
    source: str


REASONS = (
    Reason("unreadable line", "the line does not have the header's columns", "file format"),
    Reason("unreadable time", "the time does not have the stated format", "file format"),
    Reason("repeated record", "the same record stands in the files twice", "order of records"),
    Reason("conflicting records", "two different records carry one time", "order of records"),
    Reason("time stepped back", "the logger's time runs backward", "order of records"),
    Reason("no reading", "the cell is empty or holds a missing code", "file format"),
    Reason("unreadable value", "the cell is not a number", "file format"),
    Reason("out of range", "the reading is outside the quantity's range",
           "engineering default"),
    Reason("physically impossible", "the irradiance is beyond what the sun's height allows",
           "Long & Shi 2008, physically possible limits"),
    Reason("stuck reading", "the reading repeats longer than its own scatter allows",
           "engineering default"),
    Reason("capped", "the head was capped for a dark reading", "field sheet"),
    Reason("sun too low", "the sun stands lower than the method's limit",
           "ASTM E1918 scope and engineering default"),
    Reason("too little light", "the irradiance is below the floor", "engineering default"),
    Reason("no partner", "the other logger has no usable record at this time", "field practice"),
    Reason("pass edge", "within the uncertainty of the pass's start or stop",
           "engineering default"),
    Reason("between placements", "the head was not settled on the surface",
           "first-order response"),
)
BIT = {reason.name: np.uint32(1 << i) for i, reason in enumerate(REASONS)}
NOT_A_FAULT = BIT["pass edge"] | BIT["between placements"]
LAST_FAULT = [r.name for r in REASONS].index("stuck reading")


@dataclass(frozen=True)
class PassRecords:
    """The records of one pass: all in its window, and those that may be used.

    `index` points into the main logger's records; `partners` holds, per other logger, the index
    of the matching record. `reasons` counts the rest of the window by primary reason; `refusal`
    says why nothing may be used; `dwells` are spans of `index` (first, one past the last).
    `zenith_deg` is the mean over the records used, or over the window where none is.
    """

    logger: str
    index: IntArray
    partners: dict[str, IntArray]
    n_window: int
    reasons: dict[str, int]
    refusal: str = ""
    dwells: tuple[tuple[int, int], ...] = ()
    zenith_deg: float = float("nan")


@dataclass(frozen=True)
class Quality:
    """Marks per logger and column, records per pass, and the tables checks and ledger."""

    masks: dict[str, dict[str, Mask]]
    passes: dict[str, PassRecords]
    checks: pd.DataFrame
    ledger: pd.DataFrame
