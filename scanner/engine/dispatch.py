"""Give tasks to workers, a bounded number at a time, and make sure that each ends somewhere."""

from __future__ import annotations

import logging
import queue
import time
from collections import Counter, deque
from collections.abc import Callable
from concurrent.futures import CancelledError
from contextlib import suppress
from dataclasses import dataclass
from typing import Any
from uuid import uuid4

from distributed import Client, Future, KilledWorker

from scanner.engine.agenda import Agenda
from scanner.engine.work import Order, Outcome, run_task
from scanner.errors import EngineError

PER_THREAD = 3
"""Tasks submitted for each thread: enough to keep it busy, few enough to be taken back."""
ATTEMPTS = 3
TURN_SECONDS = 1.0
ANSWER_SECONDS = 30.0
"""Time to fetch the few numbers of finished tasks."""
LOST = (OSError, CancelledError, KilledWorker)
"""What is raised where these numbers went with their worker; the last where computing them again killed more."""
LONELY_SECONDS = 300.0
"""Time without workers after which that is said, again and again."""

log = logging.getLogger(__name__)


@dataclass
class Losses:
    """What went wrong in a run and was made good.

    Attributes
    ----------
    workers
        Workers that were lost; those that left in good order do not count.
    retries
        Tasks that raised and were tried again.
    repeated
        Tasks that were given to another worker because theirs was gone.
    """

    workers: int = 0
    retries: int = 0
    repeated: int = 0

    def __str__(self) -> str:
        """Append to a line about a run; empty where nothing went wrong."""
        counts = {"workers lost": self.workers, "tasks tried again": self.retries, "tasks repeated": self.repeated}
        return "".join(f", {count} {what}" for what, count in counts.items() if count)


