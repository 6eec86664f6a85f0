"""Kernels of a run: started, and their imports begun, while something else still works."""

from __future__ import annotations

import builtins
import os
import sys
import threading
from collections.abc import Mapping
from pathlib import Path
from types import TracebackType
from typing import Any

from jupyter_client.asynchronous.client import AsyncKernelClient
from jupyter_client.blocking.client import BlockingKernelClient
from jupyter_client.client import KernelClient
from jupyter_client.manager import KernelManager
from traitlets import default

from surveykit.core import InputError

# jupyterlab brings rfc3987_syntax, which compiles a grammar for 1.2 s at import, reached through
# jsonschema's optional format checkers; without it jsonschema skips that one optional format.
sys.modules.setdefault("rfc3987_syntax", None)  # type: ignore[arg-type]

# What every notebook imports first; run silently, so that it leaves no trace in the notebook.
WARM_UP = """\
from surveykit import facts, overview, pipeline
from surveykit.report import figures, sentences, tables
del facts, overview, pipeline, figures, sentences, tables
"""


class KernelGoneError(OSError):
    """The system stopped a notebook's kernel; no fault of the input."""


class QuietKernelManager(KernelManager):
    """Lets kernel and client agree on encryption where both can, instead of warning each time.

    Hands out asynchronous clients, as nbclient wants them, and stops them with the kernel.
    """

    def __init__(self, **kwargs: Any) -> None:
        super().__init__(client_class=f"{AsyncKernelClient.__module__}.AsyncKernelClient",
                         **kwargs)
        self._handed: list[KernelClient] = []
        self._ending = threading.Lock()

    @default("transport_encryption")
    def _agree(self) -> str:
        return "auto"

    def client(self, **kwargs: Any) -> KernelClient:  # type: ignore[override]
        """Return a client, remembered so that `end` can stop its channels."""
        made = super().client(**kwargs)
        self._handed.append(made)
        return made

    def begin(self, folder: Path, inherited: tuple[int, ...] = ()) -> None:
        """Start the kernel in `folder` and send it the imports of a notebook.

        It inherits the descriptors `inherited`: a lock among them is held while it lives.
        """
        handed = inherited if os.name == "posix" else ()  # elsewhere none can be
        self.start_kernel(cwd=str(folder), pass_fds=handed)
        warm = BlockingKernelClient()
        warm.load_connection_info(self.get_connection_info())
        warm.start_channels(shell=True, iopub=False, stdin=False, hb=False, control=False)
        warm.execute(WARM_UP, silent=True, store_history=False)
        self._handed.append(warm)

    def end(self) -> None:
        """Stop the kernel and every client handed out; again is no fault."""
        with self._ending:
            for client in self._handed:
                client.stop_channels()
            self._handed.clear()
            if self.has_kernel:
                self.shutdown_kernel(now=True)


class Kernels:
    """Hands out fresh kernels, `ahead` of them started before they are asked for.

    A context: when it ends, every kernel ends. May be asked from several threads.
    """

    def __init__(self, folder: Path, *, ahead: int, inherited: tuple[int, ...] = ()) -> None:
        self._folder, self._inherited = folder, inherited
        self._guard = threading.Lock()
        self._all: list[QuietKernelManager] = []
        self._waiting: list[QuietKernelManager] = []
        self._closed = False
        try:
            self._waiting = [self._start() for _ in range(ahead)]
        except BaseException:
            self.close()
            raise

    def take(self) -> QuietKernelManager:
        """Return a kernel that nothing has run in but the imports; end it after use."""
        with self._guard:
            if self._closed:
                raise RuntimeError("the run was stopped")
            return self._waiting.pop(0) if self._waiting else self._start()

    def close(self) -> None:
        """End every kernel."""
        with self._guard:
            self._closed = True
            for manager in self._all:
                manager.end()

    def _start(self) -> QuietKernelManager:
        manager = QuietKernelManager(kernel_name="python3")
        self._all.append(manager)
        manager.begin(self._folder, self._inherited)
        return manager

    def __enter__(self) -> Kernels:
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None,
                 trace: TracebackType | None) -> None:
        self.close()


def execute(source: Path, target: Path, root: Path, handed: Mapping[str, str],
            kernel: QuietKernelManager) -> None:
    """Run a notebook in the project folder `root`, in a kernel that ends with it.

    Parameters
    ----------
    source, target : Path
        The notebook, and where the executed one goes.
    root : Path
        The project folder.
    handed : mapping of str
        What its parameters cell is given.
    kernel : QuietKernelManager
        A kernel that has begun.

    Raises
    ------
    InputError
        If the input is at fault, or the notebook is missing or does not take what is handed over.
    OSError
        If the notebook could not write, or the system stopped its kernel.
    """
    import papermill
    from nbclient.exceptions import DeadKernelError

    read, write = (str(path).replace("{", "{{").replace("}", "}}")  # else names of parameters
                   for path in (source, target))
    try:
        if not source.is_file():
            raise InputError(f"notebooks/{source.name} is missing; restore it from the project")
        lacking = [key for key in handed if key not in papermill.inspect_notebook(read)]
        if lacking:
            raise InputError(f"notebooks/{source.name}: its parameters cell lacks "
                             f"{' and '.join(lacking)}; restore the cell and its tag 'parameters'")
        papermill.execute_notebook(
            read, write, parameters=handed, kernel_name="python3", progress_bar=False,
            log_output=False, request_save_on_cell_execute=False, autosave_cell_every=0,
            cwd=str(root), km=kernel)
    except papermill.PapermillExecutionError as error:
        if error.ename == InputError.__name__:
            raise InputError(*error.evalue.splitlines()) from None
        kind = getattr(builtins, error.ename, None)
        if isinstance(kind, type) and issubclass(kind, OSError):
            raise OSError(f"notebook {source.stem}: {error.evalue}") from None
        raise
    except RuntimeError as error:
        if isinstance(error, DeadKernelError) or "Kernel died" in str(error):
            raise KernelGoneError(f"notebook {source.stem}: the system stopped its kernel, as when "
                                  "memory runs out") from None
        raise
    finally:
        kernel.end()
