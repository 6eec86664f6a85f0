"""A finished folder takes the place of the old one whole, whatever stops the process."""

from __future__ import annotations

import ctypes
import errno
import os
import shutil
import sys
from pathlib import Path

AT_FDCWD = -100
RENAME_EXCHANGE = 2
UNSYNCED = {errno.EINVAL, errno.ENOTSUP}  # of storages that cannot sync a folder


STORAGE = {errno.ENOSPC, errno.EDQUOT, errno.EROFS, errno.EACCES, errno.EPERM, errno.EFBIG}
UNTOUCHED = "nothing of an earlier report was touched"


class SwapError(OSError):
    """The system would not rename a folder (a table open elsewhere); both folders are whole."""


def storage(error: OSError) -> str:
    """Return a sentence on something that could not be read or written."""
    where = f"{error.filename}: " if error.filename else ""
    cure = "; make room or give access, then run again" if error.errno in STORAGE else ""
    return f"{where}{error.strerror or error}{cure}; {UNTOUCHED}"


def heal(folder: Path, name: str) -> None:
    """Put right what a stopped swap left: an aside with nothing in its place goes back."""
    place, aside = folder / name, folder / f".{name}.old"
    if not aside.exists():
        return
    if place.exists():
        shutil.rmtree(aside, ignore_errors=True)
    else:
        os.rename(aside, place)


def settle(folder: Path) -> None:
    """Have the system write a folder and all in it to the disk before anything else happens."""
    for path in (*folder.rglob("*"), folder):
        if os.name == "nt" and path.is_dir():
            continue  # folders cannot be opened there
        descriptor = os.open(path, os.O_RDONLY if os.name != "nt" else os.O_RDWR)
        try:
            os.fsync(descriptor)
        except OSError as error:
            if error.errno not in UNSYNCED:
                raise
        finally:
            os.close(descriptor)


def swap_in(folder: Path, name: str) -> None:
    """Let `.name.new` take the place of `name`, the old one gone after; on the disk before.

    Exchanges the two folders in one step where the system offers it; else the old one goes aside
    first, and `heal` puts it back should the process stop between the two steps.

    Raises
    ------
    SwapError
        If a rename is refused; the new folder then still stands as `.name.new`.
    """
    place, new, aside = folder / name, folder / f".{name}.new", folder / f".{name}.old"
    settle(new)
    try:
        if place.exists() and exchange(new, place):
            aside = new
        else:
            if place.exists():
                os.rename(place, aside)
            os.rename(new, place)
    except OSError as error:
        heal(folder, name)
        raise SwapError(
            f"the old report of {name} could not be replaced ({error.strerror}); close what has "
            f"it open. The new one stands in {new.name} beside it") from error
    shutil.rmtree(aside, ignore_errors=True)


def exchange(first: Path, second: Path) -> bool:
    """Exchange two folders in one step; False where the system cannot."""
    if not sys.platform.startswith("linux"):
        return False
    rename = getattr(ctypes.CDLL(None, use_errno=True), "renameat2", None)
    if rename is None:
        return False
    result = rename(AT_FDCWD, os.fsencode(first), AT_FDCWD, os.fsencode(second),
                    ctypes.c_uint(RENAME_EXCHANGE))
    return bool(result == 0)
