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
def interrupts_held_back() -> Iterator[None]:
    """Block Ctrl-C in this thread, and for good in every thread and process that is started meanwhile.

    A terminal sends it to the whole group of processes; workers must not stop by it.  A blocked signal stays blocked
    in the children of children, also in those that replace a dead worker later.
    """
    before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    try:
        yield
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, before)
