"""Kernels compiled once on every host, before its workers need them.

Compiling takes half a minute and more memory than all that a worker does later, and many processes that do it at once
spoil each other's entries in the cache.  So one process does it, ends, and the others load what it left.
"""

from __future__ import annotations

import fcntl
import subprocess
import sys
from pathlib import Path

from scanner.compiled import cache_folder

COMPILE = {
    "orbits": """
from scanner.indicators import MINIMUM_BOUNCES, orbit_numbers
from scanner.tables import build_table
orbit_numbers(build_table("ellipse", eccentricity=0.5), [0.1], [0.2], MINIMUM_BOUNCES)
build_table("radial_harmonic", amplitude=0.05, harmonic=2).symmetry
""",
    "resonances": """
from scanner.bounce.resonances import resonance_numbers
from scanner.measure.residues import judge_residues
from scanner.tables import build_table
resonance_numbers(build_table("ellipse", eccentricity=0.5), [(1, 2)])
judge_residues([2, 3, 5], [0.1, 0.01, 0.001])
""",
}
"""What is compiled for the orbits of a study, and for its resonances if it asks for them."""


def kernels_are_warm(*, resonances: bool = False) -> bool:
    """Whether this host has compiled all kernels that a study needs."""
    return not _cold(resonances)


def warm_kernels(*, resonances: bool = False) -> None:
    """Have all kernels compiled that a study needs, or wait until another process has done it."""
    if not _cold(resonances):
        return
    folder = cache_folder()
    folder.mkdir(parents=True, exist_ok=True)
    with (folder / "lock").open("w") as lock:
        fcntl.flock(lock, fcntl.LOCK_EX)
        for part in _cold(resonances):
            done = subprocess.run([sys.executable, "-c", COMPILE[part]], check=False, capture_output=True)
            # If it failed, whoever needs a kernel compiles it and meets the cause.
            if done.returncode == 0:
                _mark(part).touch()


def _cold(resonances: bool) -> list[str]:
    """Parts that are still to be compiled."""
    return [part for part in COMPILE if (part == "orbits" or resonances) and not _mark(part).exists()]


def _mark(part: str) -> Path:
    return cache_folder() / f"warm-{part}"
