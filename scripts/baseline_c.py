"""The third baseline: ``baseline.c`` compiled for this machine, called on the same arrays as the other two."""

from __future__ import annotations

import ctypes
import shutil
import subprocess
import tempfile
from collections.abc import Sequence
from functools import lru_cache
from pathlib import Path

import numpy as np
import numpy.typing as npt
from baselines import lay_out_windows, read_windows
from llvmlite.binding import get_host_cpu_features

Floats = npt.NDArray[np.float64]

SOURCE = Path(__file__).with_name("baseline.c")
FLAGS = ("-O3", "-fno-math-errno", "-shared", "-fPIC")
TARGETS = {"native": ("-march=native",), "avx2": ("-mavx2", "-mfma")}
"""All that this machine has, with the widest vectors; and vectors of four, as the package is compiled for many
processors.  Both fuse products with sums wherever the compiler likes."""
DOUBLES = np.ctypeslib.ndpointer(dtype=np.float64, flags="C_CONTIGUOUS")
LONGS = np.ctypeslib.ndpointer(dtype=np.int64, flags="C_CONTIGUOUS")
LONG = ctypes.c_long


def c_compiler() -> str | None:
    """Find a compiler that knows vector types of GCC's kind; None where there is none."""
    return shutil.which("gcc") or shutil.which("clang")


def c_targets() -> list[str]:
    """Targets that can be compiled and run here."""
    if c_compiler() is None:
        return []
    return [target for target in TARGETS if target == "native" or get_host_cpu_features().get("avx2", False)]


@lru_cache(maxsize=len(TARGETS))
def compiled_baseline(target: str) -> ctypes.CDLL:
    """Compile the source for one of the targets and load it.

    Raises
    ------
    RuntimeError
        If there is no compiler or it refuses the source.
    """
    compiler = c_compiler()
    if compiler is None:
        raise RuntimeError("the baseline in C needs gcc or clang: install one of them")
    with tempfile.TemporaryDirectory() as folder:
        library = Path(folder) / "baseline.so"
        made = subprocess.run(
            [compiler, *FLAGS, *TARGETS[target], str(SOURCE), "-o", str(library), "-lm"],
            capture_output=True,
            text=True,
            check=False,
        )
        if made.returncode != 0:
            raise RuntimeError(f"{compiler} does not compile {SOURCE.name}: {made.stderr.strip().splitlines()[0]}")
        loaded = ctypes.CDLL(str(library))
    loaded.measure.argtypes = [DOUBLES, LONG, LONG, DOUBLES, DOUBLES, LONG, LONGS, DOUBLES, LONG, LONG, LONGS] + [
        DOUBLES
    ] * 3
    return loaded


def measure_in_c(
    harmonics: Floats, turns: Floats, p: Floats, horizons: Sequence[int], target: str = "native"
) -> dict[str, Floats]:
    """Measure n orbits in vectors of lanes; arguments and result as of ``measure_scalar``."""
    library = compiled_baseline(target)
    windows = lay_out_windows(horizons)
    size = turns.size
    spare = -size % int(library.lanes())
    turns, p = np.append(turns, np.repeat(turns[-1:], spare)), np.append(p, np.repeat(p[-1:], spare))
    averages = np.empty((len(windows.spans), 3, turns.size))
    growth = np.empty((windows.marks.size, turns.size))
    path = np.empty(turns.size)
    failed = library.measure(
        np.ascontiguousarray(harmonics),
        harmonics.shape[1] - 1,
        turns.size,
        turns,
        p,
        len(windows.spans),
        windows.spans,
        windows.weights,
        windows.weights.shape[1],
        windows.marks.size,
        windows.marks,
        averages,
        growth,
        path,
    )
    if failed:
        raise RuntimeError("the baseline in C had no memory or was given more harmonics than it takes")
    return read_windows(windows, averages[..., :size], growth[:, :size], path[:size])
