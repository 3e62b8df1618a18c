"""Run a study: from its file to a finished store."""

from __future__ import annotations

import logging
import time
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path

from distributed import Client

from scanner.engine.agenda import Agenda
from scanner.engine.crew import call_on_scheduler, hire
from scanner.engine.dispatch import Dispatcher, Losses
from scanner.engine.display import Display, choose_display
from scanner.engine.forecast import expected_core_hours, remembered_core_hours
from scanner.engine.interrupts import Interrupts
from scanner.engine.journal import log_beside
from scanner.engine.tally import Tally, clock
from scanner.engine.work import Order, Outcome
from scanner.errors import EngineError, StoreError
from scanner.store import (
    Ledger,
    Pulse,
    StoreLock,
    SweepProgress,
    check_numerics,
    is_vacant,
    note_finish,
    prepare_store,
    refuse_losses,
    remove_leftovers,
    stored_title,
    sweep_progress,
    write_pulse,
)
from scanner.study import Plan, Study, load_study, make_plan
from scanner.study.limits import check_limits

RECEIPT_SECONDS = 60.0
"""How long a shared disk may take to show this host what another one wrote."""
BESIDE = (".log", ".jobs")
CARRY_ON = "run the same study on the same store again to carry on"

log = logging.getLogger(__name__)


@dataclass(frozen=True)
class SweepReport:
    """How a run ended.

    Attributes
    ----------
    store
        Where the results are.
    tables, done, not_convex
        Tables of the study, and how many of them are done or were found not convex.
    failures
        One line for every table that failed, and for every task that had to be abandoned: which, and why.
    interrupted
        Whether Ctrl-C ended the run before everything was finished.
    seconds, bounces
        Duration of this run, from when there were workers, and what it computed.
    losses
        What went wrong in this run and was made good: workers lost, tasks tried again, tasks repeated.
    core_hours, expected_core_hours
        What all finished tasks of the store took, also in earlier runs, and what was expected when it was begun; None
        where there was no quick estimate.
    """

    store: Path
    tables: int
    done: int
    not_convex: int
    failures: tuple[str, ...]
    interrupted: bool
    seconds: float
    bounces: int
    losses: Losses = field(default_factory=Losses)
    core_hours: float = 0.0
    expected_core_hours: float | None = None

    @property
    def exit_status(self) -> int:
        """Exit status of a command: 0 done, 1 some tables failed, 130 interrupted."""
        return 130 if self.interrupted else 1 if self.failures else 0

    def __str__(self) -> str:
        """One line."""
        failed = f", {len(self.failures)} failed" if self.failures else ""
        state = f"{self.store}: {self.done} of {self.tables} tables done, {self.not_convex} not convex{failed}"
        expected = self.expected_core_hours
        cost = f"{self.core_hours:.3g} core-hours" + ("" if expected is None else f", {expected:.3g} expected")
        if not self.bounces:
            return f"{state}; {cost}{self.losses}"
        rate = f"{self.bounces / max(self.seconds, 1e-3) / 1e6:.1f} M bounces/s"
        return f"{state}; {cost}; this run took {clock(self.seconds)} at {rate}{self.losses}"


def run_study(
    study: str | Path | Study,
    store: str | Path,
    client: Client | None = None,
    *,
    workers: int | None = None,
    scheduler: str | None = None,
    scheduler_file: str | None = None,
    allow_code: bool = False,
    progress: bool | None = None,
) -> SweepReport:
    """Run a study and write its store, or carry on where an earlier run left it.

    Ctrl-C once lets the tasks in flight finish; twice stops at once.  Either way nothing that is finished is lost.

    Parameters
    ----------
    study
        A study file, or a study that was read already.
    store
        Folder of the store; made if there is none.
    client
        A client of any dask.distributed cluster, used as it is.
    workers
        Processes on this machine; one for each core by default.
    scheduler, scheduler_file
        Address of a running scheduler, or the file that holds it.  Without these and ``client``, the study's own
        resources decide.
    allow_code
        Whether a ``module:function`` family may run.
    progress
        False for silence; by default a bar on a terminal and plain lines elsewhere.

    Returns
    -------
    SweepReport
        How it ended.

    Raises
    ------
    StudyError
        The study is not valid or does not fit the memory or the disk.
    StoreError
        The store belongs to another study, is in use or cannot be written.
    EngineError
        Workers cannot be had, the scheduler is gone, or the same task fails again and again.
    """
    if not isinstance(study, Study):
        study = load_study(study, allow_code)
    plan = make_plan(study)
    path = Path(store).absolute()
    if path.suffix in BESIDE:
        raise StoreError(
            f"{path}: the suffix {path.suffix} is that of a file beside the store; give another, like .zarr"
        )
    if is_vacant(path):
        check_limits(plan, path)
        if client is None:
            call_on_scheduler(study.resources, scheduler, scheduler_file)
    prepare_store(path, plan)
    with StoreLock(path) as lock, log_beside(path), choose_display(progress) as display, Interrupts() as interrupts:
        refuse_losses(path)
        run = _Run(plan, path, lock, display, interrupts)
        run.compare_titles()
        if not run.before.complete:
            check_numerics(path)
        check_limits(plan, path, 1.0 - run.before.tasks_finished / run.before.tasks)
        if not run.before.complete:
            try:
                with hire(study, path, display.say, client, workers, scheduler, scheduler_file) as crew:
                    if not interrupts.requested:
                        run.work(crew)
            except KeyboardInterrupt:
                interrupts.requested = True
        return run.finish()


