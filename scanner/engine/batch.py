"""Workers as jobs of a batch system, one process each, with a scheduler in this process."""

from __future__ import annotations

import asyncio
import importlib
import logging
import os
import shlex
import sys
import time
from asyncio.subprocess import PIPE
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

import dask
from distributed import Status
from distributed.deploy.adaptive import Adaptive

from scanner.engine.encryption import security
from scanner.engine.journal import beside
from scanner.errors import EngineError
from scanner.study import Resources

CLUSTERS = {"slurm": "SLURMCluster", "pbs": "PBSCluster", "lsf": "LSFCluster", "sge": "SGECluster"}
ACCOUNT_KEYS = {"slurm": "account", "pbs": "account", "lsf": "project", "sge": "project"}
USUAL_MEMORY = 1_000_000_000
"""Bytes a worker gets where the study does not say."""
WAIT_FOR_SCHEDULER = 60
LOOPBACK = "lo"
REFUSALS = (OSError, RuntimeError, ValueError)
"""What dask-jobqueue raises where a command is missing, fails or says nothing that can be read."""
LOST_TIMES = 4
"""Jobs that are not seen are looked for every so many times ``distributed.deploy.lost-worker-timeout``: a minute."""
MOST_IN_VAIN = 3
"""Jobs submitted in place of each that ended before its worker joined: what ends so early may always do."""
LONGEST_FAREWELL = 180.0

log = logging.getLogger(__name__)


class Keeper(Adaptive):  # type: ignore[misc]
    """Keep the number of jobs: submit a new one for each that is lost or at the end of its time."""

    next_look = 0.0
    unseen: frozenset[Any] = frozenset()
    in_vain = 0

    async def target(self) -> int:
        """Say how many jobs there should be."""
        return int(self.minimum)

    async def recommendations(self, target: int) -> dict[str, Any]:
        """Forget from time to time what has come to nothing, so that it is submitted again.

        That is what the queue, out of order for a while, refused, and jobs that ended before their worker joined.
        """
        if time.monotonic() >= self.next_look:
            forget_refused(self.cluster)
            await self._forget_ended()
            patience = dask.utils.parse_timedelta(dask.config.get("distributed.deploy.lost-worker-timeout"))
            self.next_look = time.monotonic() + LOST_TIMES * patience
        found: dict[str, Any] = await super().recommendations(target)
        return found

    async def _forget_ended(self) -> None:
        """Forget the jobs whose worker was not there at the last look either and that the queue does not know."""
        unseen = frozenset(self.requested - self.observed)
        waiting = {str(self.cluster.workers[name].job_id): name for name in unseen & self.unseen}
        self.unseen = unseen
        enough = self.in_vain >= MOST_IN_VAIN * self.minimum
        if enough or not waiting or type(self.cluster).__name__ != CLUSTERS["slurm"]:
            return
        queued = await queued_jobs([*waiting])
        for job in waiting.keys() - (waiting.keys() if queued is None else queued):
            if waiting[job] not in self.cluster.workers:
                continue  # seen and lost while the queue was asked
            self.in_vain += 1
            self.cluster.workers.pop(waiting[job]).status = Status.failed
            log.warning("job %s ended before its worker joined; see what it printed; submitting another", job)


async def queued_jobs(jobs: Sequence[str]) -> set[str] | None:
    """Say which of some jobs Slurm still has; None where it does not answer."""
    command = ("squeue", "--noheader", "--format=%A", f"--jobs={','.join(jobs)}")
    try:
        asked = await asyncio.create_subprocess_exec(*command, stdout=PIPE, stderr=PIPE)
    except OSError as error:
        log.warning(
            "%s cannot be run (%s): jobs that end before their worker joins are not replaced", command[0], error
        )
        return None
    printed, complaint = await asked.communicate()
    # Slurm calls a single number invalid once it has forgotten the job, and is silent on one among others.
    return set(printed.decode().split()) if asked.returncode == 0 or b"Invalid job id" in complaint else None