class Dispatcher:
    """One run over an agenda.

    A task that raises is tried again, then the run ends: the cause (a full disk, say) would meet the others too.
    A task whose workers die is tried again after all others, alone, because the death of a worker is held against all
    tasks that wait there; one that kills its workers even so is abandoned.

    Parameters
    ----------
    client
        Where the workers are.
    order, agenda
        What they are to do.
    land
        Called with the outcome of every finished task.
    say
        Called with one line when something happens that people should know.
    """

    def __init__(
        self,
        client: Client,
        order: Order,
        agenda: Agenda,
        land: Callable[[Outcome], None],
        say: Callable[[str], None],
    ) -> None:
        self.abandoned: dict[int, str] = {}
        self.workers: dict[str, int] = {}
        self.losses = Losses()
        self._client = client
        self._order = order
        self._agenda = agenda
        self._land = land
        self._say = say
        self._run = uuid4().hex[:12]
        self._flying: dict[str, tuple[int, Future]] = {}
        self._landed: queue.SimpleQueue[Future] = queue.SimpleQueue()
        self._attempts: Counter[int] = Counter()
        self._failures: Counter[int] = Counter()
        self._deaths: Counter[int] = Counter()
        self._suspects: deque[int] = deque()
        self._draining = False
        self._next_count = 0.0
        self._lonely_since = time.monotonic()

    @property
    def flying(self) -> int:
        """Number of tasks that are submitted and not finished."""
        return len(self._flying)

    def turn(self) -> bool:
        """Do what is to be done now, wait up to a second for outcomes; false when nothing is left in flight.

        Raises
        ------
        EngineError
            The scheduler is gone, or a task fails again and again.
        """
        self._count_workers()
        self._fill_window()
        if not self._flying:
            self._count_once_more()
            return False
        self._receive(self._wait_for_landed())
        return True

    def drain(self) -> None:
        """Take back what no worker has begun; what is being computed may finish."""
        self._draining = True
        running = {key for stacks in self._client.call_stack(self._futures()).values() for key in stacks}
        idle = [self._flying.pop(key)[1] for key in [*self._flying] if key not in running]
        self._client.cancel(idle)

    def _futures(self) -> list[Future]:
        return [future for _, future in self._flying.values()]

    def _count_workers(self) -> None:
        """See about every second who came and went, and complain if nobody is left."""
        if time.monotonic() < self._next_count:
            return
        self._next_count = time.monotonic() + TURN_SECONDS
        if self._client.status != "running":
            raise self._scheduler_gone()
        try:
            present: dict[str, int] = self._client.nthreads()
        except (OSError, TimeoutError) as error:
            raise self._scheduler_gone() from error
        for address in self.workers.keys() - present.keys():
            self._note_departure(address)
        for address in present.keys() - self.workers.keys():
            log.info("worker %s has joined", address)
        self.workers = present
        if present:
            self._lonely_since = time.monotonic()
        elif time.monotonic() - self._lonely_since > LONELY_SECONDS:
            self._lonely_since = time.monotonic()
            self._say(
                f"no workers for {LONELY_SECONDS / 60:.0f} minutes; waiting for some to join, Ctrl-C stops: "
                "look at the queue, and at what the workers' jobs printed"
            )

    def _count_once_more(self) -> None:
        """Note who went in the last moment; all tasks are settled, so that a scheduler that is gone does no harm."""
        self._next_count = 0.0
        with suppress(EngineError):
            self._count_workers()

    def _note_departure(self, address: str) -> None:
        """Tell whether a worker left in good order, at the end of its job's time say, or was lost."""
        events = (event for _, event in self._client.get_events(address))
        farewell: dict[str, Any] = next((event for event in events if event.get("action") == "remove-worker"), {})
        unfinished = sum(key.startswith(f"scanner-{self._run}-") for key in farewell.get("processing-tasks", ()))
        self.losses.repeated += unfinished
        if farewell.get("expected"):
            log.info("worker %s has left in good order", address)
        else:
            self.losses.workers += 1
            log.warning("worker %s is gone; the %d tasks it had are given to others", address, unfinished)

    def _fill_window(self) -> None:
        threads = max(1, sum(self.workers.values()))
        while self._agenda and not self._draining and len(self._flying) < PER_THREAD * threads:
            self._submit(self._agenda.take())
        if self._suspects and not self._draining and not self._flying:
            self._submit(self._suspects.popleft())

    def _submit(self, number: int) -> None:
        self._attempts[number] += 1
        key = f"scanner-{self._run}-{number}-{self._attempts[number]}"
        future = self._client.submit(run_task, self._order, number, key=key, pure=False)
        self._flying[key] = number, future
        future.add_done_callback(self._landed.put)

    def _wait_for_landed(self) -> dict[int, Future]:
        """Wait up to a second for tasks that are over, one way or the other, and take all there are."""
        landed: dict[int, Future] = {}
        with suppress(queue.Empty):
            future = self._landed.get(timeout=TURN_SECONDS)
            while True:
                if future.key in self._flying:
                    number, _ = self._flying.pop(future.key)
                    landed[number] = future
                future = self._landed.get_nowait()
        return landed

    def _receive(self, landed: dict[int, Future]) -> None:
        finished = {number: future for number, future in landed.items() if future.status != "error"}
        try:
            # In one message: with a thousand workers, one after the other would take longer than the tasks.
            outcomes = self._fetch([*finished.values()])
        except LOST:
            self._receive_singly(finished)
        else:
            for number, outcome in zip(finished, outcomes, strict=True):
                self._settle(number, outcome)
        for number in landed.keys() - finished.keys():
            self._take_failure(number, landed[number].exception())

    def _receive_singly(self, finished: dict[int, Future]) -> None:
        """Fetch outcomes of which some are lost."""
        for number, future in finished.items():
            try:
                (outcome,) = self._fetch([future])
            except LOST as error:
                if future.status == "error":
                    self._take_failure(number, future.exception())
                else:
                    self._take_loss(number, error)
            else:
                self._settle(number, outcome)

    def _fetch(self, futures: list[Future]) -> list[Outcome]:
        if not futures:
            return []
        fetched: list[Outcome] = self._client.sync(
            lambda: self._client.gather(futures, asynchronous=True), callback_timeout=ANSWER_SECONDS
        )
        return fetched

    def _settle(self, number: int, outcome: Outcome) -> None:
        self._agenda.settle(number)
        self._land(outcome)

    def _take_loss(self, number: int, error: Exception) -> None:
        """Deal with a task of which nothing more will be heard."""
        if self._client.status != "running":
            raise self._scheduler_gone()
        log.warning("task %d was lost (%s); submitting it again", number, error)
        self.losses.repeated += 1
        self._agenda.give_back(number)

    def _take_failure(self, number: int, error: BaseException) -> None:
        reason = " ".join(str(error).split())
        if isinstance(error, KilledWorker):
            self._deaths[number] += 1
            log.warning("task %d lost its workers (%d): %s", number, self._deaths[number], reason)
            if self._deaths[number] < ATTEMPTS:
                self._suspects.append(number)
            else:
                self.abandoned[number] = "its workers died again and again while computing it"
            return
        self._failures[number] += 1
        log.warning("task %d failed (%d): %s: %s", number, self._failures[number], type(error).__name__, reason)
        if self._failures[number] == ATTEMPTS:
            raise EngineError(
                f"task {number} failed {ATTEMPTS} times, last with {type(error).__name__}: {reason}; "
                "mend that and run the same study on the same store to carry on"
            )
        self.losses.retries += 1
        self._agenda.give_back(number)

    def _scheduler_gone(self) -> EngineError:
        return EngineError(
            f"the scheduler at {self._client.scheduler.addr} is gone; "
            "start it again and run the same study on the same store to carry on"
        )
