"""What many tables, tasks and workers cost beside the bounces: starting, scheduling, memory, reading."""

from __future__ import annotations

import pickle
import resource
import signal
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
import psutil
from distributed import Client, LocalCluster

import scanner
from scanner.engine import dispatch
from scanner.engine.agenda import Agenda
from scanner.engine.work import Order, Outcome
from scanner.store import Ledger, Receipt, Regions, compact_store, prepare_store, sweep_progress
from scanner.study import Plan, load_study, make_plan, parse_study

STUDY = """
[study]
title = "Benchmark"
seed = 1

[table]
family = "radial_harmonic"
harmonic = {harmonics}
amplitude = {{ start = {start}, stop = {stop}, count = {count} }}

[orbits]
per_table = {per_table}
bounces = {bounces}
replicates = 2
"""
HARMONICS = "{ values = [2, 3, 4, 5, 6, 7, 8, 9, 10, 11] }"
DOZEN = 12
TABLES_A_TASK = 28
"""Tables of 128 orbits of 65536 bounces in one task: those of ``many_workers``."""


@dataclass
class Watched:
    """A sweep in a process of its own, the client with its scheduler, looked at from outside.

    ``moments`` holds seconds since the start, resident bytes, processor seconds and tasks finished.
    """

    started: float
    moments: list[tuple[float, int, float, int]] = field(default_factory=list)

    @property
    def steady(self) -> list[tuple[float, int, float, int]]:
        """Moments from when the first tasks were finished to when all were."""
        last = self.moments[-1][3]
        return [moment for moment in self.moments if 0 < moment[3] < last] or self.moments[-1:]


def watch_sweep(study: Path, store: Path, workers: int, most_seconds: float) -> Watched:
    """Run ``scanner sweep`` and look at its process every half second; interrupt it after a while."""
    command = [sys.executable, "-m", "scanner", "sweep", str(study), "--store", str(store), "--workers", str(workers)]
    watched = Watched(time.time())
    receipts = Ledger(store).folder / "receipts"
    with subprocess.Popen(command, stderr=subprocess.DEVNULL, stdout=subprocess.DEVNULL) as client:
        process = psutil.Process(client.pid)
        while client.poll() is None:
            passed = time.time() - watched.started
            if passed > most_seconds:
                client.send_signal(signal.SIGINT)
                most_seconds = float("inf")
            finished = sum(1 for _ in receipts.glob("*.json")) if receipts.exists() else 0
            try:
                spent = process.cpu_times()
                watched.moments.append((passed, process.memory_info().rss, spent.user + spent.system, finished))
            except psutil.NoSuchProcess:
                break
            time.sleep(0.5)
    return watched


def least(work: Callable[[], object], repeats: int = 3) -> float:
    """Shortest time of a few repeats, in seconds."""
    seconds = []
    for _ in range(repeats):
        begun = time.perf_counter()
        work()
        seconds.append(time.perf_counter() - begun)
    return min(seconds)


