"""Finished stores in few files: nothing may change but the files, whatever happens on the way."""

import math
import shutil
import signal
import subprocess
import sys
import warnings

import numpy as np
import pytest
import xarray as xr
import zarr
from sweeps import everything, fill, grid, order_for, results
from test_health import HARMS

import scanner
from scanner.engine.work import run_task
from scanner.errors import StoreError
from scanner.quantities import ROOT, in_group
from scanner.store import (
    Ledger,
    Receipt,
    Regions,
    StoreLock,
    compact_store,
    note_finish,
    prepare_store,
    repair,
    sweep_progress,
    verify,
)
from scanner.store import compaction as compaction_module
from scanner.store import swap as swap_module
from scanner.store.swap import name_aside
from scanner.study import make_plan

KILLED_COMPACTION = """
import os, signal, sys
from scanner.store import compact_store

store, event, part, left = *sys.argv[1:4], int(sys.argv[4])
def watch(name, arguments):
    global left
    if name == event and part in str(arguments):
        left -= 1
        if left == 0:
            os.kill(os.getpid(), signal.SIGKILL)

sys.addaudithook(watch)
compact_store(store)
"""
"""Kills itself at the n-th event of the interpreter of a kind."""
BEFORE_THE_SWAP = [
    ("shutil.copyfile", "amplitude", 2),
    ("os.rename", "orbits/s0/c", 1),
    ("os.rename", "charter.json", 1),
    ("ctypes.dlsym", "renameat2", 1),
]
AFTER_THE_SWAP = [("os.remove", "c.1.0.0", 3)]


def values_of(store):
    """Every variable of a store, group by group, as bytes, with its dimensions and attributes."""
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        with xr.open_datatree(store, engine="zarr") as tree:
            return {
                (node.path, str(name)): (variable.dims, variable.dtype, variable.values.tobytes(), variable.attrs)
                for node in tree.subtree
                for name, variable in node.variables.items()
            }


@pytest.fixture(scope="module")
def loose(tmp_path_factory):
    path = tmp_path_factory.mktemp("compact") / "grid.zarr"
    fill(path, grid())
    note_finish(path, finished=True)
    return path


@pytest.fixture
def store(loose, tmp_path):
    copy = tmp_path / "grid.zarr"
    shutil.copytree(loose, copy)
    return copy


@pytest.fixture
def compacted(store):
    compact_store(store)
    return store


def leftovers(store):
    return sorted(file.name for file in store.parent.iterdir() if file != store)


def invent(random, dtype, region, shape):
    """Random bits for the values of a region."""
    lengths = [len(range(*part.indices(size))) for part, size in zip(region, shape, strict=True)]
    return np.frombuffer(random.bytes(math.prod(lengths) * np.dtype(dtype).itemsize), dtype).reshape(lengths)


def write_by_hand(path, study):
    """Finish a study with invented bits: every value there can be, also NaN with signs as processors make them."""
    plan = make_plan(study)
    prepare_store(path, plan)
    regions, ledger = Regions(path), Ledger(path)
    random = np.random.default_rng(3)
    for task in plan.tasks:
        groups = {
            group: {
                entry.name: invent(random, entry.dtype, task.region(entry), plan.array_shape(entry))
                for entry in in_group(group)
            }
            for group in task.groups
        }
        groups[ROOT]["lyapunov_per_bounce"] = np.full_like(groups[ROOT]["lyapunov_per_bounce"], -np.nan)
        receipt = Receipt(task.number, task.kind, "here", 1.0, 1.0, 1, 1, task.tables, 0, 0, ())
        ledger.write(receipt, regions.write(task, groups))
    return plan


def test_nothing_changes_but_the_files(loose, compacted):
    assert values_of(compacted) == values_of(loose)
    assert sweep_progress(compacted) == sweep_progress(loose)
    assert len(everything(compacted)) < len(everything(loose)) / 2
    assert verify(compacted) == []
    assert leftovers(compacted) == []


def test_every_bit_comes_through_many_shards(tmp_path, monkeypatch):
    monkeypatch.setattr(compaction_module, "CHUNK_BYTES", 2**10)
    monkeypatch.setattr(compaction_module, "SHARD_BYTES", 2**13)
    path = tmp_path / "invented.zarr"
    plan = write_by_hand(path, grid(amplitude="{ start = 0.0, stop = 0.1, count = 60 }", per_table="16"))
    before = values_of(path)
    steps = []
    made = compact_store(path, lambda done, total: steps.append((done, total)))
    assert values_of(path) == before
    assert verify(path) == []
    area = zarr.open_array(path / "area", mode="r")
    assert (area.chunks, area.shards) == ((64, 2), (64, 2))
    orbits = zarr.open_array(path / "orbits" / "s0", mode="r")
    assert (orbits.chunks, orbits.shards) == ((8, 2, 16), (32, 2, 16))
    assert made.after < made.before / 2
    assert steps == [(number, len(steps)) for number in range(1, len(steps) + 1)]
    assert len(plan.tasks) == 8


def test_a_second_call_changes_nothing(compacted):
    before = everything(compacted)
    made = compact_store(compacted)
    assert made.already
    assert made.after == len(before)
    assert everything(compacted) == before


