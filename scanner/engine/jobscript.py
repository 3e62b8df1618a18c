"""A batch script that runs a whole sweep as one array of jobs and needs no package beside dask.

Element 0 runs the scheduler and the client, every other one a worker; they find each other through a file on the disk
that they share.
"""

from __future__ import annotations

import math
import os
import shlex
import sys
from pathlib import Path

from scanner.engine.batch import USUAL_MEMORY, WAIT_FOR_SCHEDULER, farewell_seconds, lifetime_options, walltime_for
from scanner.engine.crew import PATIENCE
from scanner.engine.encryption import certificates, command_options
from scanner.engine.journal import beside
from scanner.errors import EngineError
from scanner.study import Resources

KEEPER_BYTES = 250_000_000
"""Memory of the small process that watches over a worker and starts it again."""

SCRIPT = """\
#!/usr/bin/env bash
# Sweeps {study} with {workers} workers: element 0 of this array of jobs runs the scheduler and the client, every other
# one a worker.  Submit it with `{submit} THIS_FILE`, and again to carry on: what is finished is always kept.
{directives}

{identity}
folder={folder}
mkdir -p "$folder"
exec >"$folder/$run-$element.log" 2>&1
cd {here} || exit
{setup}
python={python}
meeting=$folder/$run.json
ended=$folder/$run.ended
{environment}

if [ "$element" -gt 0 ]; then
    [ ! -e "$ended" ] || exit 0
    exec "$python" -m dask worker --scheduler-file "$meeting" {worker}
fi

"$python" -m dask scheduler --scheduler-file "$meeting" {scheduler} &
scheduler=$!
trap 'mv "$meeting" "$ended"; kill "$scheduler"; wait "$scheduler"' EXIT
until [ -s "$meeting" ] || ! kill -0 "$scheduler"; do sleep 0.2; done
{limit}"$python" -m scanner sweep {sweep} --scheduler-file "$meeting"
"""

SUBMIT = {"slurm": "sbatch", "pbs": "qsub"}
IDENTITY = {
    "slurm": "run=$SLURM_ARRAY_JOB_ID\nelement=$SLURM_ARRAY_TASK_ID",
    "pbs": "run=${PBS_JOBID%%[*}\nelement=$PBS_ARRAY_INDEX",
}


def job_script(
    system: str, resources: Resources, study: Path, store: Path, workers: int | None = None, allow_code: bool = False
) -> str:
    """Write the script.

    Parameters
    ----------
    system
        "slurm" or "pbs".
    resources
        What a job asks for.
    study, store
        The study file and the store.
    workers
        Number of workers, instead of that in ``resources``.
    allow_code
        Whether a ``module:function`` family may run.

    Raises
    ------
    EngineError
        The number of workers is not given, or a certificate is missing.
    """
    resources = resources.model_copy(update={"runner": system, "workers": workers or resources.workers})
    if resources.workers is None:
        raise EngineError("a job script needs a number of workers; give --workers 8, or workers = 8 in [resources]")
    sweep = [str(study.absolute()), "--store", str(store.absolute()), *(["--allow-code"] if allow_code else [])]
    with certificates(resources):
        return SCRIPT.format(
            study=study.name,
            workers=resources.workers,
            submit=SUBMIT[system],
            directives="\n".join(_slurm_directives(resources) if system == "slurm" else _pbs_directives(resources)),
            identity=IDENTITY[system],
            folder=shlex.quote(str(beside(store.absolute(), ".jobs"))),
            here=shlex.quote(os.getcwd()),
            setup="\n".join(resources.setup),
            python=shlex.quote(sys.executable),
            environment="\n".join(f"export {_variable(key)}={value}" for key, value in PATIENCE.items()),
            worker=shlex.join(_worker_options(resources)),
            scheduler=shlex.join(_scheduler_options(resources)),
            limit=_time_limit(resources),
            sweep=shlex.join(sweep),
        )


def _slurm_directives(resources: Resources) -> list[str]:
    asked = {
        "job-name": "scanner",
        "array": f"0-{resources.workers}",
        "ntasks": 1,
        "cpus-per-task": 1,
        "mem": f"{math.ceil(_job_bytes(resources) / 2**20)}M",
        "time": walltime_for(resources),
        "partition": resources.queue,
        "account": resources.account,
        "output": "/dev/null",
    }
    lines = [f"--{name}={value}" for name, value in asked.items() if value is not None]
    return [f"#SBATCH {line}" for line in [*lines, *resources.directives]]


def _pbs_directives(resources: Resources) -> list[str]:
    walltime = walltime_for(resources)
    lines = [
        "-N scanner",
        "-S /bin/bash",
        f"-J 0-{resources.workers}",
        f"-l select=1:ncpus=1:mem={math.ceil(_job_bytes(resources) / 2**20)}mb",
        *([f"-l walltime={walltime}"] if walltime else []),
        *([f"-q {resources.queue}"] if resources.queue else []),
        *([f"-A {resources.account}"] if resources.account else []),
        "-j oe",
        "-o /dev/null",
    ]
    return [f"#PBS {line}" for line in [*lines, *resources.directives]]


def _job_bytes(resources: Resources) -> int:
    return (resources.memory_bytes or USUAL_MEMORY) + KEEPER_BYTES


def _variable(key: str) -> str:
    """Environment variable that sets a key of dask's configuration."""
    return "DASK_" + key.upper().replace(".", "__").replace("-", "_")


def _worker_options(resources: Resources) -> list[str]:
    place = ["--interface", resources.interface] if resources.interface else []
    if not place and not resources.host:
        place = ["--host", "127.0.0.1"]
    memory = str(resources.memory_bytes or USUAL_MEMORY)
    return [
        *("--nthreads", "1", "--nanny", "--no-dashboard", "--memory-limit", memory),
        *("--death-timeout", str(WAIT_FOR_SCHEDULER)),
        *lifetime_options(resources),
        *place,
        *command_options("worker"),
    ]


def _scheduler_options(resources: Resources) -> list[str]:
    place = ["--interface", resources.interface] if resources.interface else []
    if resources.host or not place:
        place = ["--host", resources.host or "127.0.0.1"]
    return ["--port", "0", "--no-dashboard", *place, *command_options("scheduler")]


def _time_limit(resources: Resources) -> str:
    """Have the client stop in good order, as by Ctrl-C, before the job is ended."""
    if resources.walltime_seconds is None:
        return ""
    seconds = resources.walltime_seconds - farewell_seconds(resources)
    return f"timeout --foreground --preserve-status --signal=INT {seconds:.0f} "