class _Run:
    """One run of a plan on a store that is held by this process."""

    def __init__(self, plan: Plan, path: Path, lock: StoreLock, display: Display, interrupts: Interrupts) -> None:
        self._plan = plan
        self._path = path
        self._lock = lock
        self._display = display
        self._interrupts = interrupts
        self._ledger = Ledger(path)
        self._started = time.monotonic()
        self._bounces = 0
        self._reported: set[int] = set()
        self._abandoned: dict[int, str] = {}
        self._losses = Losses()
        self._expected = remembered_core_hours(path)
        self.before = sweep_progress(path)
        log.info(
            "%s",
            f"{plan.study.title!r} ({plan.study.fingerprint[:12]}): {self.before.tasks_finished} of "
            f"{self.before.tasks} tasks are finished",
        )

    def compare_titles(self) -> None:
        """Say so where the study has got another title since the store was made."""
        kept = stored_title(self._path)
        if kept != self._plan.study.title:
            self._say(f"{self._path}: keeps the title it was made with, {kept!r}")

    def work(self, client: Client) -> None:
        """Have all that is not finished computed, until done or interrupted."""
        note_finish(self._path, finished=False)
        self._expected = expected_core_hours(self._plan, self._path)
        self._started = time.monotonic()
        self._tally = Tally(self.before)
        agenda = Agenda(self._plan, self.before.finished)
        dispatcher = Dispatcher(client, self._order(), agenda, self._land, self._say)
        self._abandoned, self._losses = dispatcher.abandoned, dispatcher.losses
        log.info("%s", f"scheduler {client.scheduler.addr}, dashboard {client.dashboard_link}")
        draining = False
        workers = -1
        while dispatcher.turn():
            before, workers = workers, sum(dispatcher.workers.values())
            if self._lock.beat() or workers != before:
                write_pulse(self._path, Pulse(workers, dispatcher.flying, str(self._losses).removeprefix(", ")))
            self._display.show(self._tally, workers)
            if self._interrupts.requested and not draining:
                draining = True
                dispatcher.drain()
                self._say(
                    f"stopping after the {dispatcher.flying} tasks in flight, Ctrl-C again stops at once; {CARRY_ON}"
                )

    def finish(self) -> SweepReport:
        """Count what is on the disk, whatever the workers said."""
        after = self._await_receipts()
        if after.complete:
            remove_leftovers(self._path)
            note_finish(self._path, finished=True)
        elif not self._abandoned and not self._interrupts.requested:
            raise EngineError(f"{after.tasks - after.tasks_finished} tasks ended without a receipt; {CARRY_ON}")
        report = SweepReport(
            store=self._path,
            tables=after.tables,
            done=after.done,
            not_convex=after.not_convex,
            failures=tuple(self._describe_failures(after)),
            interrupted=self._interrupts.requested and not after.complete,
            seconds=time.monotonic() - self._started,
            bounces=self._bounces,
            losses=self._losses,
            core_hours=after.core_seconds / 3600,
            expected_core_hours=self._expected,
        )
        log.info("%s", str(report))
        for line in report.failures:
            log.warning("%s", line)
        if report.interrupted:
            self._say(f"interrupted with {after.tasks_finished} of {after.tasks} tasks finished; {CARRY_ON}")
        return report

    def _order(self) -> Order:
        study = self._plan.study
        return Order(str(self._path), study.text, study.folder, study.allow_code, study.fingerprint)

    def _land(self, outcome: Outcome) -> None:
        self._reported.add(outcome.task)
        self._bounces += outcome.bounces
        self._tally.add(outcome)
        log.info("task %d finished on %s in %.1f s", outcome.task, outcome.host, outcome.seconds)

    def _await_receipts(self) -> SweepProgress:
        """Give a shared disk time to show what workers reported as finished."""
        give_up = time.monotonic() + RECEIPT_SECONDS
        while any(not self._ledger.receipt_path(task).exists() for task in self._reported):
            if time.monotonic() > give_up:
                raise EngineError(
                    f"{self._path}: workers wrote receipts that are not seen here; is it on a shared disk?"
                )
            time.sleep(1.0)
        return sweep_progress(self._path)

    def _describe_failures(self, after: SweepProgress) -> Iterator[str]:
        for index, reason in after.failures.items():
            yield f"{self._describe_table(index)}: {reason}"
        for task, reason in self._abandoned.items():
            for index, _ in self._plan.tables(self._plan.tasks[task]):
                yield f"{self._describe_table(index)}: not computed, {reason} (task {task})"

    def _describe_table(self, index: tuple[int, ...]) -> str:
        parameters = self._plan.parameters_at(index)
        return ", ".join(f"{dim} = {parameters[dim]}" for dim in self._plan.dims) or "the table"

    def _say(self, line: str) -> None:
        self._display.say(line)
        log.warning("%s", line)
