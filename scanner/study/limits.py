"""What a study may take of memory and disk."""

from __future__ import annotations

import shutil
from math import ceil, prod
from pathlib import Path

import numpy as np

from scanner.errors import StudyError
from scanner.quantities import ORBITS, Quantity, in_group
from scanner.study.layout import LONGEST_ROUNDS, NOMINAL_BOUNCE, ceil_divide
from scanner.study.model import Orbits
from scanner.study.plan import Plan

WORKER_BYTES = 500_000_000
"""Memory a worker may take, whatever the size of the study."""
STANDING_BYTES = 400_000_000
"""What a worker takes before its first task: the interpreter, the libraries, the compiled kernels."""
WORKING_COPIES = 2
"""Arrays of a task are held this many times over while they are computed or encoded."""
MOST_TASK_BYTES = (WORKER_BYTES - STANDING_BYTES) // WORKING_COPIES
DISK_BLOCK = 4096
"""Bytes by which a file grows on usual disks."""
RECEIPT_BYTES = 8192
"""What is kept of a finished task beside its arrays."""


def task_bytes(plan: Plan) -> int:
    """Size of the arrays that the largest task holds: whole tables, as even split orbits are summed up together."""
    tables, sizes = prod(plan.box), plan.sizes
    return tables * sum(_item_bytes(entry) * prod(sizes[dim] for dim in entry.dims) for entry in plan.quantities)


def store_bytes(plan: Plan) -> int:
    """Size of the store on disk: chunks in whole blocks, as if compression gained nothing, and the receipts."""
    blocks = 0
    for entry in plan.quantities:
        chunk = plan.chunk_shape(entry)
        chunks = prod(map(ceil_divide, plan.array_shape(entry), chunk))
        blocks += chunks * ceil_divide(prod(chunk) * _item_bytes(entry), DISK_BLOCK)
    return blocks * DISK_BLOCK + len(plan.tasks) * RECEIPT_BYTES


def _item_bytes(quantity: Quantity) -> int:
    """Size of one value of a quantity."""
    return np.dtype(quantity.dtype).itemsize


def check_limits(plan: Plan, target: Path | None = None, remaining: float = 1.0) -> None:
    """Refuse a study that does not fit the memory of a worker or the disk of its store.

    Parameters
    ----------
    plan
        The plan of the study.
    target
        Where the store will be; it need not exist.  None leaves the disk out.
    remaining
        Share of the study that is still to be written.

    Raises
    ------
    StudyError
        One line.
    """
    orbits = plan.study.orbits
    key = "per_table" if orbits.most_per_table is None else "most_per_table"
    held = task_bytes(plan)
    if held > MOST_TASK_BYTES:
        growth = sum(_item_bytes(entry) * prod(plan.sizes[dim] for dim in entry.dims[1:]) for entry in in_group(ORBITS))
        fitting = orbits.room - ceil_divide(held - MOST_TASK_BYTES, growth)
        raise StudyError(
            f"orbits.{key} = {orbits.room} makes one task hold {megabytes(held)}, must be at most "
            f"{megabytes(MOST_TASK_BYTES)} so that a worker stays below {megabytes(WORKER_BYTES)}; "
            f"lower {key} to {fitting // orbits.replicates * orbits.replicates} or less"
        )
    if orbits.most_per_table is not None:
        _check_longest(prod(plan.box), orbits.most_per_table, orbits)
    if target is not None:
        needed, free = ceil(store_bytes(plan) * remaining), free_bytes(target)
        if needed > free:
            raise StudyError(
                f"orbits.{key} = {orbits.room} on {plan.table_count} tables needs {megabytes(needed)} for the store, "
                f"must be at most the {megabytes(free)} free at {target}; "
                f"lower {key} or a count, or choose another disk"
            )


def _check_longest(tables: int, most: int, orbits: Orbits) -> None:
    """Refuse rounds that could keep a worker at one task for too long."""
    orbit_cost = tables * orbits.bounces * NOMINAL_BOUNCE
    if most * orbit_cost > LONGEST_ROUNDS:
        fitting = LONGEST_ROUNDS // orbit_cost // orbits.replicates * orbits.replicates
        remedy = f"lower it to {fitting} or less" if fitting >= orbits.per_table else "remove it and target_error"
        raise StudyError(
            f"orbits.most_per_table = {most} of {orbits.bounces} bounces could keep a worker at one task for "
            f"{most * orbit_cost / 3.6e12:.3g} hours, must be at most {LONGEST_ROUNDS / 3.6e12:g}, as tables with a "
            f"target_error are not split; {remedy}, or lower bounces"
        )


def free_bytes(target: Path) -> int:
    """Free space on the disk of a path, which need not exist yet.

    Raises
    ------
    StudyError
        There is no disk, as below /proc.
    """
    place = target.absolute()
    while not place.exists():
        place = place.parent
    usage = shutil.disk_usage(place)
    if not usage.total:
        raise StudyError(f"{target}: {place} is no place for files; choose a folder on a disk")
    return usage.free


def megabytes(size: int) -> str:
    """Write a size in bytes for people."""
    return f"{size / 1e6:.4g} MB" if size < 1e9 else f"{size / 1e9:.4g} GB"
