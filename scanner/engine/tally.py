"""How a running sweep stands, counted by the client."""

from __future__ import annotations

import time
from collections import deque

from scanner.engine.work import Outcome
from scanner.store import SweepProgress

PACE_SECONDS = 300.0


class Tally:
    """Running count of a sweep, kept by the client.

    Parameters
    ----------
    before
        State of the store when the run began.
    """

    def __init__(self, before: SweepProgress) -> None:
        self.tables = before.tables
        self.settled = before.settled
        self.failed = before.failed
        self.orbits = before.orbits
        self.orbits_settled = before.orbits_settled
        self._recent: deque[tuple[float, int, int]] = deque([(time.monotonic(), 0, 0)])

    def add(self, outcome: Outcome) -> None:
        """Count a finished task."""
        self.settled += outcome.done + outcome.not_convex + outcome.failed
        self.failed += outcome.failed
        self.orbits_settled += outcome.orbits
        now = time.monotonic()
        self._recent.append((now, outcome.orbits, outcome.bounces))
        while self._recent[1][0] <= now - PACE_SECONDS:
            self._recent.popleft()

    @property
    def bounces_per_second(self) -> float:
        """Rate over the last minutes, up to now."""
        return sum(bounces for _, _, bounces in self._since_first()) / self._span

    @property
    def seconds_left(self) -> float | None:
        """Time left at the present rate, None where none is known yet."""
        rate = sum(orbits for _, orbits, _ in self._since_first()) / self._span
        return (self.orbits - self.orbits_settled) / rate if rate else None

    def describe(self, workers: int) -> str:
        """One line: tables, rate, time left."""
        left = "?" if self.seconds_left is None else clock(self.seconds_left)
        failed = f", {self.failed} failed" if self.failed else ""
        rate = f"{self.bounces_per_second / 1e6:.1f} M bounces/s"
        return f"{self.settled}/{self.tables} tables{failed}, {rate}, {workers} workers, {left} left"

    def _since_first(self) -> list[tuple[float, int, int]]:
        return list(self._recent)[1:]

    @property
    def _span(self) -> float:
        return max(time.monotonic() - self._recent[0][0], 1e-3)


def clock(seconds: float) -> str:
    """Write a time as 1:02:03."""
    minutes, rest = divmod(round(seconds), 60)
    return f"{minutes // 60}:{minutes % 60:02d}:{rest:02d}"
