"""Ctrl-C: the first asks to stop in good order, the second stops at once, and so does a request to terminate."""

from __future__ import annotations

import signal
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from types import FrameType, TracebackType


class Interrupts:
    """Note the first Ctrl-C while active; the next one, or SIGTERM, raises KeyboardInterrupt.

    Outside the main thread, where no signal arrives, it does nothing.
    """

    def __init__(self) -> None:
        self.requested = False

    def __enter__(self) -> Interrupts:
        """Take over Ctrl-C."""
        self._active = threading.current_thread() is threading.main_thread()
        if self._active:
            self._previous = {number: signal.signal(number, self._handle) for number in (signal.SIGINT, signal.SIGTERM)}
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Give it back."""
        if self._active:
            for number, handler in self._previous.items():
                signal.signal(number, handler)

    def _handle(self, number: int, frame: FrameType | None) -> None:
        if self.requested or number == signal.SIGTERM:
            raise KeyboardInterrupt
        self.requested = True


@contextmanager
def interrupts_withheld() -> Iterator[None]:
    """Let Ctrl-C wait until the end here, and keep it away for good from every process that is started meanwhile.

    A terminal sends it to all processes of a command, and workers must not stop by it.
    """
    before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    try:
        yield
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, before)


def dask_setup(worker: object) -> None:
    """Have a worker ignore Ctrl-C; called when a worker starts, also one that replaces a dead one later."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
