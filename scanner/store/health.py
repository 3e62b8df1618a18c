"""Whether the finished blocks of a store are still what was written, and making room for their recomputation."""

from __future__ import annotations

import json
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from scanner.store.durable import compare, settle
from scanner.store.ledger import Ledger
from scanner.store.lock import StoreLock
from scanner.store.template import ROOT_METADATA, note_finish


@dataclass(frozen=True)
class Damage:
    """One file that is not as it was written.

    Attributes
    ----------
    file
        Its name in the store.
    task
        The task whose block it belongs to; None for metadata and coordinates, which belong to the whole store.
    kind
        "missing", "empty", "truncated", "altered" or "unreadable".
    """

    file: str
    task: int | None
    kind: str

    def __str__(self) -> str:
        """One line for a list of damage."""
        owner = "the whole store" if self.task is None else f"task {self.task}"
        return f"{self.file}: {self.kind} ({owner})"


def verify(path: str | Path) -> list[Damage]:
    """Compare every finished block, and the store's own metadata, with the checksums recorded when they were written.

    Raises
    ------
    StoreError
        The path is not a store of this tool.
    """
    store = Path(path)
    ledger = Ledger(store)
    charter = ledger.charter()
    found = [Damage(name, None, kind) for name, kind in compare(store, charter.template)]
    if not _is_readable(store / ROOT_METADATA):
        found.append(Damage(ROOT_METADATA, None, "unreadable"))
    for task in ledger.listed():
        seals = ledger.seals(task)
        if seals is None:
            found.append(Damage(str(ledger.receipt_path(task).relative_to(store)), task, "unreadable"))
        else:
            found.extend(Damage(name, task, kind) for name, kind in compare(store, seals))
    return found


def repair(path: str | Path) -> list[Damage]:
    """Clear every damaged block, so that the next sweep computes exactly these again.

    Returns
    -------
    list
        What was damaged.

    Raises
    ------
    StoreError
        The path is not a store of this tool, or a sweep is running on it.
    """
    store = Path(path)
    ledger = Ledger(store)
    ledger.charter()
    with StoreLock(store):
        damaged = verify(store)
        _remove(store / damage.file for damage in damaged if damage.task is None)
        for task in sorted({damage.task for damage in damaged if damage.task is not None}):
            _clear_block(ledger, task)
        if damaged and (store / ROOT_METADATA).exists():
            note_finish(store, finished=False)
    return damaged


def remove_leftovers(path: Path) -> None:
    """Remove half-written files of workers that were killed; call it only while no worker writes."""
    for partial in path.rglob("*.partial"):
        partial.unlink(missing_ok=True)


def _is_readable(metadata: Path) -> bool:
    try:
        return isinstance(json.loads(metadata.read_bytes()), dict)
    except (OSError, ValueError):
        return False


def _clear_block(ledger: Ledger, task: int) -> None:
    """Take back a receipt first and its chunks after, so that nothing half cleared ever counts as finished."""
    seals = ledger.seals(task) or {}
    _remove([ledger.receipt_path(task)])
    _remove(ledger.store / name for name in seals)


def _remove(files: Iterable[Path]) -> None:
    """Remove files for good."""
    folders = set()
    for file in files:
        file.unlink(missing_ok=True)
        folders.add(file.parent)
    settle(folder for folder in folders if folder.exists())
