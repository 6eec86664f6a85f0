"""From a parameter file to checked parameters: all faults of it and of its kit at once."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

from surveykit.core import InputError
from surveykit.intake.params.campaign import Parameters
from surveykit.intake.params.instruments import Instrument
from surveykit.intake.params.messages import located
from surveykit.intake.params.partly import is_kit, load_partly, read_kit
from surveykit.intake.params.paths import display_name, root_of
from surveykit.intake.params.reading import Document, read_document
from surveykit.intake.params.settings import Settings


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
    known = load_partly(path, root)
    if known.faults or known.parameters is None:
        raise InputError(*known.faults)
    return known.parameters


def load_kit(path: Path | str, root: Path | None = None) -> dict[str, Instrument]:
    """Return the entries of an instruments file, checked alone.

    Raises
    ------
    InputError
        With every fault, located.
    """
    document = _read_alone(Path(path), root)
    kit, faults = read_kit(document, Settings())
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
        root = root_of(path, root)
    except InputError:
        root = path.parent
    return read_document(path, display_name(path, root))
