"""Whatever happens to a sweep, the store ends up as if nothing had happened."""

import contextlib
import os
import signal
import subprocess
import sys
import time

import pytest
from distributed import Client, LocalCluster
from slow_sweep import TASKS, Sweep, wait_until, write_study
from sweeps import everything, fill, results

from scanner.engine import run_study
from scanner.quantities import DONE
from scanner.store import Ledger, open_sweep, sweep_progress
from scanner.study import load_study


@pytest.fixture(scope="module")
def study(tmp_path_factory):
    return write_study(tmp_path_factory.mktemp("study"))


@pytest.fixture
def carry_on(study, monkeypatch):
    """Run the study again on the same store, with a worker in this process."""
    monkeypatch.chdir(study.parent)

    def run(store):
        with (
            LocalCluster(n_workers=1, threads_per_worker=1, processes=False, dashboard_address=":0") as cluster,
            Client(cluster) as client,
        ):
            assert run_study(study, store, client, allow_code=True, progress=False).exit_status == 0

    yield run
    sys.modules.pop("slow_shapes", None)


@pytest.fixture(scope="module")
def undisturbed(study, tmp_path_factory):
    """The same study, computed here one task after the other."""
    path = tmp_path_factory.mktemp("undisturbed") / "slow.zarr"
    here = os.getcwd()
    os.chdir(study.parent)
    try:
        fill(path, load_study(study, allow_code=True))
    finally:
        os.chdir(here)
        sys.modules.pop("slow_shapes", None)
    return results(path)


def test_a_killed_worker_costs_its_task_only(study, undisturbed, tmp_path):
    sweep = Sweep(study, tmp_path / "slow.zarr", "--workers", "2")
    sweep.await_receipts(1)
    sweep.workers()[0].kill()
    status, printed = sweep.wait()
    assert status == 0, printed
    assert results(sweep.store) == undisturbed
    assert "is gone" in (tmp_path / "slow.log").read_text()


def test_a_killed_client_is_carried_on(study, undisturbed, carry_on, tmp_path):
    first = Sweep(study, tmp_path / "slow.zarr", "--workers", "2")
    first.await_receipts(2)
    workers = first.workers()
    first.process.kill()
    first.wait()
    wait_until(lambda: not any(worker.is_running() for worker in workers))
    kept = first.receipts()
    assert 2 <= len(kept) < TASKS
    with open_sweep(first.store) as tree:
        # A task may have been killed between its chunks and its receipt.
        assert int((tree["table_status"] == DONE).sum()) >= 23 * len(kept)
    (first.store / "area" / "c.0.0123456789.partial").write_bytes(b"half")
    before = everything(Ledger(first.store).folder / "receipts")
    carry_on(first.store)
    assert results(first.store) == undisturbed
    after = everything(Ledger(first.store).folder / "receipts")
    assert {name: after[name] for name in before} == before
    assert f"{len(kept)} of {TASKS} tasks are finished" in (tmp_path / "slow.log").read_text()


def test_the_first_interrupt_lets_tasks_finish(study, undisturbed, carry_on, tmp_path):
    first = Sweep(study, tmp_path / "slow.zarr", "--workers", "2")
    first.await_receipts(1)
    before = len(first.receipts())
    os.killpg(first.process.pid, signal.SIGINT)
    status, printed = first.wait()
    assert status == 130, printed
    assert "to carry on" in printed
    assert "Traceback" not in printed
    assert before < len(first.receipts()) < TASKS
    carry_on(first.store)
    assert results(first.store) == undisturbed


def test_the_second_interrupt_stops_at_once(study, tmp_path):
    sweep = Sweep(study, tmp_path / "slow.zarr", "--workers", "2", seconds_a_table=60)
    log = tmp_path / "slow.log"
    wait_until(lambda: log.exists() and "has joined" in log.read_text())
    time.sleep(1)
    os.killpg(sweep.process.pid, signal.SIGINT)
    wait_until(lambda: "stopping" in log.read_text())
    started = time.monotonic()
    os.killpg(sweep.process.pid, signal.SIGINT)
    status, printed = sweep.wait()
    assert status == 130, printed
    assert "Traceback" not in printed
    assert time.monotonic() - started < 20  # A task takes 23 minutes; a few seconds go to ending the processes.
    assert not sweep_progress(sweep.store).running


@contextlib.contextmanager
def cluster(folder, study):
    """A scheduler and a worker of their own."""
    file = folder / "scheduler.json"
    tool = [sys.executable, "-m"]
    place = {"cwd": study.parent, "stderr": subprocess.DEVNULL, "stdout": subprocess.DEVNULL}
    environment = {**os.environ, "SECONDS_A_TABLE": "0.02"}
    options = ["--host", "127.0.0.1", "--port", "0", "--no-dashboard", "--scheduler-file", str(file)]
    scheduler = subprocess.Popen([*tool, "distributed.cli.dask_scheduler", *options], **place)
    wait_until(file.exists)
    options = ["--scheduler-file", str(file), "--nthreads", "1", "--no-dashboard", "--local-directory", str(folder)]
    worker = subprocess.Popen([*tool, "distributed.cli.dask_worker", *options], **place, env=environment)
    try:
        yield scheduler, file
    finally:
        for process in (worker, scheduler):
            process.terminate()
            process.wait(20)
        file.unlink(missing_ok=True)


def test_a_killed_scheduler_is_reported_and_carried_on(study, undisturbed, carry_on, tmp_path):
    with cluster(tmp_path, study) as (scheduler, file):
        first = Sweep(study, tmp_path / "slow.zarr", "--scheduler-file", str(file))
        first.await_receipts(1)
        scheduler.kill()
        status, printed = first.wait()
    assert status == 2, printed
    assert "is gone" in printed
    assert "to carry on" in printed
    assert "Traceback" not in printed
    assert 1 <= len(first.receipts()) < TASKS
    carry_on(first.store)
    assert results(first.store) == undisturbed
