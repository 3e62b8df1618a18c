"""Tasks that misbehave on purpose, in place of real ones; a module, so that workers can import them."""

from __future__ import annotations

import os
import time
from pathlib import Path

from scanner.engine.work import Order, Outcome


def done(number: int) -> Outcome:
    """A task that went well."""
    return Outcome(number, orbits=1, bounces=1, done=1, not_convex=0, failed=0, seconds=0.0, host="here")


def fail_twice(order: Order, number: int) -> Outcome:
    """Raise at the first two attempts at task 1; the folder of the order counts them."""
    counter = Path(order.folder) / "attempts"
    if number == 1 and (attempts := len(counter.read_text()) if counter.exists() else 0) < 2:
        counter.write_text("x" * (attempts + 1))
        raise OSError("not yet")
    return done(number)


def fail_always(order: Order, number: int) -> Outcome:
    """Raise at task 1."""
    if number == 1:
        raise OSError(28, "No space\nleft on device")
    return done(number)


def kill_worker(order: Order, number: int) -> Outcome:
    """Take the worker down at task 1."""
    if number == 1:
        os._exit(9)
    return done(number)


def note_and_wait(order: Order, number: int) -> Outcome:
    """Leave a file when begun, then take a while."""
    (Path(order.folder) / f"begun-{number}").touch()
    time.sleep(0.5)
    return done(number)
