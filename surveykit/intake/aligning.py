"""Loggers and field sheet on one time line, with every fault of all of them together."""

from __future__ import annotations

import os
from collections.abc import Callable
from dataclasses import dataclass
from typing import TypeVar

from surveykit.core import InputError
from surveykit.intake.clocks import Clock, check_days, set_clocks
from surveykit.intake.edges import look
from surveykit.intake.fieldsheet import Sheet, read_sheet
from surveykit.intake.loggers import expand_files, read_logger
from surveykit.intake.params import Parameters
from surveykit.intake.passes import Pass, check_coverage, match_passes
from surveykit.intake.records import Records

Made = TypeVar("Made")


@dataclass(frozen=True)
class Ingested:
    """Records in UTC and SI, clocks, field sheet and passes."""

    records: dict[str, Records]
    clocks: tuple[Clock, ...]
    sheet: Sheet
    passes: tuple[Pass, ...]


def read_logs(parameters: Parameters) -> tuple[dict[str, Records], list[str]]:
    """Return every logger's records in its own time, and the faults of those that have some."""
    logs: dict[str, Records] = {}
    faults: list[str] = []
    for name in parameters.campaign.loggers:
        log = gather(faults, lambda name=name: _read_log(parameters, name))  # type: ignore[misc]
        if log is not None:
            logs[name] = log
    return logs, faults


def _read_log(parameters: Parameters, name: str) -> Records:
    try:
        paths = expand_files(parameters.data_folder, parameters.campaign.loggers[name].files)
    except InputError as error:
        raise InputError(*(f"{parameters.relative(parameters.path)}: loggers.{name}.files: {fault}"
                           for fault in error.faults)) from None
    return read_logger(name, parameters.kit[name], paths, parameters.root)


def align(parameters: Parameters, logs: dict[str, Records], faults: list[str],
          doubtful: frozenset[str] = frozenset()) -> Ingested:
    """Set the clocks, read the field sheet, match its passes.

    Parameters
    ----------
    parameters : Parameters
        The campaign and its kit.
    logs : dict
        Records by logger, in the loggers' own times.
    faults : list of str
        What was found so far; more are added.
    doubtful : frozenset of str
        Top-level keys that could not be read and stand for nothing: what leans on them is left.

    Raises
    ------
    InputError
        With all faults.
    """
    sheet = None
    if "field_sheet" not in doubtful:
        sheet = gather(faults, lambda: _sheet(parameters, doubtful))
    placed = not doubtful & {"date", "site"}
    records, clocks = set_clocks(logs, parameters, sheet, placed=placed)
    if placed:
        gather(faults, lambda: check_days(records, parameters))
    if faults or sheet is None:
        raise InputError(*dict.fromkeys(faults))
    known = {clock.logger: clock for clock in clocks}
    passes = match_passes(sheet, parameters, known)
    check_coverage(passes, records, sheet.path)
    passes = look(passes, records, sheet.entries, parameters, known, sheet.path)
    return Ingested(records, clocks, sheet, passes)


def _sheet(parameters: Parameters, doubtful: frozenset[str]) -> Sheet:
    campaign = parameters.campaign
    if not os.path.isfile(parameters.sheet_path):  # also where the name is too long for a file's
        where = parameters.relative(parameters.path)
        raise InputError(f"{where}: field_sheet: no file {campaign.field_sheet!r} in "
                         f"{campaign.data_folder}; write the name of the field sheet")
    return read_sheet(parameters.sheet_path, parameters, doubtful)


def gather(faults: list[str], work: Callable[[], Made]) -> Made | None:
    """Return what `work` gives; where the input is at fault, add its faults and return None."""
    try:
        return work()
    except InputError as error:
        faults += error.faults
        return None
