"""Files that are either whole or not there at all."""

from __future__ import annotations

import contextlib
import os
from collections.abc import Collection, Iterator
from pathlib import Path

from scanner.errors import ScannerError
from scanner.store import enclosing_store


def check_target(target: Path, suffixes: Collection[str], *, force: bool = False) -> None:
    """Refuse a file that cannot or must not be written, before any work is done for it.

    Raises
    ------
    ScannerError
        Unknown suffix, missing or unwritable folder, a folder in the file's place, a place inside a store, or a file
        that exists already when `force` is not set.
    """
    if target.is_dir():
        raise ScannerError(f"{target} is a folder: name a file in it, ending in {_listing(suffixes)}")
    if target.suffix.lower() not in suffixes:
        raise ScannerError(f"{target}: unknown suffix {target.suffix!r}, it must be {_listing(suffixes)}")
    folder = target.parent
    if not folder.is_dir():
        raise ScannerError(f"{target} cannot be written: there is no folder {folder}, make it first")
    store = enclosing_store(folder)
    if store is not None:
        raise ScannerError(f"{target} cannot be written: it lies inside the store {store}, choose a place outside")
    if not os.access(folder, os.W_OK | os.X_OK):
        raise ScannerError(f"{target} cannot be written: no permission to write in the folder {folder}")
    if target.exists() and not force:
        raise ScannerError(f"{target} exists: choose another name, or replace it with --force")


@contextlib.contextmanager
def replace_whole(target: Path) -> Iterator[Path]:
    """Give a temporary name beside `target`; what was written there takes its place only if the block succeeds.

    Raises
    ------
    ScannerError
        The operating system refuses: a full disk, a read-only folder.
    """
    partial = target.with_name(f".{os.getpid()}.partial{target.suffix.lower()}")
    try:
        yield partial
        os.replace(partial, target)
    except OSError as error:
        reason = error.strerror or " ".join(str(error).split())
        raise ScannerError(f"{target} cannot be written: {reason}") from error
    finally:
        partial.unlink(missing_ok=True)


def _listing(suffixes: Collection[str]) -> str:
    *first, last = suffixes
    return f"{', '.join(first)} or {last}" if first else last
