"""Ctrl-C: the first asks to stop in good order, the second stops at once."""

from __future__ import annotations

import signal
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from types import FrameType, TracebackType


class Interrupts:
    """Note the first Ctrl-C while active; the next one raises KeyboardInterrupt.

    Outside the main thread, where no signal arrives, it does nothing.
    """

    def __init__(self) -> None:
        self.requested = False

    def __enter__(self) -> Interrupts:
        """Take over Ctrl-C."""
        self._active = threading.current_thread() is threading.main_thread()
        if self._active:
            self._previous = signal.signal(signal.SIGINT, self._handle)
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Give it back."""
        if self._active:
            signal.signal(signal.SIGINT, self._previous)

    def _handle(self, number: int, frame: FrameType | None) -> None:
        if self.requested:
            raise KeyboardInterrupt
        self.requested = True


@contextmanager
def interrupts_ignored() -> Iterator[None]:
    """Ignore Ctrl-C here, and for good in every process that is started meanwhile.

    A terminal sends it to all processes of a command, and workers must not stop by it.
    """
    if threading.current_thread() is not threading.main_thread():
        yield
        return
    before = signal.signal(signal.SIGINT, signal.SIG_IGN)
    try:
        yield
    finally:
        signal.signal(signal.SIGINT, before)


def dask_setup(worker: object) -> None:
    """Have a worker ignore Ctrl-C; called when a worker starts, also one that replaces a dead one later."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
