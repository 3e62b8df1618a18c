"""What people see of a sweep while it runs."""

from __future__ import annotations

import sys
import time
from types import TracebackType

from rich.console import Console
from rich.progress import BarColumn, Progress, TextColumn

from scanner.engine.tally import Tally

LINE_SECONDS = 15.0


class Display:
    """Show nothing; the base of those that do."""

    def __enter__(self) -> Display:
        """Begin."""
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        """End."""

    def say(self, line: str) -> None:
        """Tell one thing."""

    def show(self, tally: Tally, workers: int) -> None:
        """Show where things stand; called about every second."""


class Lines(Display):
    """A plain line from time to time, for pipes and batch logs."""

    def __init__(self) -> None:
        self._last = time.monotonic()

    def say(self, line: str) -> None:
        """Print at once."""
        print(line, file=sys.stderr, flush=True)

    def show(self, tally: Tally, workers: int) -> None:
        """Print if it is time."""
        if time.monotonic() - self._last >= LINE_SECONDS:
            self._last = time.monotonic()
            self.say(tally.describe(workers))


class Bar(Display):
    """A progress bar on a terminal."""

    def __init__(self, console: Console) -> None:
        self._progress = Progress(BarColumn(), TextColumn("{task.description}"), console=console, transient=True)
        self._bar = self._progress.add_task("starting workers")

    def __enter__(self) -> Display:
        """Draw the bar."""
        self._progress.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Take it away."""
        self._progress.stop()

    def say(self, line: str) -> None:
        """Print above the bar."""
        self._progress.console.print(line, markup=False, highlight=False)

    def show(self, tally: Tally, workers: int) -> None:
        """Move the bar."""
        self._progress.update(
            self._bar, total=tally.orbits, completed=tally.orbits_settled, description=tally.describe(workers)
        )


def choose_display(progress: bool | None) -> Display:
    """Choose a bar on a terminal and lines elsewhere; nothing where ``progress`` is False."""
    if progress is False:
        return Display()
    console = Console(stderr=True)
    return Bar(console) if console.is_terminal else Lines()
