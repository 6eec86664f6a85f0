"""What one section of a campaign cannot see alone: names, paths, dates, limits."""

from __future__ import annotations

import difflib
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

from surveykit.intake.params.base import Fault, Loc
from surveykit.intake.params.heads import Calibration
from surveykit.intake.params.instruments import Instrument
from surveykit.intake.params.paths import path_fault
from surveykit.intake.params.sections import Comparison, LoggerUse, Surface
from surveykit.intake.params.settings import Settings
from surveykit.intake.params.timekeeping import clock_faults


def cross_faults(
        sections: Mapping[str, Any], names: Mapping[str, tuple[str, ...]], path: Path,
        root: Path) -> Iterator[Fault]:
    """Yield the faults between sections of a campaign.

    Parameters
    ----------
    sections : mapping
        The valid top-level sections by key; what is at fault itself is absent.
    names : mapping
        The names under `surfaces` and `loggers` and in the `kit`, valid or not; a name absent from
        this mapping is not checked.
    path, root : Path
        The parameter file and the project folder.
    """
    campaign = sections.get("campaign")
    if campaign is not None and campaign != path.stem:
        yield ("campaign",), f"got {campaign!r} in the file {path.name}; write {path.stem}, " \
                             f"or name the file {campaign}.yml"
    yield from _paths(sections, root)
    loggers: dict[str, LoggerUse] = sections.get("loggers", {})
    yield from clock_faults({name: use.clock for name, use in loggers.items()},
                            names.get("loggers", ()))
    comparison: Comparison | None = sections.get("comparison")
    if comparison is not None:
        yield from _comparison(comparison, names.get("surfaces", ()), path, root)
    for index, done in enumerate(sections.get("interventions", ())):
        yield from _no_surface(("interventions", index, "surface"), done.surface,
                               names.get("surfaces", ()))
    if "kit" in names:
        for name in names.get("loggers", ()):
            if name not in names["kit"]:
                yield ("loggers", name), "no such entry in the kit; " \
                    + _known("write one of", name, names["kit"])
    settings: Settings | None = sections.get("settings")
    surfaces: dict[str, Surface] = sections.get("surfaces", {})
    for name, surface in surfaces.items():
        limit = (settings or Settings()).temperature.min_emissivity
        if surface.emissivity is not None and (surface.emissivity.value or 1.0) < limit:
            yield ("surfaces", name, "emissivity", "value"), (
                f"got {surface.emissivity.value:g}; below {limit:g} "
                "(settings.temperature.min_emissivity) no temperature can be given: "
                "write the value of the surface, or leave emissivity out")


def _paths(sections: Mapping[str, Any], root: Path) -> Iterator[Fault]:
    kit = sections.get("instruments")
    if isinstance(kit, str):
        wrong = path_fault(root, kit)
        if not wrong and not (root / kit).is_file():
            wrong = f"got {kit!r}, but there is no such file; write the path of the kit, " \
                    "such as params/instruments.yml"
        if wrong:
            yield ("instruments",), wrong
    folder = sections.get("data_folder")
    wrong = path_fault(root, folder) if folder is not None else None
    if wrong:
        yield ("data_folder",), wrong
    base = root if folder is None or wrong else root / folder
    sheet = sections.get("field_sheet")
    if sheet is not None and (wrong := path_fault(root, sheet, base)):
        yield ("field_sheet",), wrong
    loggers: dict[str, LoggerUse] = sections.get("loggers", {})
    for name, use in loggers.items():
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
    if comparison.second_control and comparison.second_control == comparison.control:
        yield ("comparison", "second_control"), f"got {comparison.control!r}, which is control " \
            "already; write another surface"
    seen: set[Path] = set()
    for index, text in enumerate(comparison.earlier):
        here: Loc = ("comparison", "earlier", index)
        wrong = path_fault(root, text)
        if wrong:
            yield here, wrong
            continue
        target = (root / text).resolve()
        if target == path.resolve():
            yield here, f"got {text!r}, this file itself; write an earlier campaign's file"
        elif target in seen:
            yield here, f"got {text!r} a second time; write it once"
        elif not target.is_file():
            yield here, f"got {text!r}, but there is no such file; write an earlier campaign's file"
        seen.add(target)


def _no_surface(where: Loc, name: str | None, surfaces: tuple[str, ...]) -> Iterator[Fault]:
    if name is not None and surfaces and name not in surfaces:
        yield where, f"got {name!r}, no surface of this file; " \
            + _known("write one of", name, surfaces)


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


def _known(words: str, name: str, known: tuple[str, ...]) -> str:
    close = difflib.get_close_matches(name, known, 1, 0.6)
    hint = f"did you mean {close[0]}? " if close else ""
    return f"{hint}{words} {', '.join(known)}"
