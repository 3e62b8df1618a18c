"""Workers as jobs of a batch system, one process each, with a scheduler in this process."""

from __future__ import annotations

import importlib
from pathlib import Path
from typing import Any

from scanner.errors import EngineError
from scanner.study import Resources

CLUSTERS = {"slurm": "SLURMCluster", "pbs": "PBSCluster", "lsf": "LSFCluster", "sge": "SGECluster"}
ACCOUNT_KEYS = {"slurm": "account", "pbs": "account", "lsf": "project", "sge": "project"}
USUAL_MEMORY = "1GB"
WAIT_FOR_SCHEDULER = 60


def batch_cluster(resources: Resources, workers: int | None, store: Path) -> Any:
    """Submit jobs and keep their number, whatever is lost on the way.

    Parameters
    ----------
    resources
        What a job asks for; what is left open comes from dask-jobqueue's own configuration.
    workers
        Number of jobs, instead of that in ``resources``.
    store
        What they are to fill; a folder beside it gets what the jobs print.

    Returns
    -------
    dask_jobqueue.JobQueueCluster

    Raises
    ------
    EngineError
        dask-jobqueue is missing, the number of workers is not given, or the batch system is not to be had.
    """
    jobs = workers or resources.workers
    if jobs is None:
        raise EngineError(f'runner = "{resources.runner}" needs a number of jobs; add workers = 8 to [resources]')
    try:
        jobqueue = importlib.import_module("dask_jobqueue")
    except ModuleNotFoundError:
        raise EngineError(
            f'runner = "{resources.runner}" needs dask-jobqueue, which is not installed; '
            'install it with pip install "scanner[cluster]", or start workers yourself and give --scheduler-file'
        ) from None
    try:
        cluster = getattr(jobqueue, CLUSTERS[resources.runner])(**job_options(resources, store.with_suffix(".jobs")))
    except (OSError, RuntimeError, ValueError) as error:
        raise EngineError(f"no jobs can be submitted to {resources.runner} ({error}); check [resources]") from None
    # Adapting between equal bounds is what submits a new job for a lost one.
    cluster.adapt(minimum_jobs=jobs, maximum_jobs=jobs)
    return cluster


def job_options(resources: Resources, job_logs: Path) -> dict[str, Any]:
    """Say what dask-jobqueue must know about one job."""
    options: dict[str, Any] = {
        "cores": 1,
        "processes": 1,
        "memory": resources.memory or USUAL_MEMORY,
        "death_timeout": WAIT_FOR_SCHEDULER,
        "log_directory": str(job_logs),
        "scheduler_options": {"dashboard_address": ":0"},
        "job_extra_directives": list(resources.directives),
        "job_script_prologue": list(resources.setup),
        "queue": resources.queue,
        ACCOUNT_KEYS[resources.runner]: resources.account,
        "walltime": resources.walltime and walltime_for(resources.runner, resources.walltime),
    }
    return {name: value for name, value in options.items() if value not in (None, [])}


def walltime_for(runner: str, walltime: str) -> str:
    """Write a walltime days-hours:minutes:seconds as a batch system wants it; only Slurm knows days, LSF no seconds."""
    if runner == "slurm":
        return walltime
    days, _, clock = walltime.rpartition("-")
    hours, minutes, seconds = map(int, clock.split(":"))
    hours += 24 * int(days or 0)
    if runner == "lsf":
        return f"{hours}:{min(minutes + (seconds > 0), 59):02d}"
    return f"{hours}:{minutes:02d}:{seconds:02d}"
