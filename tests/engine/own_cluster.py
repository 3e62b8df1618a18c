"""A scheduler and workers in processes of their own, as they are started on a cluster."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Iterator, Sequence
from contextlib import ExitStack, contextmanager
from dataclasses import dataclass
from pathlib import Path

import psutil
from slow_sweep import wait_until

LOOPBACK = ((), "127.0.0.1")
"""A place: words to put before a command so that it runs there, and the address of that host."""

IMPATIENT = {
    "DASK_DISTRIBUTED__COMM__TIMEOUTS__TCP": "12s",
    "DASK_DISTRIBUTED__SCHEDULER__WORKER_TTL": "8s",
}
"""Give up a host that is silent after seconds rather than minutes."""


@dataclass
class Cluster:
    """Its processes, and the file by which they find each other."""

    file: Path
    scheduler: subprocess.Popen[bytes]
    nannies: list[subprocess.Popen[bytes]]

    def worker(self, number: int) -> psutil.Process:
        """The process that does the work of one of the workers."""
        children = psutil.Process(self.nannies[number].pid).children(recursive=True)
        return next(child for child in children if "spawn_main" in " ".join(child.cmdline()))


@contextmanager
def own_cluster(
    folder: Path,
    study: Path,
    places: Sequence[tuple[Sequence[str], str]] = (LOOPBACK,),
    options: Sequence[str] = (),
    worker_options: Sequence[str] = (),
    **environment: str,
) -> Iterator[Cluster]:
    """Start a scheduler in the first place and a worker in every place."""
    file = folder / "scheduler.json"
    settings = {**os.environ, "SECONDS_A_TABLE": "0.02", **environment}
    dask = [sys.executable, "-m", "dask"]
    common = ["--scheduler-file", str(file), "--no-dashboard", *options]
    with ExitStack() as stack:

        def start(place: tuple[Sequence[str], str], *command: str) -> subprocess.Popen[bytes]:
            before, host = place
            words = [*before, *dask, *command, *common, "--host", host]
            process = subprocess.Popen(
                words, cwd=study.parent, env=settings, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL
            )
            stack.callback(end, process)
            return process

        scheduler = start(places[0], "scheduler", "--port", "0")
        wait_until(file.exists)
        local = ["--nthreads", "1", "--local-directory", str(folder), *worker_options]
        yield Cluster(file, scheduler, [start(place, "worker", *local) for place in places])
        file.unlink(missing_ok=True)


def end(process: subprocess.Popen[bytes]) -> None:
    """End a process with all that it has started."""
    family = []
    if process.poll() is None:
        family = psutil.Process(process.pid).children(recursive=True)
        process.kill()
    process.wait()
    for member in family:
        if member.is_running():
            member.kill()
