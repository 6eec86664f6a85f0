"""What one section of a campaign cannot see alone: names, paths, dates, limits."""

from __future__ import annotations

import os
import re
from collections.abc import Iterator, Mapping
from pathlib import Path

from surveykit.intake.params.base import Fault, Loc, meant
from surveykit.intake.params.campaign import CAMPAIGN_PATTERN, Campaign
from surveykit.intake.params.heads import Calibration
from surveykit.intake.params.instruments import Instrument
from surveykit.intake.params.paths import path_fault
from surveykit.intake.params.sections import Comparison
from surveykit.intake.params.timekeeping import clock_faults


def cross_faults(
        campaign: Campaign, names: Mapping[str, tuple[str, ...]], path: Path,
        root: Path) -> Iterator[Fault]:
    """Yield the faults between sections of a campaign.

    Parameters
    ----------
    campaign : Campaign
        What is valid of it.
    names : mapping
        The names under `surfaces` and `loggers` and in the `kit`, valid or not; none where they
        are not known.
    path, root : Path
        The parameter file and the project folder.
    """
    if campaign.campaign != path.stem:
        write = f"write {path.stem}, or " if re.match(CAMPAIGN_PATTERN, path.stem) else ""
        yield ("campaign",), f"got {campaign.campaign!r} in the file {path.name}; {write}" \
                             f"name the file {campaign.campaign}.yml"
    yield from _paths(campaign, root)
    loggers, surfaces = names.get("loggers", ()), names.get("surfaces", ())
    yield from clock_faults({name: use.clock for name, use in campaign.loggers.items()}, loggers)
    yield from _comparison(campaign.comparison, surfaces, path, root)
    for index, done in enumerate(campaign.interventions):
        yield from _no_surface(("interventions", index, "surface"), done.surface, surfaces)
    for name in loggers:
        if names["kit"] and name not in names["kit"]:
            yield ("loggers", name), "no such entry in the kit; " + _known(name, names["kit"])
    limit = campaign.settings.temperature.min_emissivity
    for name, surface in campaign.surfaces.items():
        if surface.emissivity is not None and (surface.emissivity.value or 1.0) < limit:
            yield ("surfaces", name, "emissivity", "value"), (
                f"got {surface.emissivity.value:g}; below {limit:g} "
                "(settings.temperature.min_emissivity) no temperature can be given: "
                "write the value of the surface, or leave emissivity out")


def _paths(campaign: Campaign, root: Path) -> Iterator[Fault]:
    kit = campaign.instruments
    if isinstance(kit, str):
        wrong = path_fault(root, kit)
        if not wrong and not os.path.isfile(root / kit):
            wrong = f"got {kit!r}, but there is no such file; write the path of the kit, " \
                    "such as params/instruments.yml"
        if wrong:
            yield ("instruments",), wrong
    wrong = path_fault(root, campaign.data_folder)
    if wrong:
        yield ("data_folder",), wrong
    base = root if wrong else root / campaign.data_folder
    if wrong := path_fault(root, campaign.field_sheet, base):
        yield ("field_sheet",), wrong
    for name, use in campaign.loggers.items():
        for index, pattern in enumerate(use.files):
            if wrong := path_fault(root, pattern, base):
                yield ("loggers", name, "files", index), wrong


def _comparison(
        comparison: Comparison, surfaces: tuple[str, ...], path: Path,
        root: Path) -> Iterator[Fault]:
    named: list[tuple[Loc, str | None]] = [
        (("control",), comparison.control), (("second_control",), comparison.second_control), *(
            (("families", family, index), name) for family, names in comparison.families.items()
            for index, name in enumerate(names))]
    for where, name in named:
        yield from _no_surface(("comparison", *where), name, surfaces)
    if comparison.second_control and not comparison.control:
        yield ("comparison", "second_control"), f"got {comparison.second_control!r} without a " \
            "first to hold it against; write control as well"
    elif comparison.second_control and comparison.second_control == comparison.control:
        yield ("comparison", "second_control"), f"got {comparison.control!r}, which is control " \
            "already; write another surface"
    seen = {os.path.realpath(path): ", this file itself; write an earlier campaign's file"}
    for index, text in enumerate(comparison.earlier):
        target = os.path.realpath(root / text)
        wrong = path_fault(root, text)
        if not wrong and target in seen:
            wrong = f"got {text!r}{seen[target]}"
        elif not wrong and not os.path.isfile(target):
            wrong = f"got {text!r}, but there is no such file; write an earlier campaign's file"
        if wrong:
            yield ("comparison", "earlier", index), wrong
        seen.setdefault(target, " a second time; write it once")


def _no_surface(where: Loc, name: str | None, surfaces: tuple[str, ...]) -> Iterator[Fault]:
    if name is not None and surfaces and name not in surfaces:
        yield where, f"got {name!r}, no surface of this file; " + _known(name, surfaces)


def kit_faults(used: Mapping[str, Instrument], day: str | None) -> Iterator[Fault]:
    """Yield the faults of the entries a campaign of `day` uses.

    A calibration must not come from the campaign's future, and no two channels may share the name
    of an error, or it would cancel between them.
    """
    owners: dict[str, tuple[str, str]] = {}
    for name, instrument in used.items():
        for where, calibration in _calibrations(instrument):
            if day is not None and calibration.date > day:
                yield (name, *where, "date"), (
                    f"got {calibration.date!r}, after the campaign of {day}; write the "
                    "calibration that held on that day (a recalibrated kit is a new file with "
                    "new ids)")
        for channel in instrument.channels(name):
            first = owners.setdefault(channel.gain_scope, (name, channel.column))
            if first != (name, channel.column):
                owner = channel.gain_scope.removesuffix(f":{channel.column}:gain")
                yield (name, "columns", channel.column), (
                    f"shares {owner!r} and its header with a column of {first[0]}, so that their "
                    "errors would cancel; write another calibration id, or serial, in one of them")


def kit_notes(used: Mapping[str, Instrument], day: str) -> Iterator[str]:
    """Yield a note for each calibration that had run out on the campaign's day."""
    for name, instrument in used.items():
        for _, calibration in _calibrations(instrument):
            if calibration.expired_on(day):
                yield (f"{name}: calibration {calibration.id} of {calibration.date} was valid for "
                       f"{calibration.valid_days} days and had run out on {day}")


def _calibrations(instrument: Instrument) -> Iterator[tuple[Loc, Calibration]]:
    if instrument.calibration is not None:
        yield ("calibration",), instrument.calibration
    for header, column in instrument.columns.items():
        if column.calibration is not None:
            yield ("columns", header, "calibration"), column.calibration


def _known(name: str, known: tuple[str, ...]) -> str:
    return f"{meant(name, known)}write one of {', '.join(known)}"
