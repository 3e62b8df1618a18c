from dataclasses import replace

import pytest

from scanner.errors import StoreError
from scanner.store import Charter, Ledger, Receipt, sweep_progress

RECEIPT = Receipt(
    task=0,
    kind="survey",
    host="a",
    finished=1000.0,
    seconds=10.0,
    orbits=100,
    bounces=5000,
    done=1,
    not_convex=1,
    failed=0,
    failures=(),
)


@pytest.fixture
def ledger(tmp_path):
    ledger = Ledger(tmp_path)
    ledger.found(Charter("ab", "", tasks=5, tables=10, orbits=50, bounces=100, template={}))
    return ledger


def test_before_the_first_receipt(ledger):
    state = sweep_progress(ledger.store)
    assert (state.tables, state.settled, state.tasks, state.tasks_finished) == (10, 0, 5, 0)
    assert state.bounces_per_second is None
    assert state.seconds_left is None
    assert not state.complete


def test_counts_rate_and_time_left(ledger):
    ledger.write(RECEIPT, {})
    ledger.write(replace(RECEIPT, task=1, host="b", finished=1010.0, seconds=20.0), {})
    failed = replace(RECEIPT, task=4, host="b", finished=1010.0, done=0, failed=1, failures=(((4,), "why"),))
    ledger.write(failed, {})
    state = sweep_progress(ledger.store)
    assert (state.settled, state.done, state.not_convex, state.failed) == (6, 2, 3, 1)
    # From 990 to 1010: three tasks of 5000 bounces and 100 orbits; 200 orbits of 500 are left.
    assert state.bounces_per_second == pytest.approx(15000 / 20, rel=1e-12)
    assert state.seconds_left == pytest.approx(200 / (300 / 20), rel=1e-12)
    assert state.hosts == {"b": pytest.approx(0.75, rel=1e-12), "a": pytest.approx(0.25, rel=1e-12)}
    assert state.failures == {(4,): "why"}
    assert not state.running


def test_work_of_long_ago_does_not_count_for_the_rate(ledger):
    ledger.write(RECEIPT, {})
    ledger.write(replace(RECEIPT, task=1, finished=90000.0, seconds=10.0), {})
    assert sweep_progress(ledger.store).bounces_per_second == pytest.approx(500, rel=1e-12)


def test_a_missing_store_is_refused(tmp_path):
    with pytest.raises(StoreError, match="no such store"):
        sweep_progress(tmp_path / "none")
