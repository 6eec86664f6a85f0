"""Checks -> one bit a reason on every reading; which records each pass may use; the ledger.

A reading is never changed here, only marked. The first bit set, in the order of
`accounting.REASONS`, is the record's primary reason. No check looks at a surface's name.
"""

from __future__ import annotations

from surveykit.accounting import Quality
from surveykit.core import table
from surveykit.intake.fieldsheet import Sheet
from surveykit.intake.loggers import Records
from surveykit.intake.params import Parameters
from surveykit.intake.passes import Pass
from surveykit.physics.sun import sun_track
from surveykit.quality.consistency import compare
from surveykit.quality.ledger import ledger, waterfall
from surveykit.quality.marks import mark
from surveykit.quality.selection import choose
from surveykit.quality.study import Study
from surveykit.quality.supports import support

__all__ = ["examine"]


def examine(parameters: Parameters, records: dict[str, Records], sheet: Sheet,
            passes: tuple[Pass, ...]) -> Quality:
    """Mark every reading, choose each pass's records, and account for all of them.

    Raises
    ------
    AssertionError
        If a record of a file is not accounted for exactly once (a bug, never the user's fault).
    """
    site = parameters.campaign.site
    study = Study(
        parameters, records, sheet, passes,
        {name: {c.column: c for c in parameters.channels(name)} for name in records},
        {name: sun_track(log.time_ns, site.latitude, site.longitude, site.elevation_m)
         for name, log in records.items()})
    masks = {name: mark(study, name) for name in records}
    compare(study, masks)
    support(study, masks)
    chosen = {p.name: choose(study, p, masks) for p in passes}
    return Quality(masks, chosen, table("checks", study.checks), ledger(study, masks, chosen),
                   waterfall(study, masks, chosen))
