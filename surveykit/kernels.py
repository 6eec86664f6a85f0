"""Kernels of a run: the next one starts, and imports, while a notebook still runs in its own."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
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

    @default("transport_encryption")
    def _agree(self) -> str:
        return "auto"

    def client(self, **kwargs: Any) -> KernelClient:
        """Return a client, remembered so that `end` can stop its channels."""
        made = super().client(**kwargs)
        self._handed.append(made)
        return made

    def begin(self, folder: Path) -> None:
        """Start the kernel in `folder` and send it the imports of a notebook."""
        self.start_kernel(cwd=str(folder))
        warm = BlockingKernelClient()
        warm.load_connection_info(self.get_connection_info())
        warm.start_channels(shell=True, iopub=False, stdin=False, hb=False, control=False)
        warm.execute(WARM_UP, silent=True, store_history=False)
        self._handed.append(warm)

    def end(self) -> None:
        """Stop the kernel and every client handed out."""
        for client in self._handed:
            client.stop_channels()
        self._handed.clear()
        if self.has_kernel:
            self.shutdown_kernel(now=True)


@contextmanager
def kernels_ahead(folder: Path, count: int) -> Iterator[Iterator[QuietKernelManager]]:
    """Hand out `count` fresh kernels one after the other, always one started ahead.

    A kernel is stopped when the next is asked for, all that is left at the end.
    """
    started: list[QuietKernelManager] = []

    def one() -> QuietKernelManager:
        manager = QuietKernelManager(kernel_name="python3")
        started.append(manager)
        manager.begin(folder)
        return manager

    def each() -> Iterator[QuietKernelManager]:
        coming = one()
        for place in range(count):
            mine = coming
            if place + 1 < count:
                coming = one()
            yield mine
            mine.end()

    try:
        yield each()
    finally:
        for manager in started:
            manager.end()
