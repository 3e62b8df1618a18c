"""A compacted store in the files of its tasks again, less what is damaged: what a sweep can carry on with."""

from __future__ import annotations

import shutil
from collections.abc import Set
from pathlib import Path

import zarr

from scanner.errors import StoreError
from scanner.quantities import ORBITS, RESONANCES
from scanner.store.durable import compare, make_way, settle, write_durably
from scanner.store.ledger import Ledger, Looseness
from scanner.store.metadata import ROOT_METADATA
from scanner.store.regions import Regions
from scanner.store.swap import name_beside, swap
from scanner.store.template import check_numerics
from scanner.study.plan import TaskList


def repair_compacted(store: Path, damaged: Set[str]) -> None:
    """Mend a compacted store that is held by the caller.

    Metadata is written again.  Where results are damaged the store gets the files of its tasks back, less those of
    tasks that are concerned, so that a sweep can compute these again.

    Parameters
    ----------
    store
        A compacted store.
    damaged
        Names of its files that are not as they were written.

    Raises
    ------
    StoreError
        What is left is not enough for a sweep to carry on with; the store is left as it is.
    """
    ledger = Ledger(store)
    before = ledger.looseness()
    parts = ledger.damaged_parts()
    if before is None or parts:
        raise StoreError(f"{store}: cannot be mended without {', '.join(parts)}; take these files from a backup")
    for name in damaged & before.compacted_metadata.keys():
        make_way(store, name)
        write_durably(store / name, before.compacted_metadata[name].encode())
    if damaged & (ledger.shards() or {}).keys():
        check_numerics(store)
        _expand(ledger, before, damaged)


def _expand(ledger: Ledger, before: Looseness, damaged: Set[str]) -> None:
    """Undo the compaction of a store, and leave the tasks out that touch damaged files."""
    store = ledger.store
    beside = name_beside(store)
    try:
        _restore_template(store, beside, before)
        _restore_tasks(ledger, beside, damaged)
        swap(store, beside)
    finally:
        shutil.rmtree(beside, ignore_errors=True)


def _restore_template(store: Path, beside: Path, before: Looseness) -> None:
    """Make the empty store as it was made the first time."""
    shutil.rmtree(beside, ignore_errors=True)
    for name in before.charter.template:
        content = before.metadata[name].encode() if name in before.metadata else (store / name).read_bytes()
        (beside / name).parent.mkdir(parents=True, exist_ok=True)
        (beside / name).write_bytes(content)
    for name, kind in compare(beside, before.charter.template):
        raise StoreError(f"{store / name}: {kind}; the same `scanner sweep` mends it, then repair again")
    (beside / ROOT_METADATA).write_text(before.charter.root)
    settle(beside / name for name in (*before.charter.template, ROOT_METADATA))
    Ledger(beside).found(before.charter)


def _restore_tasks(ledger: Ledger, beside: Path, damaged: Set[str]) -> None:
    """Write what every task wrote, and its receipt, but for tasks of which something is damaged."""
    source, target, copy = Regions(ledger.store), Regions(beside), Ledger(beside)
    tasks = _tasks_of(beside)
    for receipt in ledger.receipts():
        task = tasks[receipt.task]
        if damaged.isdisjoint(source.files_of(task)):
            copy.write(receipt, target.write(task, source.read(task)))


def _tasks_of(store: Path) -> TaskList:
    """Make the tasks that a store was laid out for: their sizes are those of its chunks."""
    root = zarr.open_group(store, mode="r", use_consolidated=False)
    status, orbits = root["table_status"], root[f"{ORBITS}/verdict"]
    assert isinstance(status, zarr.Array)
    assert isinstance(orbits, zarr.Array)
    return TaskList(status.shape, status.chunks, orbits.shape[-1], orbits.chunks[-1], RESONANCES in root)
