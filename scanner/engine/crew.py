"""Where the workers come from: this machine, a scheduler that is running already, or the caller's client."""

from __future__ import annotations

import json
import logging
from collections.abc import Callable, Iterator
from contextlib import ExitStack, contextmanager
from pathlib import Path

import dask
from dask.system import CPU_COUNT
from distributed import Client, LocalCluster

from scanner.engine import interrupts
from scanner.engine.batch import CLUSTERS, batch_cluster
from scanner.engine.encryption import certificates, protocol
from scanner.engine.warmth import kernels_are_warm, warm_kernels
from scanner.errors import EngineError
from scanner.study import Resources, Study

CONNECT_SECONDS = 20
PATIENCE = {"distributed.scheduler.allowed-failures": 10}
"""Workers a task may lose before the scheduler gives it up; any death counts for all tasks waiting there."""

KEPT_FOR_GOOD = {"distributed.deploy.lost-worker-timeout": "100 days"}
"""A worker on this machine is started again by the process that watches it, which the cluster would otherwise end if
that took longer than some seconds, for good."""


@contextmanager
def hire(
    study: Study,
    store: Path,
    say: Callable[[str], None],
    client: Client | None = None,
    workers: int | None = None,
    scheduler: str | None = None,
    scheduler_file: str | None = None,
) -> Iterator[Client]:
    """Give a client with workers behind it, and dismiss at the end what was started here.

    Parameters
    ----------
    study
        Its ``[resources]`` say where they come from, unless the other arguments do, and what is asked which kernels
        they need.
    store
        What they are to fill; jobs of a batch system leave what they print in a folder beside it.
    say
        Called with one line where something takes long.
    client
        The caller's own, used as it is.
    workers
        Processes on this machine, one for each core by default, or jobs; only where no scheduler is given.
    scheduler, scheduler_file
        Address of a running scheduler, or the file that holds it.

    Raises
    ------
    EngineError
        No scheduler answers, or the workers do not start.
    """
    if client is not None:
        yield client
        return
    resources = study.resources
    named = _named_scheduler(resources, scheduler, scheduler_file)
    with ExitStack() as stack:
        stack.enter_context(certificates(resources))
        stack.enter_context(dask.config.set(PATIENCE))
        if named is not None:
            yield _remote_client(stack, *named)
        elif resources.runner in CLUSTERS:
            with interrupts.interrupts_withheld():
                cluster = stack.enter_context(batch_cluster(resources, workers, store, say))
            yield stack.enter_context(Client(cluster))
        else:
            _warm_this_machine(bool(study.rotations), say)
            stack.enter_context(dask.config.set(KEPT_FOR_GOOD))
            yield _local_client(stack, resources, workers or resources.workers or CPU_COUNT)


def call_on_scheduler(resources: Resources, scheduler: str | None = None, scheduler_file: str | None = None) -> None:
    """See whether the running scheduler that ``hire`` would use, if any, answers: before anything is written.

    Raises
    ------
    EngineError
        It does not.
    """
    named = _named_scheduler(resources, scheduler, scheduler_file)
    if named is not None:
        with ExitStack() as stack:
            stack.enter_context(certificates(resources))
            _remote_client(stack, *named)


def _named_scheduler(
    resources: Resources, scheduler: str | None, scheduler_file: str | None
) -> tuple[str | None, str | None] | None:
    """Address and file of the running scheduler that is asked for; None where workers are started here."""
    if scheduler or scheduler_file:
        return scheduler, scheduler_file
    return (resources.scheduler, resources.scheduler_file) if resources.runner == "scheduler" else None


def _warm_this_machine(resonances: bool, say: Callable[[str], None]) -> None:
    if not kernels_are_warm(resonances=resonances):
        say("compiling the kernels, once on this machine: about a minute")
        warm_kernels(resonances=resonances)


def _local_client(stack: ExitStack, resources: Resources, workers: int) -> Client:
    with interrupts.interrupts_withheld():
        try:
            cluster = LocalCluster(
                n_workers=workers,
                threads_per_worker=1,
                processes=True,
                memory_limit=resources.memory or "auto",
                host="127.0.0.1",
                protocol=protocol(),
                dashboard_address="127.0.0.1:0",
                worker_dashboard_address="127.0.0.1:0",
                silence_logs=logging.CRITICAL,
                preload=[interrupts.__name__],
            )
        except (OSError, RuntimeError) as error:
            raise EngineError(f"{workers} workers could not be started ({error}); try fewer") from None
        return stack.enter_context(Client(stack.enter_context(cluster)))


def _remote_client(stack: ExitStack, scheduler: str | None, scheduler_file: str | None) -> Client:
    if scheduler is None and scheduler_file is None:
        raise EngineError('runner = "scheduler" needs scheduler or scheduler_file in [resources], or as an option')
    try:
        client = Client(scheduler or _address_in(str(scheduler_file)), timeout=CONNECT_SECONDS)
    except (OSError, ValueError, TypeError, RuntimeError) as error:  # the last two where certificates are amiss
        where = scheduler or scheduler_file
        raise EngineError(f"{where}: no scheduler answers there ({error}); start `dask scheduler` first") from None
    return stack.enter_context(client)


def _address_in(scheduler_file: str) -> str:
    """Read the address of a scheduler from the file it wrote."""
    if not Path(scheduler_file).exists():
        raise EngineError(f"{scheduler_file}: no such scheduler file; start `dask scheduler --scheduler-file` first")
    try:
        return str(json.loads(Path(scheduler_file).read_bytes())["address"])
    except (OSError, ValueError, TypeError, KeyError):
        raise EngineError(
            f"{scheduler_file}: not a scheduler file; give the one that `dask scheduler --scheduler-file` writes"
        ) from None
