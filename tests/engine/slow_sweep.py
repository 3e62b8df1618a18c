"""A study whose tasks take as long as the environment says, and the command that sweeps it."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from collections.abc import Callable, Sequence
from contextlib import suppress
from pathlib import Path

import psutil
from sweeps import everything

from scanner.store import Ledger

SHAPES = """
import os
import time

import numpy as np


def ellipse(number):
    time.sleep(float(os.environ.get("SECONDS_A_TABLE", "0")))
    if number == 7 and "RAISE" in os.environ:
        raise ArithmeticError("seven is not my number")
    if number == 30 and os.path.exists(os.environ.get("GREEDY", "")):
        hoard = []
        while len(hoard) < 40:
            hoard.append(np.ones(5_000_000))
            time.sleep(0.02)
    return np.array([[0, 1.0], [0, 0], [0, 0], [0, 1.0 - number / 1000]])
"""
"""Slow ones, one that may raise, one that may take 40 times 40 MB."""

STUDY = """
[study]
title = "Slow"
seed = 3
[table]
family = "slow_shapes:ellipse"
number = { start = 1, stop = 138, count = 138 }
[orbits]
per_table = 64
bounces = 64
replicates = 4
"""
"""Six tasks of 23 tables."""

TASKS = 6

PATIENCE = 300.0
"""Long, as machines are slow at times; only what fails takes it."""


STARTED: list[Sweep] = []


def write_study(folder: Path, resources: str = "") -> Path:
    """Put the study and its code into a folder."""
    (folder / "slow_shapes.py").write_text(SHAPES)
    (folder / "slow.toml").write_text(STUDY + resources)
    return folder / "slow.toml"


class Sweep:
    """The command `scanner sweep`, running in a process group of its own as under a terminal."""

    def __init__(
        self,
        study: Path,
        store: Path,
        *options: str,
        seconds_a_table: float = 0.02,
        before: Sequence[str] = (),
        **environment: str,
    ) -> None:
        self.store = store
        self.process = subprocess.Popen(
            [
                *before,
                sys.executable,
                "-m",
                "scanner",
                "sweep",
                str(study),
                "--store",
                str(store),
                "--allow-code",
                *options,
            ],
            cwd=study.parent,
            env={**os.environ, "SECONDS_A_TABLE": str(seconds_a_table), **environment},
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            text=True,
            start_new_session=True,
        )
        STARTED.append(self)

    def end(self) -> None:
        """Leave no process behind, whatever the test came to."""
        if self.process.returncode is None:
            with suppress(ProcessLookupError):
                os.killpg(self.process.pid, signal.SIGKILL)
            self.process.communicate()

    def wait(self) -> tuple[int, str]:
        """Wait for the end: exit status, and all that was printed."""
        out, err = self.process.communicate(timeout=PATIENCE)
        return self.process.returncode, out + err

    def log(self) -> str:
        """What was written to the log beside the store so far."""
        log = self.store.with_suffix(".log")
        return log.read_text() if log.exists() else ""

    def receipts(self) -> list[int]:
        """Tasks that are finished."""
        return Ledger(self.store).listed()

    def receipt_files(self) -> dict[str, tuple[bytes, int]]:
        """Contents and times of change of the receipts, without what a process left half-written when it ended."""
        files = everything(Ledger(self.store).folder / "receipts")
        return {name: found for name, found in files.items() if not name.endswith(".partial")}

    def await_receipts(self, count: int) -> None:
        """Wait until so many tasks are finished."""
        wait_until(lambda: len(self.receipts()) >= count or self.process.poll() is not None)
        assert self.process.poll() is None, self.wait()

    def workers(self) -> list[psutil.Process]:
        """Worker processes."""
        children = psutil.Process(self.process.pid).children(recursive=True)
        return [child for child in children if "spawn_main" in " ".join(child.cmdline())]


def wait_until(condition: Callable[[], bool]) -> None:
    """Wait for something to become true."""
    give_up = time.monotonic() + PATIENCE
    while not condition():
        assert time.monotonic() < give_up, "waited in vain"
        time.sleep(0.05)
