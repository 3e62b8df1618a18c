"""A finished store in few files: shards that hold the chunks of many tasks, made beside it and put in its place."""

from __future__ import annotations

import json
import os
import shutil
from collections.abc import Callable, Collection, Iterator
from dataclasses import dataclass, replace
from itertools import product
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
import zarr

from scanner.errors import StoreError
from scanner.store.durable import Seal, compare, settle
from scanner.store.ledger import Ledger, Looseness
from scanner.store.lock import StoreLock
from scanner.store.metadata import ROOT_METADATA, read_root
from scanner.store.progress import sweep_progress
from scanner.store.regions import chunk_name
from scanner.store.swap import name_beside, put_back, swap
from scanner.store.template import consolidate, create_array
from scanner.study.layout import ceil_divide

CHUNK_BYTES = 2**18
"""Values are compressed in pieces of about so much: what is read of a variable for one value of it."""
SHARD_BYTES = 2**25
"""Size of a file before compression; the few copies of one that are held set the memory that compaction takes."""

Report = Callable[[int, int], None]
Shape = tuple[int, ...]


@dataclass(frozen=True)
class Compaction:
    """Number of files of a store before and after, and whether it was compacted already."""

    before: int
    after: int
    already: bool = False


class _Block(NamedTuple):
    """What becomes one file: an array of the store, its copy and a region of both."""

    source: zarr.Array[Any]
    copy: zarr.Array[Any]
    region: tuple[slice, ...]


def compact_store(path: str | Path, report: Report = lambda done, total: None) -> Compaction:
    """Put a finished store into few large files, without changing a value.

    The new files are made beside the store, compared with it bit by bit, and take its place at once; whatever happens
    on the way, either the old store or the new one is there, whole.

    Parameters
    ----------
    path
        The store.
    report
        Called after every step with the number of steps done and of all.

    Raises
    ------
    StoreError
        It is no store, not finished, damaged, in use, or too large for the room on its disk; it is left as it is.
    """
    store = Path(path).absolute()
    put_back(store)
    Ledger(store).charter()
    beside = name_beside(store)
    with StoreLock(store) as lock:
        ledger = Ledger(store)
        shutil.rmtree(beside, ignore_errors=True)
        files, size = _measure(store)
        if ledger.charter().compacted:
            return Compaction(files, files, already=True)
        _check_readiness(store, size)

        def beat(done: int, total: int) -> None:
            lock.beat()
            report(done, total)

        try:
            _make_copy(ledger, beside, beat)
            swap(store, beside)
        finally:
            shutil.rmtree(beside, ignore_errors=True)
    return Compaction(files, _measure(store)[0])


def _measure(store: Path) -> tuple[int, int]:
    """Count the files of a store but for its lock, and their bytes."""
    sizes = [
        (Path(folder) / name).stat().st_size for folder, _, names in os.walk(store) for name in names if name != "lock"
    ]
    return len(sizes), sum(sizes)


def _check_readiness(store: Path, size: int) -> None:
    """See that a store is finished and that there is room for another one of its size."""
    state = sweep_progress(store)
    if not state.complete:
        raise StoreError(
            f"{store}: {state.tasks_finished} of {state.tasks} tasks are finished, and only a finished store can be "
            "compacted; run the same `scanner sweep` first"
        )
    free = shutil.disk_usage(store.parent).free
    if size > free:
        raise StoreError(
            f"{store}: its compacted copy may need {size / 1e9:.3g} GB beside it until it is whole, must be at most "
            f"the {free / 1e9:.3g} GB free there; make room first"
        )


def _make_copy(ledger: Ledger, beside: Path, report: Report) -> None:
    """Make the compacted copy of a store, whole and on the disk."""
    charter = ledger.charter()
    blocks = list(_lay_out_copy(ledger.store, beside, charter.template))
    total = charter.tasks + len(blocks)
    for task in range(charter.tasks):
        _check_task(ledger, task)
        report(task + 1, total)
    shards: dict[str, Seal] = {}
    for number, block in enumerate(blocks, charter.tasks + 1):
        file = beside / block.copy.path / _file_name(block)
        _write(block, file)
        shards[str(file.relative_to(beside))] = Seal.of(file.read_bytes())
        report(number, total)
    consolidate(beside)
    settle(beside / name for name in (*charter.template, ROOT_METADATA))
    template = {name: Seal.of((beside / name).read_bytes()) for name in charter.template}
    root = json.dumps(read_root(beside), indent=2)
    Ledger(beside).found_compacted(
        replace(charter, template=template, root=root, compacted=True),
        ledger.receipts(),
        shards,
        Looseness(charter, _read_metadata(ledger.store, template), _read_metadata(beside, template)),
    )


