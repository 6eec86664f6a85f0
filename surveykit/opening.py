"""A campaign opened: its parameters, its input files with their hashes, and where results go."""

from __future__ import annotations

import hashlib
import os
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cache, cached_property
from pathlib import Path
from typing import Any

from surveykit.core import InputError
from surveykit.handover import sha256
from surveykit.intake.loggers import expand_files
from surveykit.intake.params import (
    Campaign,
    Parameters,
    find_root,
    load,
    read_plain,
    refuse_other_sections,
)
from surveykit.intake.params.paths import outside_allowed
from surveykit.statistics.draws import Draws

SECTIONS = tuple(Campaign.model_fields)


@cache
def code_digest() -> str:
    """Return a hash of the package's files: edited ones never meet results they did not make."""
    digest = hashlib.sha256()
    package = Path(__file__).parent
    for path in sorted(package.rglob("*")):
        if path.is_file() and "__pycache__" not in path.parts:
            digest.update(path.relative_to(package).as_posix().encode() + b"\0"
                          + path.read_bytes())
    return digest.hexdigest()


@dataclass(frozen=True)
class Survey:
    """One campaign opened: parameters, where results go, and the inputs with their hashes.

    `made` keeps what a stage made, so that nothing is read or computed twice in one process.
    """

    parameters: Parameters
    run_folder: Path
    inputs: tuple[dict[str, Any], ...]
    made: dict[str, Any] = field(default_factory=dict, compare=False, repr=False)

    @cached_property
    def key(self) -> str:
        """Hash of all inputs and of the package's code; results of another key are not used."""
        digest = hashlib.sha256(code_digest().encode())
        for item in self.inputs:
            digest.update(f"{item['path']}\0{item['sha256']}\0".encode())
        return digest.hexdigest()

    @property
    def campaign(self) -> Campaign:
        """The campaign's part of the parameters."""
        return self.parameters.campaign

    def draws(self) -> Draws:
        """Return the shared draws of this study."""
        statistics = self.campaign.settings.statistics
        return Draws(statistics.seed, statistics.draws)


def open_survey(names: Mapping[str, Any]) -> Survey:
    """Open the campaign that a notebook's parameters name.

    Parameters
    ----------
    names : mapping
        The notebook's globals: either every section as papermill handed it over, or `params_file`;
        `run_folder` may be None. Where `planned` is true, files of the day need not be there yet.

    Raises
    ------
    InputError
        If the file is at fault, or the sections differ from the file of their campaign.
    """
    sections = {key: names[key] for key in SECTIONS if names.get(key) is not None}
    here = Path.cwd()
    if sections:
        name = sections.get("campaign")
        if not isinstance(name, str):
            raise InputError("parameters: sections were handed over without the key campaign; "
                             "hand over a whole parameter file (-f) or params_file alone")
        path = find_root(here) / "params" / f"{name}.yml"
        if not path.is_file():
            raise InputError(f"parameters: campaign {name!r} has no file params/{name}.yml; "
                             "a parameter file is named as its campaign and lies in params/")
        refuse_other_sections(sections, read_plain(path), path)
    else:
        path = Path(str(names["params_file"]))
        if not path.is_absolute() and not path.exists():
            path = find_root(here) / path
    return open_file(path, run_folder=names.get("run_folder"),
                     planned=names.get("planned") is True)


def open_file(path: Path, run_folder: str | Path | None = None, *,
              planned: bool = False) -> Survey:
    """Open a campaign by its parameter file; see `open_survey`.

    Raises
    ------
    InputError
        If the parameters, the kit, or a named file is at fault.
    """
    parameters = load(path)
    root, campaign = parameters.root, parameters.campaign
    files = [*parameters.files, parameters.sheet_path]
    faults: list[str] = []
    if not parameters.sheet_path.is_file():
        faults.append(f"{_shown(path, root)}: field_sheet: no file {campaign.field_sheet!r} in "
                      f"{campaign.data_folder}; write the name of the field sheet")
    for name, use in campaign.loggers.items():
        try:
            files += expand_files(parameters.data_folder, use.files)
        except InputError as error:
            faults += [f"{_shown(path, root)}: loggers.{name}.files: {f}" for f in error.faults]
    files = [file for file in files if file.is_file()]
    faults = [] if planned else faults
    faults += [f"{_shown(path, root)}: {file.name} is a link that leads out of the project folder; "
               "copy the file" for file in files[1:] if not outside_allowed()
               and not file.resolve().is_relative_to(root.resolve())]
    if faults:
        raise InputError(*faults)
    inputs = tuple({"path": _shown(file, root), "bytes": file.stat().st_size,
                    "sha256": sha256(file)} for file in files)
    folder = Path(run_folder) if run_folder else root / ".surveykit" / campaign.campaign
    return Survey(parameters, folder, inputs)


def _shown(path: Path, root: Path) -> str:
    return Path(os.path.relpath(path.resolve(), root.resolve())).as_posix()