def refused(store, pattern):
    before = everything(store)
    with pytest.raises(StoreError, match=pattern) as caught:
        compact_store(store)
    assert "\n" not in str(caught.value)
    assert everything(store) == before
    assert leftovers(store) == []


def test_an_unfinished_store_is_refused(store):
    Ledger(store).receipt_path(1).unlink()
    refused(store, "4 of 5 tasks are finished")


def test_a_store_that_is_being_written_is_refused(store):
    with StoreLock(store):
        refused(store, "in use by process")


@pytest.mark.parametrize("kind", HARMS)
def test_a_damaged_store_is_refused(store, kind):
    """A lost chunk would otherwise become values, with a checksum of their own."""
    HARMS[kind](store / "orbits/s0/c.1.0.0")
    refused(store, r"what task \d wrote is damaged")


def test_what_is_no_store_is_refused(tmp_path):
    with pytest.raises(StoreError, match="no such store"):
        compact_store(tmp_path / "nothing.zarr")
    with pytest.raises(StoreError, match="not a store"):
        compact_store(tmp_path)
    assert leftovers(tmp_path / "nothing.zarr") == []


def test_an_interrupt_leaves_the_store_as_it_was(store):
    before = everything(store)

    def interrupt(done, total):
        if done == total - 2:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        compact_store(store, interrupt)
    assert everything(store) == before
    assert leftovers(store) == []


@pytest.mark.parametrize(("event", "part", "count"), BEFORE_THE_SWAP + AFTER_THE_SWAP)
def test_killed_at_any_moment_the_old_or_the_new_store_is_there_whole(store, loose, event, part, count):
    script = [sys.executable, "-c", KILLED_COMPACTION, str(store), event, part, str(count)]
    assert subprocess.run(script, check=False).returncode == -signal.SIGKILL
    assert Ledger(store).charter().compacted == ((event, part, count) in AFTER_THE_SWAP)
    assert values_of(store) == values_of(loose)
    assert verify(store) == []
    assert sweep_progress(store).complete
    assert leftovers(store) == [".grid.zarr.compacted"]
    compact_store(store)
    assert values_of(store) == values_of(loose)
    assert leftovers(store) == []


def test_a_store_left_aside_where_names_cannot_be_exchanged_is_put_back(store, loose):
    """Some network disks cannot exchange names: the crash between the two renames is made by hand."""
    (store.parent / ".grid.zarr.compacted").mkdir()
    store.rename(name_aside(store))
    with pytest.raises(StoreError, match=r"left aside by `scanner compact`; run that again"):
        scanner.open_sweep(store)
    with pytest.raises(StoreError, match=r"left aside by `scanner compact`; run that again"):
        fill(store, grid(), tasks=[])
    compact_store(store)
    assert values_of(store) == values_of(loose)
    assert leftovers(store) == []


def test_swapping_without_an_exchange_of_names(store, loose, monkeypatch):
    monkeypatch.setattr(swap_module, "_exchange", lambda one, other: False)
    compact_store(store)
    assert Ledger(store).charter().compacted
    assert values_of(store) == values_of(loose)
    assert leftovers(store) == []


def test_a_sweep_on_it_has_nothing_to_do(compacted):
    before = everything(compacted)
    report = scanner.run_study(grid(), compacted, progress=False)
    assert (report.done, report.not_convex, report.bounces) == (6, 4, 0)
    assert everything(compacted) == before


@pytest.mark.parametrize("kind", HARMS)
def test_damage_is_found_after_compaction(compacted, kind):
    parts = [f"table_status/ledger/{part}.json" for part in ("receipts", "shards", "before")]
    for name in ("orbits/s0/c.0.0.0", "area/c.0.0", "area/zarr.json", "amplitude/c.0", "zarr.json", *parts):
        content = (compacted / name).read_bytes()
        HARMS[kind](compacted / name)
        assert [damage.file for damage in verify(compacted)] == [name]
        (compacted / name).write_bytes(content)
    assert verify(compacted) == []


def test_damaged_metadata_is_mended(compacted, loose):
    for name in ("area/zarr.json", "orbits/zarr.json", "amplitude/c.0", "zarr.json"):
        HARMS["altered"](compacted / name)
        repair(compacted)
        fill(compacted, grid(), tasks=[])
        assert verify(compacted) == []
    assert Ledger(compacted).charter().compacted
    assert values_of(compacted) == values_of(loose)


def test_damaged_results_are_computed_again(store, loose, monkeypatch):
    """The store gets its former files back, byte for byte, less those of the tasks in the damaged shard."""
    monkeypatch.setattr(compaction_module, "CHUNK_BYTES", 1)
    monkeypatch.setattr(compaction_module, "SHARD_BYTES", 2 * 2 * 256 * 8)
    former = everything(store)
    compact_store(store)
    HARMS["altered"](store / "orbits/p0/c.1.0.0")
    repair(store)
    lost = sorted(set(range(5)) - {receipt.task for receipt in Ledger(store).receipts()})
    assert 0 < len(lost) < 5
    assert verify(store) == []
    for task in lost:
        run_task(order_for(store, grid()), task)
    assert results(store) == results(loose)
    kept = [str(Ledger(store).receipt_path(task).relative_to(store)) for task in range(5) if task not in lost]
    assert all(everything(store)[name][0] == former[name][0] for name in kept)
    assert leftovers(store) == []
