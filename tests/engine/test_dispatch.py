import logging
import time

import dask
import pytest
import stand_ins
from distributed import Client, LocalCluster
from sweeps import grid

from scanner.engine import dispatch
from scanner.engine.agenda import Agenda
from scanner.engine.dispatch import PER_THREAD, Dispatcher
from scanner.engine.work import Order
from scanner.errors import EngineError
from scanner.study import Plan

PLAN = Plan(grid(), (1, 1), 256)
"""Ten tasks."""


@pytest.fixture(scope="module")
def client():
    """One worker thread in this process."""
    with (
        LocalCluster(n_workers=1, threads_per_worker=1, processes=False, dashboard_address=":0") as cluster,
        Client(cluster) as client,
    ):
        yield client


class Run:
    """A dispatcher with what it said and what landed."""

    def __init__(self, client, folder, task, monkeypatch):
        monkeypatch.setattr(dispatch, "run_task", task)
        order = Order("", "", str(folder), False, "")
        self.landed = []
        self.said = []
        self.dispatcher = Dispatcher(client, order, Agenda(PLAN, ()), self.landed.append, self.said.append)

    def to_the_end(self):
        while self.dispatcher.turn():
            pass
        return sorted(outcome.task for outcome in self.landed)


def test_every_task_lands_once(client, tmp_path, monkeypatch):
    assert Run(client, tmp_path, stand_ins.fail_twice, monkeypatch).to_the_end() == list(range(10))


def test_a_task_that_raises_is_tried_again(client, tmp_path, monkeypatch, caplog):
    with caplog.at_level(logging.WARNING):
        Run(client, tmp_path, stand_ins.fail_twice, monkeypatch).to_the_end()
    assert (tmp_path / "attempts").read_text() == "xx"
    assert sum("task 1 failed" in record.message for record in caplog.records) == 2


def test_a_task_that_always_raises_ends_the_run_with_one_line(client, tmp_path, monkeypatch):
    with pytest.raises(EngineError, match=r"task 1 failed 3 times, last with OSError: .*No space left") as caught:
        Run(client, tmp_path, stand_ins.fail_always, monkeypatch).to_the_end()
    assert "\n" not in str(caught.value)


def test_the_window_is_bounded(client, tmp_path, monkeypatch):
    run = Run(client, tmp_path, stand_ins.fail_twice, monkeypatch)
    widest = 0
    while run.dispatcher.turn():
        widest = max(widest, run.dispatcher.flying)
    assert 0 < widest <= PER_THREAD


def test_draining_finishes_what_was_begun_and_nothing_else(client, tmp_path, monkeypatch):
    run = Run(client, tmp_path, stand_ins.note_and_wait, monkeypatch)
    while not (tmp_path / "begun-0").exists():
        run.dispatcher.turn()
    run.dispatcher.drain()
    finished = run.to_the_end()
    assert 0 in finished or 1 in finished
    assert len(finished) <= 2
    assert sorted(int(file.name.removeprefix("begun-")) for file in tmp_path.iterdir()) == list(
        range(len(list(tmp_path.iterdir())))
    )
    assert len(list(tmp_path.iterdir())) <= 3


def test_a_task_that_kills_its_workers_is_abandoned_and_the_others_are_not(tmp_path, monkeypatch):
    monkeypatch.setattr(dispatch, "ATTEMPTS", 2)
    with (
        dask.config.set({"distributed.scheduler.allowed-failures": 0}),
        LocalCluster(
            n_workers=1, threads_per_worker=1, dashboard_address=":0", silence_logs=logging.CRITICAL
        ) as cluster,
        Client(cluster) as client,
    ):
        run = Run(client, tmp_path, stand_ins.kill_worker, monkeypatch)
        assert run.to_the_end() == [0, *range(2, 10)]
        assert list(run.dispatcher.abandoned) == [1]


def test_a_worker_that_leaves_in_good_order_is_not_lost(tmp_path, monkeypatch, caplog):
    with (
        LocalCluster(n_workers=2, threads_per_worker=1, processes=False, dashboard_address=":0") as cluster,
        Client(cluster) as client,
        caplog.at_level(logging.INFO, logger="scanner"),  # last, as a cluster silences all handlers that it meets
    ):
        run = Run(client, tmp_path, stand_ins.note_and_wait, monkeypatch)
        while not run.landed:
            run.dispatcher.turn()
        client.retire_workers([next(iter(run.dispatcher.workers))])  # as at the end of a job's time
        assert run.to_the_end() == list(range(10))
    assert "has left in good order" in caplog.text
    assert run.dispatcher.losses.workers == 0


def test_being_without_workers_is_said(tmp_path, monkeypatch):
    monkeypatch.setattr(dispatch, "LONELY_SECONDS", 0.2)
    with (
        LocalCluster(n_workers=0, threads_per_worker=1, processes=False, dashboard_address=":0") as cluster,
        Client(cluster) as client,
    ):
        run = Run(client, tmp_path, stand_ins.fail_twice, monkeypatch)
        give_up = time.monotonic() + 10
        while not run.said and time.monotonic() < give_up:
            assert run.dispatcher.turn()
        assert "no workers" in run.said[0]
        cluster.scale(1)
        assert run.to_the_end() == list(range(10))
