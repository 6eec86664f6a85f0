"""Kernels of a run: started, and their imports begun, while something else still works."""

from __future__ import annotations

import threading
from pathlib import Path
from types import TracebackType
from typing import Any

from jupyter_client.asynchronous.client import AsyncKernelClient
from jupyter_client.blocking.client import BlockingKernelClient
from jupyter_client.client import KernelClient
from jupyter_client.manager import KernelManager
from traitlets import default

# What every notebook imports first; run silently, so that it leaves no trace in the notebook.
WARM_UP = """\
from surveykit import facts, overview, pipeline
from surveykit.report import figures, sentences, tables
del facts, overview, pipeline, figures, sentences, tables
"""


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
        self.start_kernel(cwd=str(folder), pass_fds=inherited)
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
