"""From a parameter file to checked parameters: all faults of it and of its kit at once."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from pydantic import TypeAdapter, ValidationError, create_model

from surveykit.core import InputError
from surveykit.intake.params.base import Fault, Loc, Strict
from surveykit.intake.params.campaign import Campaign, Kit, Parameters
from surveykit.intake.params.checks import cross_faults, kit_faults, kit_notes
from surveykit.intake.params.instruments import Instrument
from surveykit.intake.params.messages import located, model_faults
from surveykit.intake.params.paths import find_root, path_fault
from surveykit.intake.params.reading import Document, read_document, read_text
from surveykit.intake.params.sections import LoggerUse, Surface
from surveykit.intake.params.settings import Settings

_KIT: TypeAdapter[dict[str, Instrument]] = TypeAdapter(Kit)


def load(path: Path | str, root: Path | None = None) -> Parameters:
    """Return the parameters of one campaign with its kit, checked.

    Parameters
    ----------
    path : Path or str
        The parameter file.
    root : Path, optional
        The project folder; found from the file upwards where it is not given.

    Raises
    ------
    InputError
        With every fault of the parameter file and of its kit, located.
    """
    path = Path(path).absolute()
    root = _root(path, root)
    return _parameters(read_document(path, display_name(path, root)), path, root)


def load_kit(path: Path | str, root: Path | None = None) -> dict[str, Instrument]:
    """Return the entries of an instruments file, checked alone.

    Raises
    ------
    InputError
        With every fault, located.
    """
    document = _read_alone(Path(path), root)
    kit, faults = _kit(document, Settings())
    if faults:
        raise InputError(*located(document, faults))
    return kit


def read_plain(path: Path | str, root: Path | None = None) -> dict[str, Any]:
    """Return a parameter file as plain data, read strictly but not validated.

    Raises
    ------
    InputError
        If the file is not strict YAML.
    """
    document = _read_alone(Path(path), root)
    if document.faults:
        raise InputError(*located(document, document.faults))
    return document.data


def refuse_other_sections(
        handed: Mapping[str, Any], plain: Mapping[str, Any], path: Path) -> None:
    """Refuse sections that differ from those of the file they are said to come from.

    A runner that reads YAML its own way loses a duplicate key, 0120 and 12:30. `handed` is its
    reading of the top-level keys, `plain` that of `read_plain`; None counts as absent.

    Raises
    ------
    InputError
        Naming each top-level key that differs.
    """
    name = f"{path.parent.name}/{path.name}"
    odd = [key for key in sorted({*plain, *handed}) if plain.get(key) != handed.get(key)]
    if odd:
        raise InputError(*(f"{name}: {key}: the notebook was handed another value than the file "
                           "holds; run it with the file unchanged, or edit the file"
                           for key in odd))


def is_kit(data: Any) -> bool:
    """Return whether plain data are an instruments file: no campaign, entries with columns.

    Examples
    --------
    >>> is_kit({"thermal": {"columns": {}, "time": {}}}), is_kit({"campaign": "x"})
    (True, False)
    """
    return (isinstance(data, Mapping) and bool(data) and "campaign" not in data
            and any(isinstance(entry, Mapping) and "columns" in entry for entry in data.values())
            and all(isinstance(entry, Mapping) for entry in data.values()))


def is_kit_file(path: Path | str) -> bool:
    """Return whether a file is an instruments file; False also where it cannot be read.

    Faults are left to `load` and `load_kit`, which tell all of them together.
    """
    try:
        return is_kit(_read_alone(Path(path), None).data)
    except InputError:
        return False


def _read_alone(path: Path, root: Path | None) -> Document:
    try:
        root = _root(path, root)
    except InputError:
        root = path.parent
    return read_document(path, display_name(path, root))


def display_name(path: Path, root: Path) -> str:
    """Return how a file is called in messages: from the project folder where it lies inside."""
    try:
        name = path.resolve().relative_to(root.resolve()).as_posix()
    except (ValueError, OSError, RuntimeError):
        name = str(path)
    return name if name.isprintable() else repr(name)


def _root(path: Path, root: Path | None) -> Path:
    try:
        if root is not None:
            return Path(root).resolve()
        try:
            return find_root(path.parent)
        except InputError:
            read_text(path, str(path))  # a missing file is the fault to tell first
            raise
    except (OSError, ValueError, RuntimeError):
        raise InputError(f"{path}: cannot be read; check the name") from None


@dataclass
class _Kit:
    entries: dict[str, Instrument] = field(default_factory=dict)
    names: tuple[str, ...] | None = None
    document: Document | None = None
    path: Path | None = None
    prefix: tuple[str, ...] = ()


def _parameters(document: Document, path: Path, root: Path) -> Parameters:
    if is_kit(document.data):
        raise InputError(f"{document.name}: is a kit of instruments, not a campaign; "
                         "name a campaign's parameter file")
    data = document.data
    faults = list(document.faults)
    marked = document.refused
    settings = _settings(data.get("settings"))
    context = {"settings": settings}
    campaign = None
    try:
        campaign = Campaign.model_validate(data, context=context)
        sections = {key: getattr(campaign, key) for key in Campaign.model_fields}
    except ValidationError as error:
        faults += model_faults(error, Campaign, data, marked)
        bad = {item["loc"][0] for item in error.errors() if item["loc"]}
        sections = dict(_valid_sections(data, bad, context))
    sentences: list[str] = []
    kit = _find_kit(data, sections, root, settings, sentences)
    names = {key: tuple(map(str, data[key])) for key in ("surfaces", "loggers")
             if isinstance(data.get(key), Mapping)}
    if kit.names is not None:
        names["kit"] = kit.names
    faults += _new(cross_faults(sections, names, path, root), marked)
    used = {name: kit.entries[name] for name in names.get("loggers", ()) if name in kit.entries}
    day = sections.get("date")
    found = [((*kit.prefix, *where), text) for where, text in kit_faults(used, day)]
    if kit.document is None:
        faults += found
    else:
        sentences += located(kit.document, found)
    sentences = [*located(document, faults), *sentences]
    if sentences or campaign is None:
        raise InputError(*dict.fromkeys(sentences))
    notes = tuple(dict.fromkeys(kit_notes(used, campaign.date)))
    files = (path,) if kit.path is None else (path, kit.path)
    return Parameters(path=path, root=root, campaign=campaign, kit=kit.entries,
                      kit_path=kit.path, files=files, notes=notes)


def _new(faults: Iterator[Fault], marked: tuple[Loc, ...]) -> list[Fault]:
    return [(where, text) for where, text in faults
            if not any(where[:n] in marked for n in range(1, len(where) + 1))]


def _settings(raw: Any) -> Settings:
    try:
        return Settings.model_validate(raw or {})
    except ValidationError:
        return Settings()


def _valid_sections(
        data: dict[str, Any], bad: set[Any], context: dict[str, Any]) -> Iterator[tuple[str, Any]]:
    fields: dict[str, Any] = {
        key: (info.annotation, info) for key, info in Campaign.model_fields.items()
        if data.get(key) is not None and key not in bad}
    part = create_model("Part", __base__=Strict, **fields)
    valid = part.model_validate({key: data[key] for key in fields}, context=context)
    yield from ((key, getattr(valid, key)) for key in fields)
    for key, model in (("surfaces", Surface), ("loggers", LoggerUse), ("instruments", Instrument)):
        if key in bad and isinstance(data.get(key), Mapping):
            yield key, _valid_entries(model, data[key], context)


def _valid_entries(
        model: type[Strict], raw: Mapping[str, Any], context: dict[str, Any]) -> dict[str, Any]:
    entries = {}
    for name, entry in raw.items():
        try:
            entries[name] = model.model_validate(entry, context=context)
        except ValidationError:
            continue
    return entries


def _find_kit(data: dict[str, Any], sections: Mapping[str, Any], root: Path, settings: Settings,
              sentences: list[str]) -> _Kit:
    raw = data.get("instruments")
    if isinstance(raw, Mapping):
        return _Kit(sections.get("instruments", {}), tuple(map(str, raw)), prefix=("instruments",))
    text = sections.get("instruments")
    if text is None:
        return _Kit()
    path = root / text
    if path_fault(root, text) or not path.is_file():
        return _Kit()  # the cross checks say so
    try:
        document = read_document(path, display_name(path, root))
    except InputError as error:
        sentences += error.faults
        return _Kit()
    kit, faults = _kit(document, settings)
    sentences += located(document, faults)
    names = None if "campaign" in document.data else tuple(document.data)
    return _Kit(kit, names, document, path)


def _kit(document: Document, settings: Settings) -> tuple[dict[str, Instrument], list[Fault]]:
    if "campaign" in document.data:
        return {}, [((), "is a campaign's parameter file, not a kit; write the path of the kit, "
                     "such as params/instruments.yml")]
    context = {"settings": settings}
    try:
        kit = _KIT.validate_python(document.data, context=context)
    except ValidationError as error:
        found = model_faults(error, Kit, document.data, document.refused)
        return _valid_entries(Instrument, document.data, context), [*document.faults, *found]
    return kit, list(document.faults)
