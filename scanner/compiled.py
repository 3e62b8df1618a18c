"""The one door to numba: every kernel is compiled with the same flags and cached by the hash of all kernel sources.

Kernels hold no lock (``nogil``) and use plain IEEE arithmetic: no fast-math, and products are fused with sums where
``vectors.fused`` says so and nowhere else.  So their results have the same bits on every processor.
"""

from __future__ import annotations

import hashlib
import os
import tempfile
from collections.abc import Callable
from functools import lru_cache
from pathlib import Path
from typing import Any, TypeVar, cast

import llvmlite
import numba
import numpy as np
import numpy.typing as npt
from numba import carray  # type: ignore[attr-defined]
from numba.core import types
from numba.extending import intrinsic

Function = TypeVar("Function", bound=Callable[..., object])
Number = TypeVar("Number", np.float64, np.int64)

CACHE_LINE = 64
WIDEST_VECTORS = 512  # bits

KERNEL_ROOMS = ("compiled.py", "vectors.py", "elementary.py", "tables", "bounce", "indicators")


def _sources_fingerprint() -> str:
    """Hash the sources that hold kernels, and the compiler's versions.

    numba looks only at the file of the cached function itself, so a change in a kernel that another one calls
    would go unnoticed; a folder named by this hash cannot be stale.  It also goes by the place and the time of that
    file, and so does the hash: what is in the folder can then be loaded.
    """
    package = Path(__file__).parent
    digest = hashlib.sha256(f"{numba.__version__} {llvmlite.__version__}".encode())
    for room in KERNEL_ROOMS:
        path = package / room
        for source in sorted(path.rglob("*.py")) if path.is_dir() else [path]:
            digest.update(f"{source} {source.stat().st_mtime_ns}".encode())
            digest.update(source.read_bytes())
    return digest.hexdigest()[:16]


def _own_folder() -> Path:
    """Node-local folder of this user's.

    What is cached there gets executed: a folder of that name that somebody else has made is left alone, and one for
    this process alone takes its place.
    """
    folder = Path(tempfile.gettempdir()) / f"scanner-kernels-{os.getuid()}"
    folder.mkdir(mode=0o700, exist_ok=True)
    return folder if folder.stat().st_uid == os.getuid() else Path(tempfile.mkdtemp(prefix="scanner-kernels-"))


@lru_cache(maxsize=1)
def cache_folder() -> Path:
    """Folder of compiled kernels: below ``SCANNER_CACHE`` or a node-local temporary folder, named by a hash."""
    base = os.environ.get("SCANNER_CACHE")
    return (Path(base) if base else _own_folder()) / _sources_fingerprint()


numba.config.CACHE_DIR = str(cache_folder())  # type: ignore[attr-defined]


def kernel(function: Function) -> Function:
    """Compile a function of numbers and flat arrays to machine code on first use, kept on disk."""
    compiled: Function = numba.njit(function, nogil=True, cache=True, error_model="numpy", fastmath=False)
    return compiled


@intrinsic
def _stack_room(typing: Any, count: Any, kind: Any) -> tuple[Any, Callable[..., Any]]:
    def build(context: Any, builder: Any, signature: Any, values: Any) -> Any:
        room = builder.alloca(context.get_value_type(kind.dtype), size=values[0])
        room.align = CACHE_LINE
        return room

    return types.CPointer(kind.dtype)(types.int64, kind), build  # type: ignore[no-untyped-call]


_room: Callable[[int, Any], Any] = cast(Any, _stack_room)


@intrinsic
def _widest_vectors(typing: Any) -> tuple[Any, Callable[..., Any]]:
    def build(context: Any, builder: Any, signature: Any, values: Any) -> Any:
        # llvmlite's own list has no attributes with a value, and its ``add`` takes no others.
        set.add(builder.function.attributes, f'"prefer-vector-width"="{WIDEST_VECTORS}"')
        return context.get_dummy_value()

    return types.void(), build


use_widest_vectors: Callable[[], None] = cast(Any, _widest_vectors)
"""Compile the kernel that calls this for vectors of eight numbers, on processors that have them.

Some of these lower their clock for them, so that the compiler stops at four by itself; loops with as much arithmetic
as the bounce gain all the same, and their results have the same bits.
"""


def inlined(function: Function) -> Function:
    """Compile a function of numbers that is copied into the kernels that call it, so that their loops vectorise."""
    compiled: Function = numba.njit(function, nogil=True, forceinline=True, error_model="numpy", fastmath=False)
    return compiled


def pasted(function: Function) -> Function:
    """Compile a function with loops over arrays as if its text stood in the kernels that call it.

    What is compiled on its own is vectorised on its own, for arrays that may overlap, and looks at the start of every
    loop whether they do.
    """
    compiled: Function = numba.njit(function, nogil=True, inline="always", error_model="numpy", fastmath=False)
    return compiled


@pasted
def stack_array(shape: tuple[int, ...], kind: type[Number]) -> npt.NDArray[Number]:
    """Array on the stack of the kernel, not filled; gone when the kernel is left.

    The compiler knows that such arrays do not overlap, and nobody counts who refers to them.
    """
    size = 1
    for length in shape:
        size *= length
    array: npt.NDArray[Number] = carray(_room(size, kind), shape)
    return array
