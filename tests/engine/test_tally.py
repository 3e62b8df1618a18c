import pytest

from scanner.engine import tally
from scanner.engine.tally import PACE_SECONDS, Tally, clock
from scanner.engine.work import Outcome
from scanner.store import SweepProgress

BEFORE = SweepProgress(
    tables=10,
    settled=2,
    done=1,
    not_convex=1,
    failed=0,
    orbits=1000,
    orbits_settled=200,
    tasks=5,
    finished=frozenset({0}),
    bounces_per_second=None,
    seconds_left=None,
    hosts={},
    failures={},
    running=True,
)


@pytest.fixture
def now(monkeypatch):
    """A clock that is set by hand."""
    time = [0.0]
    monkeypatch.setattr(tally.time, "monotonic", lambda: time[0])
    return time


def outcome(**changes):
    found = {"task": 0, "orbits": 200, "bounces": 8_000_000, "done": 1, "not_convex": 1, "failed": 0}
    return Outcome(**{**found, "seconds": 1.0, "host": "here", **changes})


def test_nothing_is_promised_before_the_first_task(now):
    assert Tally(BEFORE).seconds_left is None
    assert "2/10 tables" in Tally(BEFORE).describe(2)


def test_rate_and_time_left(now):
    counted = Tally(BEFORE)
    now[0] = 2.0
    counted.add(outcome())
    counted.add(outcome(done=1, not_convex=0, failed=1))
    assert counted.bounces_per_second == pytest.approx(8e6, rel=1e-12)
    assert counted.seconds_left == pytest.approx(400 / 200, rel=1e-12)
    assert counted.describe(2) == "6/10 tables, 1 failed, 8.0 M bounces/s, 2 workers, 0:00:02 left"


def test_the_rate_is_that_of_the_last_minutes(now):
    counted = Tally(BEFORE)
    for step in range(1, 5):
        now[0] = step * PACE_SECONDS
        counted.add(outcome(bounces=step * 1000, orbits=10))
    # Only the last interval is young enough: 4000 bounces in PACE_SECONDS.
    assert counted.bounces_per_second == pytest.approx(4000 / PACE_SECONDS, rel=1e-12)


@pytest.mark.parametrize(("seconds", "text"), [(0.4, "0:00:00"), (59.6, "0:01:00"), (7325, "2:02:05")])
def test_times_are_written_like_a_clock(seconds, text):
    assert clock(seconds) == text