def batch_cluster(resources: Resources, workers: int | None, store: Path, say: Callable[[str], None]) -> Any:
    """Submit jobs and keep their number, whatever is lost on the way.

    Parameters
    ----------
    resources
        What a job asks for; what is left open comes from dask-jobqueue's own configuration.
    workers
        Number of jobs, instead of that in ``resources``.
    store
        What they are to fill; a folder beside it gets what the jobs print.
    say
        Called with one line on what people should know.

    Returns
    -------
    dask_jobqueue.JobQueueCluster

    Raises
    ------
    EngineError
        dask-jobqueue is missing, the number of workers is not given, or the batch system takes no job.
    """
    jobs = workers or resources.workers
    if jobs is None:
        raise EngineError(f'runner = "{resources.runner}" needs a number of jobs; add workers = 8 to [resources]')
    try:
        jobqueue = importlib.import_module("dask_jobqueue")
    except ModuleNotFoundError:
        raise EngineError(
            f'runner = "{resources.runner}" needs dask-jobqueue, which is not installed; '
            'install it with pip install "scanner[cluster]", or submit the script that `scanner jobscript` prints'
        ) from None
    options = job_options(resources, beside(store, ".jobs"))
    if options.get("interface") == LOOPBACK != resources.interface:
        say(
            "the scheduler listens on the loopback address, so that jobs on other hosts cannot reach it; "
            'give interface = "ib0" (the name of the cluster\'s network) in [resources]'
        )
    try:
        cluster = getattr(jobqueue, CLUSTERS[resources.runner])(**options)
    except REFUSALS as error:
        raise _refusal(resources, error) from None
    accepted = _submit(cluster, jobs, resources)
    if accepted < jobs:
        say(f"{resources.runner} took {accepted} of {jobs} jobs; going on with these")
    cluster.adapt(Adaptive=Keeper, minimum_jobs=accepted, maximum_jobs=accepted)
    return cluster


def job_options(resources: Resources, job_logs: Path) -> dict[str, Any]:
    """Say what dask-jobqueue must know about one job."""
    runner = resources.runner
    interface = resources.interface or dask.config.get(f"jobqueue.{runner}.interface", None)
    scheduler = {"dashboard_address": "127.0.0.1:0"}
    if resources.host:
        scheduler["host"] = resources.host
    options: dict[str, Any] = {
        "cores": 1,
        "processes": 1,
        "memory": resources.memory or f"{USUAL_MEMORY}B",
        # quoted, as dask-jobqueue puts its own into the script as it is
        "python": dask.config.get(f"jobqueue.{runner}.python", None) or shlex.quote(sys.executable),
        "death_timeout": WAIT_FOR_SCHEDULER,
        "log_directory": str(job_logs),
        "interface": interface or (None if resources.host else LOOPBACK),
        "security": security(),
        "scheduler_options": scheduler,
        "worker_extra_args": ["--no-dashboard", *lifetime_options(resources)],
        "job_extra_directives": list(resources.directives),
        "job_script_prologue": [f"cd {shlex.quote(os.getcwd())}", *resources.setup],
        "queue": resources.queue,
        ACCOUNT_KEYS[runner]: resources.account,
        "walltime": walltime_for(resources),
    }
    return {name: value for name, value in options.items() if value not in (None, [])}


def farewell_seconds(resources: Resources) -> float:
    """Time before the end of a job at which what runs in it begins to take its leave."""
    return min(LONGEST_FAREWELL, (resources.walltime_seconds or 0) / 4)


def lifetime_options(resources: Resources) -> list[str]:
    """Have a worker leave in good order before its job is ended, not all at the same moment."""
    if resources.walltime_seconds is None:
        return []
    farewell = farewell_seconds(resources)
    lifetime = resources.walltime_seconds - farewell
    return ["--lifetime", f"{lifetime:.0f}s", "--lifetime-stagger", f"{farewell / 3:.0f}s"]


def walltime_for(resources: Resources) -> str | None:
    """Write a walltime as the batch system wants it; only Slurm knows days, LSF no seconds."""
    if resources.runner == "slurm" or resources.walltime_seconds is None:
        return resources.walltime
    hours, rest = divmod(resources.walltime_seconds, 3600)
    if resources.runner == "lsf":
        return f"{hours}:{min(-(-rest // 60), 59):02d}"
    return f"{hours}:{rest // 60:02d}:{rest % 60:02d}"


def forget_refused(cluster: Any) -> list[Any]:
    """Take the jobs that were not taken by the queue out of a cluster, which would wait for them for ever."""
    refused = [name for name, job in cluster.workers.items() if job.job_id is None]
    for name in refused:
        cluster.workers.pop(name).status = Status.failed
    return refused


def _submit(cluster: Any, jobs: int, resources: Resources) -> int:
    """Submit jobs and count those that are taken.

    Raises
    ------
    EngineError
        None is.
    """
    for _ in range(jobs):
        cluster.worker_spec.update(cluster.new_worker_spec())
    reason = "for no known reason"
    try:
        cluster.sync(lambda: cluster)
    except REFUSALS as error:
        reason = str(error).rpartition("stderr:")[2]
    refused = forget_refused(cluster)
    for name in refused:
        del cluster.worker_spec[name]
    if len(refused) == jobs:
        cluster.close()
        raise _refusal(resources, reason)
    return jobs - len(refused)


def _refusal(resources: Resources, reason: object) -> EngineError:
    return EngineError(
        f"no jobs can be submitted to {resources.runner} ({' '.join(str(reason).split())}); check [resources]"
    )
