"""Kernels compiled once on every host, before its workers need them.

Compiling takes half a minute and more memory than all that a worker does later, and many processes that do it at once
spoil each other's entries in the cache.  So one process does it, ends, and the others load what it left.
"""

from __future__ import annotations

import fcntl
import subprocess
import sys

from scanner.compiled import cache_folder

COMPILE = """
from scanner.indicators import MINIMUM_BOUNCES, orbit_numbers
from scanner.tables import build_table
orbit_numbers(build_table("ellipse", eccentricity=0.5), [0.1], [0.2], MINIMUM_BOUNCES)
"""


def kernels_are_warm() -> bool:
    """Whether this host has all kernels compiled."""
    return (cache_folder() / "warm").exists()


def warm_kernels() -> None:
    """Have all kernels compiled, or wait until another process has done it."""
    if kernels_are_warm():
        return
    folder = cache_folder()
    folder.mkdir(parents=True, exist_ok=True)
    with (folder / "lock").open("w") as lock:
        fcntl.flock(lock, fcntl.LOCK_EX)
        if not kernels_are_warm():
            done = subprocess.run([sys.executable, "-c", COMPILE], check=False, capture_output=True)
            # If it failed, whoever needs a kernel compiles it and meets the cause.
            if done.returncode == 0:
                (folder / "warm").touch()
