"""Two folders change places, so that whoever looks finds one of them whole.

Some network disks cannot swap two names at one stroke.  There the store is first moved aside, and for a moment nothing
is in its place; whoever comes after a crash at that moment puts it back.
"""

from __future__ import annotations

import ctypes
import errno
import os
from pathlib import Path

from scanner.errors import StoreError
from scanner.store.durable import settle

_HERE = -100
"""AT_FDCWD: paths are relative to the working folder."""
_EXCHANGE = 2
"""RENAME_EXCHANGE."""
_CANNOT = (errno.ENOSYS, errno.EINVAL, errno.ENOTSUP)


def name_beside(store: Path) -> Path:
    """Name the folder in which another version of a store is made, and where the one it replaces ends."""
    return store.with_name(f".{store.name}.compacted")


def name_aside(store: Path) -> Path:
    """Name the place where a store waits while another one takes its own."""
    return store.with_name(f".{store.name}.aside")


def swap(store: Path, beside: Path) -> None:
    """Let a store and the folder beside it change places, for good."""
    if not _exchange(store, beside):
        aside = name_aside(store)
        store.rename(aside)
        beside.rename(store)
        aside.rename(beside)
    settle([store])


def put_back(store: Path) -> None:
    """Put a store back in its place that was left aside by a crash in the middle of a swap."""
    aside = name_aside(store)
    if not aside.exists():
        return
    if store.exists():
        aside.rename(name_beside(store))
    else:
        aside.rename(store)
        settle([store])


def refuse_left_aside(store: Path) -> None:
    """Refuse a store that was left aside so.

    Raises
    ------
    StoreError
        It was.
    """
    if not store.exists() and name_aside(store).exists():
        raise StoreError(f"{store}: left aside by `scanner compact`; run that again, which puts it back")


def _exchange(one: Path, other: Path) -> bool:
    """Exchange two names at one stroke; False where the system or the disk cannot."""
    rename = getattr(ctypes.CDLL(None, use_errno=True), "renameat2", None)
    if rename is None:
        return False
    if rename(_HERE, os.fsencode(one), _HERE, os.fsencode(other), _EXCHANGE) == 0:
        return True
    code = ctypes.get_errno()
    if code in _CANNOT:
        return False
    raise OSError(code, os.strerror(code), str(one))
