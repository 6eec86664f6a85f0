"""What can be read of a parameter file at fault, so that logs and sheet are checked as well."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from copy import deepcopy
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path
from typing import Any, TypeVar
from zoneinfo import ZoneInfo

from pydantic import ValidationError

from surveykit.core import InputError
from surveykit.intake.params.base import NAME_PATTERN
from surveykit.intake.params.campaign import Campaign, Parameters
from surveykit.intake.params.instruments import Instrument, zone_fault
from surveykit.intake.params.loading import display_name, load
from surveykit.intake.params.messages import keys_of, written
from surveykit.intake.params.paths import find_root, path_fault
from surveykit.intake.params.reading import read_document
from surveykit.intake.params.settings import Settings

Model = TypeVar("Model")
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
    doubtful: frozenset[str]


def load_partly(path: Path | str) -> Partly:
    """Return the parameters of one campaign, with every fault in place of an exception."""
    path = Path(path).absolute()
    try:
        return Partly(load(path), (), frozenset())
    except InputError as error:
        faults = error.faults
    try:
        root = find_root(path.parent)
        data = deepcopy(read_document(path, display_name(path, root)).data)
        kit = _kit_data(data.get("instruments"), root)
    except InputError:
        return Partly(None, faults, frozenset())
    doubtful: set[str] = set()
    named = set(data["loggers"]) if isinstance(data.get("loggers"), Mapping) else set()
    campaign = _mended(lambda: Campaign.model_validate(_filled(data, path, doubtful)), data)
    if campaign is None or path_fault(root, campaign.data_folder):
        return Partly(None, faults, frozenset())
    entries = {}
    for name in campaign.loggers:
        entry = _instrument(kit.get(name), campaign.settings)
        if entry is not None:
            entries[name] = entry
    base = root / campaign.data_folder
    usable = {name: use for name, use in campaign.loggers.items() if name in entries
              and not any(path_fault(root, pattern, base) for pattern in use.files)}
    if usable.keys() != named or any(entry.columns.keys() != kit[name]["columns"].keys()
                                     for name, entry in entries.items()):
        doubtful.add("loggers")
    if path_fault(root, campaign.field_sheet, base):
        doubtful.add("field_sheet")
    campaign = campaign.model_copy(update={"loggers": usable})
    return Partly(Parameters(path, root, campaign, entries, None, (path,)), faults,
                  frozenset(doubtful))


def _kit_data(stated: Any, root: Path) -> dict[str, Any]:
    if isinstance(stated, Mapping):
        return deepcopy(dict(stated))
    if not isinstance(stated, str) or path_fault(root, stated):
        return {}
    return read_document(root / stated, stated).data


def _filled(data: dict[str, Any], path: Path, doubtful: set[str]) -> dict[str, Any]:
    """Fill in what is missing and not needed to read the files; note what is then doubtful."""
    data |= {"campaign": path.stem, "instruments": "params/instruments.yml"}
    data.setdefault("title", path.stem)
    for key in ("comparison", "conditions", "settings"):
        if not isinstance(data.get(key), Mapping):
            data.pop(key, None)
    if not data.get("date"):
        doubtful.add("date")
        data["date"] = _DAY
    site = data["site"] if isinstance(data.get("site"), dict) else {}
    zone = site.get("time_zone")
    if not isinstance(zone, str) or zone_fault(zone):
        doubtful.add("site")
        site["time_zone"] = zone = "UTC"
    offset = datetime(2025, 1, 1, tzinfo=ZoneInfo(zone)).utcoffset()
    east = offset.total_seconds() / 240 if offset else 0.0
    data["site"] = {"name": path.stem, "latitude": 0.0, "elevation_m": 0.0,
                    "longitude": (east + 180) % 360 - 180} | site
    if not data.get("surfaces"):
        data["surfaces"] = {"unknown": {"label": "unknown"}}
        doubtful.add("surfaces")
    if isinstance(data["surfaces"], dict):
        for name, surface in data["surfaces"].items():
            known = surface if isinstance(surface, dict) else {}
            data["surfaces"][name] = known | {"label": known.get("label") or "unknown"}
        if not all(isinstance(name, str) and re.match(NAME_PATTERN, name)
                   for name in data["surfaces"]):
            doubtful.add("surfaces")
    if not data.get("field_sheet"):
        doubtful.add("field_sheet")
        data["field_sheet"] = "unknown"
    return data


def _instrument(entry: Any, settings: Settings) -> Instrument | None:
    if not isinstance(entry, Mapping) or not isinstance(entry.get("columns"), Mapping):
        return None
    data = deepcopy(dict(entry))
    if data.get("t95_s") is None:
        data.setdefault("time_constant_s", 0.0)
    return _mended(lambda: Instrument.model_validate(data, context={"settings": settings}), data)


def _mended(read: Callable[[], Model], data: dict[str, Any]) -> Model | None:
    """Read data, taking out what is at fault until the rest is none; None if nothing is left."""
    for _ in range(_ROUNDS):
        try:
            return read()
        except ValidationError as error:
            places = [written(keys_of(item["loc"]), data)
                      for item in error.errors(include_url=False)]
            *above, last = max(places, key=len) or (None,)
            if last is None:
                return None
            holder: Any = data
            for part in above:
                holder = holder[part]
            del holder[last]
    return None
