"""Whatever happens to a sweep, the store ends up as if nothing had happened."""

import os
import signal
import socket
import time

import pytest
from hosts import FAR, NEAR, two_hosts, why_no_hosts
from own_cluster import IMPATIENT, LOOPBACK, own_cluster
from slow_sweep import TASKS, Sweep, wait_until
from sweeps import results

from scanner.quantities import DONE
from scanner.store import open_sweep, sweep_progress


def test_ten_killed_workers_cost_their_tasks_only(study, undisturbed, tmp_path):
    sweep = Sweep(study, tmp_path / "slow.zarr", "--workers", "2", seconds_a_table=0.06)
    for killed in range(0, 10, 2):
        wait_until(lambda killed=killed: sweep.log().count("has joined") == killed + 2)
        for worker in sweep.workers():
            worker.kill()  # A task takes more than a second: it is in the middle of one.
    status, printed = sweep.wait()
    assert status == 0, printed
    assert ", 10 workers lost, " in printed
    assert " tasks repeated" in printed
    assert sweep.log().count("is gone") == 10
    assert results(sweep.store) == undisturbed


@pytest.mark.parametrize("everybody", [False, True])
def test_a_killed_client_is_carried_on(everybody, study, undisturbed, carry_on, tmp_path):
    first = Sweep(study, tmp_path / "slow.zarr", "--workers", "2")
    first.await_receipts(2)
    workers = first.workers()
    if everybody:
        os.killpg(first.process.pid, signal.SIGKILL)
    else:
        first.process.kill()
    first.wait()
    wait_until(lambda: not any(worker.is_running() for worker in workers))
    kept = first.receipts()
    assert 2 <= len(kept) < TASKS
    with open_sweep(first.store) as tree:
        # A task may have been killed between its chunks and its receipt.
        assert int((tree["table_status"] == DONE).sum()) >= 23 * len(kept)
    (first.store / "area" / "c.0.0123456789.partial").write_bytes(b"half")
    before = first.receipt_files()
    carry_on(first.store)
    assert results(first.store) == undisturbed
    after = first.receipt_files()
    assert {name: after[name] for name in before} == before
    assert f"{len(kept)} of {TASKS} tasks are finished" in first.log()


def test_a_second_client_is_told_who_holds_the_store(study, undisturbed, carry_on, tmp_path):
    first = Sweep(study, tmp_path / "slow.zarr", "--workers", "1", seconds_a_table=0.2)
    first.await_receipts(1)
    status, printed = Sweep(study, first.store, "--workers", "1").wait()
    assert status == 2
    assert f"in use by process {first.process.pid} on {socket.gethostname()}" in printed
    assert len(first.receipts()) < TASKS
    first.end()  # A killed holder has left its lock behind, which stops nobody.
    carry_on(first.store)
    assert results(first.store) == undisturbed


def test_an_interrupt_while_workers_start_is_honoured(study, tmp_path):
    sweep = Sweep(study, tmp_path / "slow.zarr", "--workers", "2", seconds_a_table=5)
    wait_until(lambda: f"0 of {TASKS} tasks are finished" in sweep.log())
    os.killpg(sweep.process.pid, signal.SIGINT)
    status, printed = sweep.wait()
    assert status == 130, printed
    assert "Traceback" not in printed
    assert "has joined" not in sweep.log()
    assert sweep.receipts() == []


def test_a_request_to_terminate_stops_at_once(study, undisturbed, carry_on, tmp_path):
    sweep = Sweep(study, tmp_path / "slow.zarr", "--workers", "2", seconds_a_table=0.1)
    sweep.await_receipts(1)
    workers = sweep.workers()
    sweep.process.terminate()
    status, printed = sweep.wait()
    assert status == 130, printed
    assert "to carry on" in printed
    assert not any(worker.is_running() for worker in workers)
    carry_on(sweep.store)
    assert results(sweep.store) == undisturbed


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


def test_a_killed_scheduler_is_reported_and_carried_on(study, undisturbed, carry_on, tmp_path):
    with own_cluster(tmp_path, study) as cluster:
        first = Sweep(study, tmp_path / "slow.zarr", "--scheduler-file", str(cluster.file))
        first.await_receipts(1)
        cluster.scheduler.kill()
        status, printed = first.wait()
    assert status == 2, printed
    assert "is gone" in printed
    assert "to carry on" in printed
    assert "Traceback" not in printed
    assert 1 <= len(first.receipts()) < TASKS
    carry_on(first.store)
    assert results(first.store) == undisturbed


def test_a_worker_that_is_stopped_is_given_up(study, undisturbed, tmp_path):
    slow = {"SECONDS_A_TABLE": "0.1", **IMPATIENT}
    with own_cluster(tmp_path, study, [LOOPBACK] * 2, **slow) as cluster:
        sweep = Sweep(study, tmp_path / "slow.zarr", "--scheduler-file", str(cluster.file))
        wait_until(lambda: sweep.log().count("has joined") == 2)
        cluster.worker(1).suspend()  # It still answers on the network, as the system does that for it.
        status, printed = sweep.wait()
    assert status == 0, printed
    assert " workers lost, " in printed  # The other one too, if this machine is so busy that it is silent for long.
    assert results(sweep.store) == undisturbed


@pytest.mark.skipif(why_no_hosts() is not None, reason=f"no host to cut off: {why_no_hosts()}")
def test_a_host_that_is_cut_off_is_given_up(study, undisturbed, tmp_path):
    slow = {"SECONDS_A_TABLE": "0.1", **IMPATIENT}
    with two_hosts() as hosts:
        near, far = (hosts.on(hosts.near), NEAR), (hosts.on(hosts.far), FAR)
        with own_cluster(tmp_path, study, [near, far], **slow) as cluster:
            sweep = Sweep(
                study, tmp_path / "slow.zarr", "--scheduler-file", str(cluster.file), before=hosts.on(hosts.near)
            )
            wait_until(lambda: sweep.log().count("has joined") == 2)
            hosts.pull_the_cable()
            status, printed = sweep.wait()
    assert status == 0, printed
    assert f"{FAR}:" in sweep.log().partition("is gone")[0].splitlines()[-1]
    assert " workers lost, " in printed  # The other one too, if this machine is so busy that it is silent for long.
    assert results(sweep.store) == undisturbed


def test_a_table_for_which_memory_never_suffices_is_abandoned(study, undisturbed, carry_on, tmp_path):
    greedy = tmp_path / "greedy"
    greedy.touch()
    soon = {"DASK_DISTRIBUTED__SCHEDULER__ALLOWED_FAILURES": "0", "GREEDY": str(greedy)}
    with own_cluster(tmp_path, study, worker_options=["--memory-limit", "800MB"], **soon) as cluster:
        sweep = Sweep(study, tmp_path / "slow.zarr", "--scheduler-file", str(cluster.file))
        status, printed = sweep.wait()
    assert status == 1, printed
    assert "number = 30: not computed, its workers died again and again while computing it" in printed
    assert ", 3 workers lost, " in printed
    assert len(sweep.receipts()) == TASKS - 1
    greedy.unlink()
    carry_on(sweep.store)
    assert results(sweep.store) == undisturbed
