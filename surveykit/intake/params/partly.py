"""All faults of a parameter file and of its kit, and what can be read of them nevertheless."""

from __future__ import annotations

import os
import re
from collections.abc import Callable, Mapping
from copy import deepcopy
from dataclasses import dataclass, field
from datetime import datetime
from pathlib import Path
from typing import Any, TypeVar
from zoneinfo import ZoneInfo

from pydantic import TypeAdapter, ValidationError

from surveykit.core import InputError
from surveykit.intake.params.base import NAME_PATTERN, Fault
from surveykit.intake.params.campaign import Campaign, Kit, Parameters
from surveykit.intake.params.checks import cross_faults, kit_faults, kit_notes
from surveykit.intake.params.instruments import Instrument, zone_fault
from surveykit.intake.params.messages import located, model_faults, place_of, under
from surveykit.intake.params.paths import display_name, path_fault, root_of
from surveykit.intake.params.reading import Document, read_document
from surveykit.intake.params.settings import Settings

Model = TypeVar("Model", Campaign, Instrument)
_KIT: TypeAdapter[dict[str, Instrument]] = TypeAdapter(Kit)
_ROUNDS = 60
_DAY = "2000-01-01"


@dataclass(frozen=True)
class Partly:
    """The faults of a parameter file and of its kit, and what else can be read nevertheless.

    `parameters` is None where not even the place of the raw files is known. `doubtful` are the
    top-level keys of which something stands for nothing; no number may be made of such parameters.
    """

    parameters: Parameters | None
    faults: tuple[str, ...]
    doubtful: frozenset[str] = frozenset()


def load_partly(path: Path | str, root: Path | None = None) -> Partly:
    """Return the parameters of one campaign, with every fault in place of an exception.

    `root` is the project folder; it is found from the file upwards where it is not given.
    """
    path = Path(path).absolute()
    try:
        root = root_of(path, root)
        document = read_document(path, display_name(path, root))
    except InputError as error:
        return Partly(None, error.faults)
    if is_kit(document.data):
        return Partly(None, (f"{document.name}: is a kit of instruments, not a campaign; "
                             "name a campaign's parameter file",))
    return _checked(document, path, root)


def is_kit(data: Any) -> bool:
    """Return whether plain data are an instruments file: no campaign, entries with columns.

    Examples
    --------
    >>> is_kit({"thermal": {"columns": {}, "time": {}}}), is_kit({"campaign": "x"})
    (True, False)
    """
    return (isinstance(data, Mapping) and "campaign" not in data
            and any(isinstance(entry, Mapping) and "columns" in entry for entry in data.values()))


def read_kit(
        document: Document, settings: Settings) -> tuple[dict[str, Instrument], list[Fault]]:
    """Return what can be read of an instruments file, and its faults."""
    if "campaign" in document.data:
        return {}, [((), "is a campaign's parameter file, not a kit; write the path of the kit, "
                     "such as params/instruments.yml")]
    try:
        return _KIT.validate_python(document.data, context={"settings": settings}), [
            *document.faults]
    except ValidationError as error:
        return _entries(document.data, settings), [
            *document.faults, *model_faults(error, Kit, document.data, document.refused)]


@dataclass(frozen=True)
class _Kit:
    """The kit of a campaign: what can be read of it, as it was written, and its faults."""

    entries: dict[str, Instrument] = field(default_factory=dict)
    written: Mapping[str, Any] = field(default_factory=dict)
    faults: tuple[Fault, ...] = ()
    document: Document | None = None  # absent: it stands in the campaign's file
    path: Path | None = None
    unreadable: tuple[str, ...] = ()


def _checked(document: Document, path: Path, root: Path) -> Partly:
    data, doubtful = document.data, set[str]()
    settings = _settings(data.get("settings"))
    campaign, wrong = _campaign(document, settings, doubtful)
    if campaign is None:
        return Partly(None, tuple(located(document, [*document.faults, *wrong])))
    kit = _find_kit(data.get("instruments"), root, settings)
    at_fault = {*document.refused, *(where for where, _ in wrong),
                *((key,) for key in doubtful & {"campaign", "instruments"})}
    names = {key: tuple(data[key]) for key in ("surfaces", "loggers")
             if isinstance(data.get(key), Mapping)} | {"kit": tuple(kit.written)}
    wrong += [(where, text) for where, text in cross_faults(campaign, names, path, root)
              if not under(where, at_fault)]
    bad = {where[0] for where, _ in kit.faults if where} | {
        where[1] for where in at_fault if where[0] == "instruments" and where[1:]}
    used = {name: kit.entries[name] for name in names.get("loggers", ())
            if name in kit.entries and name not in bad}
    found = [*kit_faults(used, None if "date" in doubtful else campaign.date)]
    sentences = [*kit.unreadable]
    if kit.document is None:
        wrong += ((("instruments", *where), text) for where, text in found)
    else:
        sentences += located(kit.document, [*kit.faults, *found])
    faults = tuple(dict.fromkeys([*located(document, [*document.faults, *wrong]), *sentences]))
    if faults:
        campaign = _usable(campaign, data, kit, root, doubtful)
    if "data_folder" in doubtful or path_fault(root, campaign.data_folder):
        return Partly(None, faults)
    notes = () if faults else tuple(dict.fromkeys(kit_notes(used, campaign.date)))
    files = (path,) if kit.path is None else (path, kit.path)
    return Partly(Parameters(path, root, campaign, kit.entries, kit.path, files, notes),
                  faults, frozenset(doubtful))


