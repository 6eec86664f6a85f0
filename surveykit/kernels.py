"""The kernel manager of the runs: quiet about what is encrypted and what is not."""

from __future__ import annotations

from jupyter_client.manager import AsyncKernelManager
from traitlets import default


class QuietKernelManager(AsyncKernelManager):
    """Lets kernel and client agree on encryption where both can, instead of warning each time."""

    @default("transport_encryption")
    def _agree(self) -> str:
        return "auto"
