"""What a sweep costs beside its bounces: one worker against two, time between tasks, time to write, memory."""

from __future__ import annotations

import statistics
import tempfile
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

import psutil

from scanner.cells import compute
from scanner.engine import run_study
from scanner.store import Ledger, open_regions, prepare_store
from scanner.study import load_study, make_plan

STUDY = """
[study]
title = "Benchmark"
seed = 1

[table]
family = "radial_harmonic"
harmonic = 2
amplitude = {{ start = 0.0, stop = 0.1, count = {tables} }}

[orbits]
per_table = {orbits}
bounces = {bounces}
replicates = 8
"""
FEW_BOUNCES = 256
"""Bounces of the runs that look at memory alone."""
LONG_TASK = 10.0
"""Seconds of a task in a study of some length."""


@dataclass(frozen=True)
class Run:
    """Seconds of a whole run and from its first task to its last, seconds within tasks, tasks, peak bytes a worker."""

    whole: float
    span: float
    within: float
    tasks: int
    memory: int


class PeakMemory:
    """Largest resident size that any process below this one has had."""

    def __init__(self) -> None:
        self.bytes = 0
        self._over = threading.Event()

    @contextmanager
    def watched(self) -> Iterator[None]:
        """Look five times a second while the body runs."""
        watcher = threading.Thread(target=self._watch)
        watcher.start()
        try:
            yield
        finally:
            self._over.set()
            watcher.join()

    def _watch(self) -> None:
        while not self._over.wait(0.2):
            for process in psutil.Process().children(recursive=True):
                try:
                    self.bytes = max(self.bytes, process.memory_info().rss)
                except psutil.NoSuchProcess:
                    continue


def run_once(study: Path, store: Path, workers: int) -> Run:
    """Run a study into a new store."""
    memory = PeakMemory()
    with memory.watched():
        report = run_study(study, store, workers=workers, progress=False)
    receipts = list(Ledger(store).receipts())
    return Run(
        whole=report.seconds,
        span=max(each.finished for each in receipts) - min(each.finished - each.seconds for each in receipts),
        within=sum(each.seconds for each in receipts),
        tasks=len(receipts),
        memory=memory.bytes,
    )


def writing_seconds(study: Path, store: Path, repeats: int = 5) -> float:
    """Median seconds that the first task of a study takes to write its region."""
    plan = make_plan(load_study(study))
    prepare_store(store, plan)
    task = plan.tasks[0]
    result = compute(plan, task)
    regions = open_regions(store, plan.study.fingerprint)
    seconds = []
    for _ in range(repeats):
        start = time.perf_counter()
        regions.write(task, result.groups)
        seconds.append(time.perf_counter() - start)
    return statistics.median(seconds)


def compare_memory(tables: int) -> None:
    """Run studies of ever more tables and print the most memory that a process had."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        for number in (tables, 8 * tables, 64 * tables):
            study = folder / f"{number}.toml"
            study.write_text(STUDY.format(tables=number, orbits=64, bounces=FEW_BOUNCES))
            run = run_once(study, folder / f"{number}.zarr", workers=1)
            print(f"{number:>8} tables of 64 orbits: at most {run.memory / 1e6:.0f} MB a process, {run.whole:.1f} s")


def compare_workers(tables: int, bounces: int) -> None:
    """Run one study with one worker and with two and print what it cost."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        study = folder / "study.toml"
        study.write_text(STUDY.format(tables=tables, orbits=1024, bounces=bounces))
        writing = writing_seconds(study, folder / "written.zarr")
        one, two = (run_once(study, folder / f"{workers}.zarr", workers) for workers in (1, 2))

    total = 1024 * tables * bounces
    between = (one.span - one.within) / one.tasks
    print(f"{tables} tables of 1024 orbits of {bounces} bounces in {one.tasks} tasks")
    for workers, run in (("one worker", one), ("two workers", two)):
        print(
            f"{workers:<12}{run.whole:8.1f} s, first task to last{run.span:8.1f} s, "
            f"{total / run.span / 1e6:6.1f} M bounces/s, at most {run.memory / 1e6:.0f} MB a process"
        )
    print(f"two against one: {one.whole / two.whole:.2f} times, first task to last {one.span / two.span:.2f} times")
    print(
        f"a task: {one.within / one.tasks:.2f} s, of which writing {writing * 1e3:.0f} ms; "
        f"{between * 1e3:.0f} ms to the next; together {(writing + between) / LONG_TASK:.2%} of {LONG_TASK:.0f} s"
    )
