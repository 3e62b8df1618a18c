"""Writing that survives a power cut: content first, then its name, then the folder that holds the name."""

from __future__ import annotations

import hashlib
import os
import shutil
from collections import deque
from collections.abc import Iterable, Iterator, Mapping
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import NamedTuple

from scanner.errors import StoreError

SETTLED_AT_ONCE = 8


class Seal(NamedTuple):
    """Size and checksum of a file as it was written."""

    size: int
    digest: str

    @classmethod
    def of(cls, content: bytes) -> Seal:
        """Seal some content."""
        return cls(len(content), hashlib.blake2b(content, digest_size=8).hexdigest())


def settle(paths: Iterable[Path]) -> None:
    """Wait until these files or folders, and the folders that name them, are on the disk."""
    listed = list(paths)
    # Side by side, as the disk then settles many at once; one after the other takes ten times longer.
    with ThreadPoolExecutor(SETTLED_AT_ONCE) as threads:
        deque(threads.map(_settle_one, listed), maxlen=0)
        deque(threads.map(_settle_one, {path.parent for path in listed}), maxlen=0)


def _settle_one(path: Path) -> None:
    handle = os.open(path, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)


def write_durably(path: Path, content: bytes) -> None:
    """Write a small file so that it is found whole or not at all, whatever happens."""
    partial = path.with_name(f".{path.name}.{os.getpid()}.partial")
    partial.write_bytes(content)
    settle([partial])
    partial.replace(path)
    settle([path])


def compare(folder: Path, seals: Mapping[str, Seal]) -> Iterator[tuple[str, str]]:
    """Go through the files below a folder that differ from their seals: name and kind of damage."""
    for name, seal in seals.items():
        file = folder / name
        if not file.is_file():  # nor is a folder read in its place, or a device that never ends
            yield name, "misplaced" if os.path.lexists(file) else "missing"
            continue
        present = Seal.of(file.read_bytes())
        if present != seal:
            yield name, "empty" if not present.size else "truncated" if present.size < seal.size else "altered"


def make_way(folder: Path, name: str) -> None:
    """Remove whatever is in the place of a file below a folder, or of one of the folders that lead to it.

    Raises
    ------
    StoreError
        A link on the way leads out of the folder: what is there is not touched.
    """
    place = folder
    for part in Path(name).parts:
        if not place.resolve().is_relative_to(folder.resolve()):
            raise StoreError(f"{place}: leads out of the store; put the folder itself in the place of the link")
        place /= part
        if not place.is_dir():
            break
    if place.is_dir() and not place.is_symlink():
        shutil.rmtree(place)
    else:
        place.unlink(missing_ok=True)
