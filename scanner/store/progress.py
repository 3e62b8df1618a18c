"""How far a store is, from its receipts alone: while it is being written, from any terminal, or long after."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from scanner.store.ledger import Ledger, Receipt
from scanner.store.lock import Holder, lives, look

RECENT_SECONDS = 600.0
SLOWEST = 3


@dataclass(frozen=True)
class SweepProgress:
    """State of a sweep.

    Attributes
    ----------
    tables, settled, done, not_convex, failed
        Tables in all; with a status; and by status.
    orbits, orbits_settled
        Orbits in all, and those that are computed or found to be of no use.
    tasks, finished
        Number of tasks in all, and those with a receipt.
    bounces_per_second, seconds_left
        Over the last ten minutes of work; None where it cannot be told.
    hosts
        Share of the working time by host.
    failures
        Index in the grid and reason of every failed table.
    running
        Whether a living process holds the store.
    holder, silent
        Who holds the store, dead or alive, and for how many seconds it has given no sign of life; None where nobody
        does, as after a run that ended in good order.
    core_seconds
        Time of all workers that went into finished tasks.
    slowest
        The tables that took the longest, as their parameters, and seconds a table.
    """

    tables: int
    settled: int
    done: int
    not_convex: int
    failed: int
    orbits: int
    orbits_settled: int
    tasks: int
    finished: frozenset[int]
    bounces_per_second: float | None
    seconds_left: float | None
    hosts: dict[str, float]
    failures: dict[tuple[int, ...], str]
    running: bool
    holder: Holder | None = None
    silent: float = 0.0
    core_seconds: float = 0.0
    slowest: tuple[tuple[str, float], ...] = ()

    @property
    def tasks_finished(self) -> int:
        """Number of tasks with a receipt."""
        return len(self.finished)

    @property
    def complete(self) -> bool:
        """Whether every task is finished."""
        return self.tasks_finished == self.tasks


def sweep_progress(path: str | Path) -> SweepProgress:
    """Tell how far a store is.

    Raises
    ------
    StoreError
        The path is not a store of this tool.
    """
    store = Path(path)
    ledger = Ledger(store)
    charter = ledger.charter()
    receipts = list(ledger.receipts())
    done, not_convex, failed = (sum(getattr(r, name) for r in receipts) for name in ("done", "not_convex", "failed"))
    orbits = charter.tables * charter.orbits
    settled = sum(receipt.orbits for receipt in receipts)
    orbit_rate, bounce_rate = _recent_rates(receipts)
    holder, silent = look(store)
    return SweepProgress(
        tables=charter.tables,
        settled=done + not_convex + failed,
        done=done,
        not_convex=not_convex,
        failed=failed,
        orbits=orbits,
        orbits_settled=settled,
        tasks=charter.tasks,
        finished=frozenset(receipt.task for receipt in receipts),
        bounces_per_second=bounce_rate,
        seconds_left=(orbits - settled) / orbit_rate if orbit_rate else None,
        hosts=_shares(receipts),
        failures=list_failures(receipts),
        running=holder is not None and lives(holder, silent),
        holder=holder,
        silent=silent,
        core_seconds=sum(receipt.seconds for receipt in receipts),
        slowest=_slowest(receipts),
    )


def list_failures(receipts: Sequence[Receipt]) -> dict[tuple[int, ...], str]:
    """Failed tables and why; the first reason counts where several tasks share a table."""
    found: dict[tuple[int, ...], str] = {}
    for receipt in receipts:
        for index, reason in receipt.failures:
            found.setdefault(index, reason)
    return dict(sorted(found.items()))


def _recent_rates(receipts: Sequence[Receipt]) -> tuple[float | None, float | None]:
    """Orbits and bounces a second over the last stretch of work."""
    if not receipts:
        return None, None
    latest = max(receipt.finished for receipt in receipts)
    recent = [receipt for receipt in receipts if receipt.finished > latest - RECENT_SECONDS]
    span = latest - min(receipt.finished - receipt.seconds for receipt in recent)
    if span <= 0:
        return None, None
    return sum(r.orbits for r in recent) / span, sum(r.bounces for r in recent) / span


def _shares(receipts: Sequence[Receipt]) -> dict[str, float]:
    seconds: defaultdict[str, float] = defaultdict(float)
    for receipt in receipts:
        seconds[receipt.host] += receipt.seconds
    total = sum(seconds.values())
    by_time = sorted(seconds.items(), key=lambda entry: -entry[1])
    return {host: spent / total for host, spent in by_time} if total else {}


def _slowest(receipts: Sequence[Receipt]) -> tuple[tuple[str, float], ...]:
    """Tables that took the longest, those of one task together; a table may have been split over several tasks."""
    seconds: defaultdict[str, float] = defaultdict(float)
    tables: defaultdict[str, int] = defaultdict(int)
    for receipt in receipts:
        seconds[receipt.tables] += receipt.seconds
        tables[receipt.tables] += receipt.done + receipt.not_convex + receipt.failed
    each = [(name, seconds[name] / count) for name, count in tables.items() if name and count]
    return tuple(sorted(each, key=lambda entry: -entry[1])[:SLOWEST])
