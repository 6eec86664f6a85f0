"""One run of a campaign at a time: locks that the system itself lets go.

A lock is held by an open file, not by a file that exists: when its process is gone, however it
went, and every kernel that inherited it, the lock is free. So a stale one cannot be.
"""

from __future__ import annotations

import errno
import os
import socket
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import ExitStack, contextmanager, suppress
from io import BufferedRandom
from pathlib import Path

from surveykit.core import InputError
from surveykit.swap import heal

if sys.platform == "win32":
    import msvcrt
else:
    import fcntl

BUSY = {errno.EAGAIN, errno.EACCES, errno.EWOULDBLOCK, errno.EDEADLK}
PAUSE_S = 0.1
BYTE = 1 << 30  # locked where only bytes can be: beyond what is written, which stays readable


@contextmanager
def locked(root: Path, name: str, earlier: tuple[str, ...] = (),
           say: Callable[[str], None] | None = None) -> Iterator[int]:
    """Hold the campaign `name` alone, and keep the `earlier` ones from being run meanwhile.

    Own lock first, then the earlier ones': who waits, waits along the order of the campaigns, which
    has no circle. Waits as long as another run holds one, and says so once.

    Parameters
    ----------
    root : Path
        The project folder; the locks lie in its .surveykit/.
    name : str
        The campaign that is run.
    earlier : tuple of str
        The campaigns it reads; many runs may read them at once.
    say : callable, optional
        Takes the line that tells who is waited for.

    Yields
    ------
    int
        The descriptor of the own lock: a kernel that inherits it keeps the lock while it lives.
    """
    with ExitStack() as stack:
        own = stack.enter_context(_taken(root, name, False, say))
        for one in dict.fromkeys(earlier):
            stack.enter_context(_taken(root, one, True, say))
        yield own


@contextmanager
def idle(root: Path, name: str) -> Iterator[bool]:
    """Yield whether no run of the campaign `name` is under way; none begins meanwhile if so."""
    with ExitStack() as stack:
        path = _path(root, name)
        yield not path.exists() or _take(stack.enter_context(path.open("r+b")).fileno(), False)


def heal_all(root: Path) -> None:
    """Put right what stopped swaps left in reports/, but for campaigns under way."""
    for aside in (root / "reports").glob(".*.old"):
        name = aside.name.removeprefix(".").removesuffix(".old")
        with idle(root, name) as free:
            if free:
                heal(aside.parent, name)


@contextmanager
def _taken(root: Path, name: str, shared: bool,
           say: Callable[[str], None] | None) -> Iterator[int]:
    path = _path(root, name)
    fresh = not path.exists()
    with ExitStack() as stack:
        file = stack.enter_context(_opened(path))
        told = say is None
        while not (_take(file.fileno(), shared) and _same(file.fileno(), path)):
            if not _same(file.fileno(), path):  # a refused run took its lock away meanwhile
                file = stack.enter_context(_opened(path))
                continue
            if not told and say is not None:
                file.seek(0)
                holder = file.read(200).decode("utf-8", "replace").strip()
                say(f"{name}: waits for another run that uses it ({holder or 'starting'})")
                told = True
            time.sleep(PAUSE_S)
        file.truncate(0)
        file.write(f"process {os.getpid()} on {socket.gethostname()}\n".encode())
        file.flush()
        try:
            yield file.fileno()
        except InputError:
            if fresh and not shared:  # a refused run leaves nothing behind
                _away(path)
            raise


def _opened(path: Path) -> BufferedRandom:
    """Open a lock, made where it is missing; a refused run may just be taking its folder away."""
    while True:
        path.parent.mkdir(exist_ok=True)
        with suppress(FileNotFoundError):
            return path.open("a+b")


def _same(descriptor: int, path: Path) -> bool:
    """Return whether the open file is still the one that stands at `path`."""
    try:
        here, there = os.fstat(descriptor), path.stat()
    except FileNotFoundError:
        return False
    return (here.st_ino, here.st_dev) == (there.st_ino, there.st_dev)


def _away(path: Path) -> None:
    """Remove a lock, and its folder where that is empty; what the system refuses stays."""
    with suppress(OSError):
        path.unlink()
        path.parent.rmdir()


def _path(root: Path, name: str) -> Path:
    return root / ".surveykit" / f"{name}.lock"


def _take(descriptor: int, shared: bool) -> bool:
    """Try once; True also where the storage knows no locks, as there is nothing to wait for."""
    try:
        if sys.platform == "win32":
            os.lseek(descriptor, BYTE, os.SEEK_SET)
            msvcrt.locking(descriptor, msvcrt.LK_NBLCK, 1)
        else:
            kind = fcntl.LOCK_SH if shared else fcntl.LOCK_EX
            fcntl.flock(descriptor, kind | fcntl.LOCK_NB)
    except OSError as error:
        if error.errno in BUSY:
            return False
        if error.errno not in (errno.ENOLCK, errno.ENOTSUP, errno.ENOSYS):
            raise
    return True