def _campaign(document: Document, settings: Settings,
              doubtful: set[str]) -> tuple[Campaign | None, list[Fault]]:
    try:
        return Campaign.model_validate(document.data, context={"settings": settings}), []
    except ValidationError as error:
        wrong = model_faults(error, Campaign, document.data, document.refused)
    return _mended(Campaign, document.data, settings, lambda data: _fill(data, doubtful)), wrong


def _settings(raw: Any) -> Settings:
    try:
        return Settings.model_validate(raw or {})
    except ValidationError:
        return Settings()


def _find_kit(stated: Any, root: Path, settings: Settings) -> _Kit:
    if isinstance(stated, Mapping):
        return _Kit(_entries(stated, settings), stated)
    if not isinstance(stated, str) or path_fault(root, stated) or not os.path.isfile(root / stated):
        return _Kit()  # the cross checks say so
    path = root / stated
    try:
        document = read_document(path, display_name(path, root))
    except InputError as error:
        return _Kit(unreadable=error.faults)
    entries, faults = read_kit(document, settings)
    written = {} if "campaign" in document.data else document.data
    return _Kit(entries, written, tuple(faults), document, path)


def _usable(campaign: Campaign, data: Mapping[str, Any], kit: _Kit, root: Path,
            doubtful: set[str]) -> Campaign:
    """Return a campaign at fault with the loggers whose files can be read."""
    base = root / campaign.data_folder
    usable = {name: use for name, use in campaign.loggers.items() if name in kit.entries
              and not any(path_fault(root, pattern, base) for pattern in use.files)}
    named = data.get("loggers")
    if usable.keys() != (set(named) if isinstance(named, Mapping) else set()) or any(
            kit.entries[name].columns.keys() != kit.written[name]["columns"].keys()
            for name in usable):
        doubtful.add("loggers")
    if path_fault(root, campaign.field_sheet, base):
        doubtful.add("field_sheet")
    return campaign.model_copy(update={"loggers": usable})


def _entries(written: Mapping[str, Any], settings: Settings) -> dict[str, Instrument]:
    mended = {name: _mended(Instrument, entry, settings, _fill_entry)
              for name, entry in written.items()}
    return {name: entry for name, entry in mended.items() if entry is not None}


def _mended(model: type[Model], written: Any, settings: Settings,
            fill: Callable[[dict[str, Any]], None]) -> Model | None:
    """Read data, taking out what is at fault until the rest is none; None if nothing is left."""
    data = deepcopy(written)
    for _ in range(_ROUNDS):
        if not isinstance(data, dict):
            return None
        fill(data)
        try:
            return model.model_validate(data, context={"settings": settings})
        except ValidationError as error:
            places = {place_of(item["loc"], model, data).path for item in error.errors()}
        for path in sorted(places, key=len, reverse=True):
            numbers = [n for n, part in enumerate(path) if isinstance(part, int)]
            *above, last = path[:numbers[0]] if numbers else path or (None,)
            if last is None:
                return None
            holder: Any = data  # a list at fault goes as a whole: its other entries keep no place
            for part in above:
                holder = holder[part]
            holder.pop(last, None)
    return None


def _fill(data: dict[str, Any], doubtful: set[str]) -> None:
    """Fill in what is missing and not needed to read the files; note what is then doubtful."""
    data["title"] = data.get("title") or "unknown"
    stand_ins: dict[str, Any] = {
        "campaign": "unknown", "date": _DAY, "instruments": "unknown", "data_folder": "unknown",
        "field_sheet": "unknown", "loggers": {"unknown": {"files": "unknown"}},
        "surfaces": {"unknown": {"label": "unknown"}}}
    for key, value in stand_ins.items():
        if not data.get(key):
            doubtful.add(key)
            data[key] = value
    site = data["site"] if isinstance(data.get("site"), dict) else {}
    zone = site.get("time_zone")
    if not isinstance(zone, str) or zone_fault(zone):
        doubtful.add("site")
        site["time_zone"] = zone = "UTC"
    offset = datetime(2025, 1, 1, tzinfo=ZoneInfo(zone)).utcoffset()
    east = offset.total_seconds() / 240 if offset else 0.0
    data["site"] = {"name": "unknown", "latitude": 0.0, "elevation_m": 0.0,
                    "longitude": (east + 180) % 360 - 180} | site
    if isinstance(data["surfaces"], dict):
        for name, surface in data["surfaces"].items():
            known = surface if isinstance(surface, dict) else {}
            data["surfaces"][name] = known | {"label": known.get("label") or "unknown"}
        if not all(re.match(NAME_PATTERN, name) for name in data["surfaces"]):
            doubtful.add("surfaces")


def _fill_entry(data: dict[str, Any]) -> None:
    if data.get("t95_s") is None and data.get("time_constant_s") is None:
        data["time_constant_s"] = 0.0
