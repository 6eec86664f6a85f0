"""What quality hands to evidence: reasons, marks, the records of each pass, and the account."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from surveykit.core import IntArray

Mask = NDArray[np.uint32]
NS = 1_000_000_000


@dataclass(frozen=True)
class Reason:
    """What a check found: the word in the tables, the sentence, where the limit is from.

    `action` is what follows for a record: it is left out (exclude), or kept and told of (flag).
    This is the only place that decides it; what refuses a pass stands in `quality.selection`.
    """

    name: str
    sentence: str
    source: str
    action: Literal["exclude", "flag"] = "exclude"


# In order: a record's primary reason is the first that holds.
REASONS = (
    Reason("unreadable line", "the line does not have the header's columns", "file format"),
    Reason("unreadable time", "the time does not have the stated format", "file format"),
    Reason("repeated record", "the same record stands in the files twice", "order of records"),
    Reason("conflicting records", "two different records carry one time", "order of records"),
    Reason("time stepped back", "the logger's time is out of order there", "order of records"),
    Reason("clock refused", "the logger's clock could not be set, so its time is not known",
           "clock evidence"),
    Reason("no reading", "the cell is empty or holds a missing code", "file format"),
    Reason("unreadable value", "the cell is not a number", "file format"),
    Reason("out of range", "the reading is outside the quantity's range",
           "engineering default; longwave: BSRN physically possible limits, from memory"),
    Reason("physically impossible", "the irradiance is beyond what the sun's height allows",
           "Long & Shi 2008, physically possible limits; upward from memory"),
    Reason("saturated", "readings pile up at the channel's own end, as of a head at its limit",
           "engineering default"),
    Reason("stuck reading", "the reading repeats longer than its own scatter allows",
           "engineering default"),
    Reason("spike", "the reading stands far off its neighbours and off the channel's own noise",
           "Hampel's test, engineering default"),
    Reason("more light up than down", "the head that looks down reads more than the one that "
           "looks up", "BSRN comparison, from memory"),
    Reason("improbable albedo", "the share of light sent back is not that of ground without snow",
           "engineering default"),
    Reason("longwave against air", "the downwelling longwave does not fit the air temperature",
           "BSRN comparison, from memory"),
    Reason("far from the air", "the reading is further from the air temperature than ground gets",
           "BSRN comparison, widened for hot paving: engineering default"),
    Reason("housing out of range", "the instrument's housing is colder or warmer than it may be",
           "engineering default"),
    Reason("housing shock", "the instrument's housing warms or cools too fast for its readings",
           "engineering default"),
    Reason("capped", "the head was capped or covered", "field sheet"),
    Reason("sun too low", "the sun stands lower than the method's limit",
           "ASTM E1918 scope and engineering default"),
    Reason("too little light", "the irradiance is below the floor", "engineering default"),
    Reason("no partner", "what the reading is paired with has no usable record at this time",
           "field practice"),
    Reason("foreign ground in view", "the patch filled too little of the view there",
           "engineering default"),
    Reason("turn", "the walk turned from one lane to the next", "engineering default"),
    Reason("pass edge", "within the uncertainty of the pass's start or stop",
           "engineering default"),
    Reason("between placements", "the head was not settled on the surface",
           "first-order response"),
)
# Told of, never left out.
FLAGS = (
    Reason("extremely rare irradiance", "the irradiance is above the extremely rare limit; at "
           "several records a second the edge of a cloud can do this",
           "Long & Shi 2008, extremely rare limits (made for one-minute means)", "flag"),
    Reason("end of range", "the reading stands at the end of its column's range, or of its "
           "quantity's",
           "engineering default", "flag"),
    Reason("step", "the reading jumps from one second to the next, away from the pass's edges",
           "engineering default", "flag"),
    Reason("irradiance history", "the irradiance had just changed: the ground's temperature had "
           "not followed yet", "engineering default", "flag"),
    Reason("sky not steady", "the irradiance was not steady around the reading",
           "engineering default", "flag"),
    Reason("housing warms or cools", "the instrument's housing changes fast enough to shift its "
           "readings", "engineering default", "flag"),
    Reason("brighter than the sky", "more red or near-infrared light comes up than down: check "
           "the gains, and which head looks up", "engineering default", "flag"),
    Reason("negative reflectance", "less red or near-infrared light comes up than under the cap; "
           "kept, or the mean of what is left would be too large", "engineering default", "flag"),
)
CHECKS = {reason.name: reason for reason in (*REASONS, *FLAGS)}
BIT = {reason.name: np.uint32(1 << i) for i, reason in enumerate(REASONS)}
# not over the pass's patch: no part of its whole either
OFF_PATCH = BIT["pass edge"] | BIT["turn"] | BIT["foreign ground in view"]
NOT_A_FAULT = OFF_PATCH | BIT["between placements"]
LAST_FAULT = [r.name for r in REASONS].index("spike")  # of the reading alone, in or out of a pass


def primary(mask: Mask) -> IntArray:
    """Return the index of the first reason set in each mask; -1 where none is."""
    lowest = mask & (~mask + np.uint32(1))
    return np.where(mask == 0, -1, np.log2(np.maximum(lowest, 1)).astype(np.int64))


def counted(number: int, word: str) -> str:
    """Return a number with its word in the singular or plural.

    Examples
    --------
    >>> counted(1, "record"), counted(2, "gap")
    ('1 record', '2 gaps')
    """
    return f"{number} {word}" if number == 1 else f"{number} {word}s"


def percent(share: float) -> str:
    """Return a share [1] in whole per cent.

    Examples
    --------
    >>> percent(0.317)
    '32 %'
    """
    return f"{100 * share:.0f} %"


@dataclass(frozen=True)
class PassRecords:
    """The records of one pass: all in its window, and those that may be used.

    `index` points into the main logger's records; `partners` holds, per other logger, the index
    of the matching record. `reasons` counts the rest of the window by primary reason; `refusal`
    says why nothing may be used; `dwells` are spans of `index` (first, one past the last).
    `zenith_deg` is the mean over the records used, or over the window where none is. `flags` are
    the checks that found something among the records used and left them in.
    """

    logger: str
    index: IntArray
    partners: dict[str, IntArray]
    n_window: int
    reasons: dict[str, int]
    refusal: str = ""
    dwells: tuple[tuple[int, int], ...] = ()
    zenith_deg: float = float("nan")
    flags: tuple[str, ...] = ()


@dataclass(frozen=True)
class Quality:
    """Marks per logger and column, records per pass; the tables checks, ledger and waterfall."""

    masks: dict[str, dict[str, Mask]]
    passes: dict[str, PassRecords]
    checks: pd.DataFrame
    ledger: pd.DataFrame
    waterfall: pd.DataFrame