def many_tables(tables: int, seconds: float) -> None:
    """Time estimate, start, opening and slicing of a study of many tables, and watch the memory of its client."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        study = folder / "study.toml"
        study.write_text(
            STUDY.format(harmonics=HARMONICS, start=0.0, stop=0.05, count=tables // 10, per_table=8, bounces=512)
        )
        command = [sys.executable, "-m", "scanner", "estimate", str(study)]
        estimate = least(lambda: subprocess.run(command, check=True, stdout=subprocess.DEVNULL))
        spent = resource.getrusage(resource.RUSAGE_CHILDREN).ru_utime / 3
        print(f"{tables} tables: scanner estimate {estimate:.1f} s, {spent:.1f} s of a core", flush=True)

        watched = watch_sweep(study, folder / "swept.zarr", 2, seconds)
        receipts = list(Ledger(folder / "swept.zarr").receipts())
        first = min(each.finished - each.seconds for each in receipts) - watched.started
        print(f"scanner sweep: the first task begins after {first:.1f} s", flush=True)
        begun = [moment for moment in watched.moments if moment[0] > first]
        for passed, size, _, finished in begun[:: max(1, len(begun) // DOZEN)]:
            print(f"  after {passed:6.0f} s {finished:6d} tasks, client with scheduler {size / 1e6:6.1f} MB")

        store = folder / "filled.zarr"
        plan = make_plan(load_study(study))
        fill_with_noise(store, plan)
        time_reading("as swept", store)
        made = compact_store(store)
        print(f"compacted from {made.before} files to {made.after}")
        time_reading("compacted", store)


def time_reading(label: str, store: Path) -> None:
    """Print how long opening, slicing and progress take."""
    opening = least(lambda: scanner.open_sweep(store))
    slicing = least(lambda: scanner.open_sweep(store)["regular_area_fraction"].sel(harmonic=5).load())
    progress = least(lambda: sweep_progress(store))
    print(f"{label}: open {opening:.2f} s, open and slice one parameter {slicing:.2f} s, progress {progress:.2f} s")


def fill_with_noise(store: Path, plan: Plan) -> None:
    """Finish a study with random numbers, which compress as badly as measured ones."""
    prepare_store(store, plan)
    regions, ledger, random = Regions(store), Ledger(store), np.random.default_rng(1)
    for task in plan.tasks:
        groups = regions.read(task)
        for arrays in groups.values():
            for name, values in arrays.items():
                arrays[name] = (random.random(values.shape) if values.dtype.kind == "f" else values + 1).astype(
                    values.dtype
                )
        receipt = Receipt(
            task.number, task.kind, "here", time.time(), 1.0, task.tables, task.tables, task.tables, 0, 0, ()
        )
        ledger.write(receipt, regions.write(task, groups))


def many_workers(counts: tuple[int, ...], tasks: int) -> None:
    """Sweep tables that are not convex, so that tasks are short, with ever more workers."""
    print(f"{'workers':>8}{'tasks':>8}{'tasks/s':>9}{'client + scheduler':>20}{'idle, per worker':>18}{'memory':>10}")
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        study = folder / "study.toml"
        count = TABLES_A_TASK * tasks
        study.write_text(STUDY.format(harmonics="2", start=0.5, stop=0.6, count=count, per_table=128, bounces=65536))
        plan = make_plan(load_study(study))
        for workers in counts:
            watched = watch_sweep(study, folder / f"{workers}.zarr", workers, 600.0)
            (begun, _, before, done), (ended, size, after, all_done) = watched.steady[0], watched.steady[-1]
            rate = (all_done - done) / max(ended - begun, 1e-9)
            each = (after - before) / max(all_done - done, 1)
            print(
                f"{workers:>8}{all_done:>8}{rate:>9.1f}{each * 1e3:>17.2f} ms{idle_share(workers):>15.2%}   "
                f"{size / 1e6:>6.0f} MB",
                flush=True,
            )
        order = Order(str(folder), plan.study.text, "", False, plan.study.fingerprint)
        outcome = Outcome(1, 1, 1, 1, 1, 1, 1.0, "host")
        print(f"a task sends {len(pickle.dumps(order))} bytes to its worker and {len(pickle.dumps(outcome))} back")


def do_nothing(order: Order, number: int) -> Outcome:
    """Stand in for a task: what is left of a run is the client, the scheduler and what they send."""
    return Outcome(number, 1, 1, 1, 0, 0, 0.0, "host")


def scheduling_alone(tasks: int) -> None:
    """Dispatch tasks that do nothing to two workers: the highest rate, and the memory as it goes."""
    text = STUDY.format(harmonics="2", start=0.5, stop=0.6, count=TABLES_A_TASK * tasks, per_table=128, bounces=65536)
    plan = make_plan(parse_study(text))
    dispatch.run_task = do_nothing
    with LocalCluster(n_workers=2, threads_per_worker=1, dashboard_address=":0") as cluster, Client(cluster) as client:
        landed: list[int] = []
        order = Order("nowhere", text, "", False, plan.study.fingerprint)
        agenda = Agenda(plan, frozenset())
        dispatcher = dispatch.Dispatcher(client, order, agenda, lambda outcome: landed.append(outcome.task), print)
        begun, spent, shown = time.perf_counter(), time.process_time(), 0
        while dispatcher.turn():
            if len(landed) - shown >= tasks // DOZEN:
                shown = len(landed)
                size = psutil.Process().memory_info().rss
                print(f"  {shown:6d} tasks, {dispatcher.flying} in flight, client with scheduler {size / 1e6:.1f} MB")
        passed = time.perf_counter() - begun
        each = (time.process_time() - spent) / len(landed)
        rate = len(landed) / passed
        print(f"{len(landed)} tasks that do nothing: {rate:.0f} a second, each {each * 1e3:.2f} ms of a core")


def idle_share(workers: int) -> float:
    """Share of a core that the scheduler spends on one worker that has nothing to do."""
    with LocalCluster(n_workers=workers, threads_per_worker=1, dashboard_address=":0") as cluster, Client(cluster):
        time.sleep(5.0)
        before = time.process_time()
        time.sleep(10.0)
        return (time.process_time() - before) / 10.0 / workers