def _read_metadata(store: Path, template: Collection[str]) -> dict[str, str]:
    return {name: (store / name).read_text() for name in template if name.endswith(ROOT_METADATA)}


def _check_task(ledger: Ledger, task: int) -> None:
    """See that what a task wrote is as it was written: a chunk that is lost would read as a value."""
    seals = ledger.seals(task)
    if seals is None or any(True for _ in compare(ledger.store, seals)):
        raise StoreError(
            f"{ledger.store}: what task {task} wrote is damaged; clear it with `scanner verify --repair`, "
            "run the same `scanner sweep` and then compact"
        )


def _lay_out_copy(store: Path, beside: Path, template: Collection[str]) -> Iterator[_Block]:
    """Make the empty copy: metadata and coordinates as they are, every other array in shards; name what it lacks."""
    source = zarr.open_group(store, mode="r", use_consolidated=False)
    known = set(template)
    members = (member for _, member in source.members(max_depth=None))
    # What has chunks of the template are coordinates.
    arrays = [array for array in members if isinstance(array, zarr.Array) and f"{array.path}/c.0" not in known]
    remade = {f"{array.path}/{ROOT_METADATA}" for array in arrays}
    for name in (ROOT_METADATA, *template):
        if name not in remade:
            (beside / name).parent.mkdir(parents=True, exist_ok=True)
            shutil.copyfile(store / name, beside / name)
    root = zarr.open_group(beside, mode="r+", use_consolidated=False)
    for array in arrays:
        copy = _create_copy(root, array)
        steps = copy.shards or copy.chunks
        starts = product(*(range(0, size, step) for size, step in zip(array.shape, steps, strict=True)))
        for start in starts:
            ends = map(min, map(sum, zip(start, steps, strict=True)), array.shape)
            yield _Block(array, copy, tuple(map(slice, start, ends)))


def _create_copy(root: zarr.Group, array: zarr.Array[Any]) -> zarr.Array[Any]:
    """Make an array like another one, in few files; one that is a single chunk already stays so."""
    chunks = _grow(array.chunks, array.shape, CHUNK_BYTES // array.dtype.itemsize)
    shards = _grow(chunks, array.shape, SHARD_BYTES // array.dtype.itemsize)
    single = array.nchunks == 1
    return create_array(
        root,
        array.path,
        _dimension_names(array),
        array.shape,
        array.chunks if single else chunks,
        array.dtype,
        array.fill_value,
        dict(array.attrs),
        None if single else shards,
    )


def _grow(part: Shape, shape: Shape, target: int) -> Shape:
    """Take whole multiples of a part, the last dimensions first, until it has about a number of items."""
    grown: list[int] = []
    items = int(np.prod(part))
    for own, size in zip(reversed(part), reversed(shape), strict=True):
        most = ceil_divide(size, own)
        times = max(1, min(most, target // items))
        grown.append(own * times)
        items *= times
        if times < most:
            target = items
    return tuple(reversed(grown))


def _file_name(block: _Block) -> str:
    return chunk_name(block.region, block.copy.shards or block.copy.chunks, block.copy.shape)


def _write(block: _Block, file: Path) -> None:
    """Write one file, wait until it is on the disk, and see that it reads as what it is a copy of, to the bit."""
    values = np.asarray(block.source[block.region])
    block.copy[block.region] = values
    settle([file])
    if np.asarray(block.copy[block.region]).tobytes() != values.tobytes():
        raise StoreError(f"{file}: does not read as what was written; the store is left as it was, check the disk")


def _dimension_names(array: zarr.Array[Any]) -> tuple[str, ...]:
    names = array.metadata.to_dict()["dimension_names"]
    assert isinstance(names, list | tuple)
    return tuple(map(str, names))
