"""The project folder, and paths that stay inside it."""

from __future__ import annotations

import os
import re
import unicodedata
from pathlib import Path, PurePosixPath

from surveykit.core import InputError
from surveykit.intake.params.reading import read_text


def find_root(start: Path) -> Path:
    """Return the folder that holds params/ and notebooks/, from `start` upwards, else from here.

    Raises
    ------
    InputError
        If neither way leads to one.
    """
    for origin in (Path(start), Path.cwd()):
        for folder in (origin.resolve(), *origin.resolve().parents):
            if (folder / "params").is_dir() and (folder / "notebooks").is_dir():
                return folder
    raise InputError(f"{start}: no project folder: no folder above it, nor above {Path.cwd()}, "
                     "holds params/ and notebooks/; work from a clone of the project")


def root_of(path: Path, root: Path | None = None) -> Path:
    """Return the project folder of a parameter file: `root`, else found from the file upwards.

    Raises
    ------
    InputError
        If there is none, or no such file.
    """
    try:
        return Path(root).resolve() if root is not None else find_root(path.parent)
    except InputError:
        read_text(path, str(path))  # a missing file is the fault to tell first
        raise
    except (OSError, ValueError, RuntimeError):
        raise InputError(f"{path}: cannot be read; check the name") from None


def display_name(path: Path, root: Path) -> str:
    """Return how a file is called in messages: from the project folder where it lies inside."""
    try:
        name = path.resolve().relative_to(root.resolve()).as_posix()
    except (ValueError, OSError, RuntimeError):
        name = str(path)
    return name if name.isprintable() else repr(name)


def outside_allowed() -> bool:
    """Return whether parameter files may name files outside the project folder.

    The option --allow-outside says so, by SURVEYKIT_ALLOW_OUTSIDE=1 in the environment, which
    kernels and workers inherit and which no parameter file can set.
    """
    return os.environ.get("SURVEYKIT_ALLOW_OUTSIDE") == "1"


def path_fault(root: Path, text: str, base: Path | None = None) -> str | None:
    """Return what is wrong with a path the user wrote, None if it stays inside `root`.

    `base` is the folder it is relative to, `root` itself where absent.
    """
    shown = repr(text[:80])
    if not text.strip() or any(unicodedata.category(c) == "Cc" for c in text):
        return f"got {shown}; write a path inside the project folder"
    if outside_allowed():
        return None
    if "\\" in text:
        return f"got {shown}; write the path with forward slashes"
    path = PurePosixPath(text)
    if path.is_absolute() or re.match(r"[A-Za-z]:", text) or text.startswith("~"):
        return f"got {shown}; write a path relative to the project folder, not an absolute one"
    if ".." in path.parts:
        return f"got {shown}; write a path inside the project folder, without .."
    try:
        inside_root = ((base or root) / path).resolve().is_relative_to(root.resolve())
    except (OSError, RuntimeError, ValueError):
        return f"got {shown}, which cannot be followed; write a path inside the project folder"
    if not inside_root:
        return f"got {shown}, a link that leads out of the project folder; write a path inside it"
    return None
