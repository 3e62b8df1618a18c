"""Whether the finished blocks of a store are still what was written, and making room for their recomputation."""

from __future__ import annotations

import os
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

from scanner.errors import StoreError
from scanner.store.durable import compare, make_way, settle
from scanner.store.expansion import repair_compacted
from scanner.store.ledger import Ledger
from scanner.store.lock import StoreLock, is_running
from scanner.store.metadata import damaged_metadata, is_finished, root_is_sound
from scanner.store.template import check_numerics, note_finish


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
        "missing", "empty", "truncated", "altered"; "misplaced" for a folder or anything else that is no file;
        "unreadable" for a receipt or metadata that is none, or those of another study; "leftover" for what a writer
        that was killed has left half-written.
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
    compacted = ledger.charter().compacted
    found = [*_verify_whole(ledger), *_verify_results(ledger)]
    if not compacted and not is_running(store):
        found.extend(_list_leftovers(store))
    return found


def _verify_whole(ledger: Ledger) -> list[Damage]:
    """Find what is damaged of metadata and coordinates."""
    return [Damage(name, None, kind) for name, kind in damaged_metadata(ledger.store)]


def _verify_results(ledger: Ledger) -> list[Damage]:
    """Find what is damaged of the results."""
    charter = ledger.charter()
    if charter.compacted:
        return [*_verify_shards(ledger)]
    found: list[Damage] = []
    for task in ledger.listed():
        seals = ledger.seals(task)
        if seals is None:
            found.append(Damage(_receipt_name(ledger, task), task, "unreadable"))
        else:
            found.extend(Damage(name, task, kind) for name, kind in compare(ledger.store, seals))
    if is_finished(ledger.store):
        lost = set(range(charter.tasks)) - set(ledger.listed())
        found.extend(Damage(_receipt_name(ledger, task), task, "missing") for task in sorted(lost))
    return found


def _verify_shards(ledger: Ledger) -> Iterator[Damage]:
    """Find what is damaged of a compacted store beside its template."""
    for name in ledger.damaged_parts():
        yield Damage(name, None, "unreadable")
    for name, kind in compare(ledger.store, ledger.shards() or {}):
        yield Damage(name, None, kind)


def refuse_losses(path: Path) -> None:
    """See that the files of finished tasks are there, by the names in their folders alone: quick on any disk.

    Raises
    ------
    StoreError
        Some are not.
    """
    ledger = Ledger(path)
    present: dict[str, set[str]] = {}
    lost = []
    for task in ledger.listed():
        for name in ledger.seals(task) or {}:
            folder, _, file = name.rpartition("/")
            if folder not in present:
                present[folder] = _names_in(path / folder)
            if file not in present[folder]:
                lost.append(name)
    if lost:
        raise StoreError(
            f"{path}: {len(lost)} files of finished tasks are missing, the first is {lost[0]}; "
            "clear what they belong to with `scanner verify --repair` and sweep again"
        )


def repair(path: str | Path) -> list[Damage]:
    """Clear every damaged block, so that the next sweep computes exactly these again.

    Returns
    -------
    list
        What was damaged.

    Raises
    ------
    StoreError
        The path is not a store of this tool, a sweep is running on it, or results are damaged that another version of
        the code has made: nothing is cleared then.
    """
    store = Path(path)
    ledger = Ledger(store)
    ledger.charter()
    with StoreLock(store):
        whole, results = _verify_whole(ledger), _verify_results(ledger)
        if results:
            check_numerics(store)  # what another version made could not be computed again
        damaged = [*whole, *results, *_list_leftovers(store)]
        if ledger.charter().compacted:
            repair_compacted(store, {damage.file for damage in damaged})
            return damaged
        _remove(store, (damage.file for damage in damaged if damage.task is None))
        tasks = sorted({damage.task for damage in damaged if damage.task is not None})
        for task in tasks:
            _clear_block(ledger, task)
        if tasks and root_is_sound(store, ledger.charter()):
            note_finish(store, finished=False)
    return damaged


def remove_leftovers(path: Path) -> None:
    """Remove half-written files of workers that were killed; call it only while no worker writes."""
    for partial in _leftovers(path):
        partial.unlink(missing_ok=True)


def _list_leftovers(store: Path) -> list[Damage]:
    return [Damage(str(file.relative_to(store)), None, "leftover") for file in _leftovers(store)]


def _leftovers(path: Path) -> Iterator[Path]:
    return (partial for partial in path.rglob("*.partial") if not partial.is_dir())


def _receipt_name(ledger: Ledger, task: int) -> str:
    return str(ledger.receipt_path(task).relative_to(ledger.store))


def _names_in(folder: Path) -> set[str]:
    try:
        return set(os.listdir(folder))
    except OSError:
        return set()


def _clear_block(ledger: Ledger, task: int) -> None:
    """Take back a receipt first and its chunks after, so that nothing half cleared ever counts as finished."""
    seals = ledger.seals(task) or {}
    _remove(ledger.store, [_receipt_name(ledger, task)])
    _remove(ledger.store, seals)


def _remove(store: Path, names: Iterable[str]) -> None:
    """Remove files for good, and what is in the place of their folders."""
    folders = set()
    for name in names:
        make_way(store, name)
        folders.add((store / name).parent)
    settle(folder for folder in folders if folder.exists())
