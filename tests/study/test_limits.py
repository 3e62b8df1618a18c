"""Bounds on memory and disk, before anything is written."""

import shutil
from collections import namedtuple

import numpy as np
import pytest

from scanner.errors import StudyError
from scanner.study import make_plan, parse_study
from scanner.study.limits import MOST_TASK_BYTES, check_limits, store_bytes, task_bytes

TEXT = """\
[study]
title = "Limits"
seed = 1
[table]
family = "radial_harmonic"
amplitude = { start = 0.0, stop = 0.1, count = COUNT }
harmonic = 2
[orbits]
per_table = PER_TABLE
bounces = BOUNCES
replicates = 16
"""


def plan_of(count: int, per_table: int, bounces: int):
    text = TEXT.replace("COUNT", str(count)).replace("PER_TABLE", str(per_table)).replace("BOUNCES", str(bounces))
    return make_plan(parse_study(text))


def held_by(plan, task) -> int:
    """Count the bytes of the arrays of a task by making them; a reduction holds all orbits of its table."""
    total = 0
    for quantity in plan.quantities:
        shape = tuple(part.stop - part.start for part in task.box)
        shape += tuple(plan.sizes[dim] for dim in quantity.dims)
        total += np.empty(shape, quantity.dtype).nbytes
    return total


@pytest.mark.parametrize(("count", "per_table", "bounces"), [(7, 64, 64), (300, 1024, 8192), (2, 65536, 65536)])
def test_task_bytes_are_those_of_the_largest_task(count, per_table, bounces):
    plan = plan_of(count, per_table, bounces)
    assert task_bytes(plan) == max(held_by(plan, task) for task in plan.tasks)


def test_store_bytes_cover_the_arrays_and_not_much_more():
    # Many orbits a table, so that the blocks of the disk weigh little.
    plan = plan_of(10, 65536, 65536)
    arrays = sum(np.prod(plan.array_shape(entry)) * np.dtype(entry.dtype).itemsize for entry in plan.quantities)
    assert arrays < store_bytes(plan) < 1.5 * arrays


def test_too_many_orbits_for_memory():
    plan = plan_of(2, 2**22, 64)
    message = r"^orbits\.per_table = 4194304 makes one task hold .* must be at most 50 MB .* lower per_table to (\d+)"
    with pytest.raises(StudyError, match=message) as caught:
        check_limits(plan)
    fitting = int(str(caught.value).split("lower per_table to ")[1].split()[0])
    smaller = plan_of(2, fitting, 64)
    check_limits(smaller)
    assert task_bytes(smaller) > 0.99 * MOST_TASK_BYTES


def rounds_of(per_table: int, most: int, bounces: int):
    text = TEXT.replace("COUNT", "2").replace("PER_TABLE", str(per_table)).replace("BOUNCES", str(bounces))
    return make_plan(parse_study(text + f"target_error = 0.001\nmost_per_table = {most}\n"))


def test_too_much_room_for_memory():
    with pytest.raises(
        StudyError, match=r"^orbits\.most_per_table = 4194304 .* lower most_per_table to (\d+)"
    ) as caught:
        check_limits(rounds_of(64, 2**22, 64))
    fitting = int(str(caught.value).split("lower most_per_table to ")[1].split()[0])
    check_limits(rounds_of(64, fitting, 64))


def test_rounds_that_could_take_too_long():
    """80 ns a bounce: 45 000 orbits of a million bounces take an hour."""
    check_limits(rounds_of(64, 44992, 10**6))
    message = (
        r"^orbits\.most_per_table = 90000 of 1000000 bounces could keep a worker at one task for 2 hours, must be at "
        r"most 1, .* lower it to 44992 or less, or lower bounces$"
    )
    with pytest.raises(StudyError, match=message):
        check_limits(rounds_of(64, 90000, 10**6))
    with pytest.raises(StudyError, match=r"remove it and target_error, or lower bounces$"):
        check_limits(rounds_of(64000, 90000, 10**6))


def test_too_little_space_on_the_disk(monkeypatch, tmp_path):
    plan = plan_of(100, 1024, 8192)
    needed = store_bytes(plan)
    usage = namedtuple("usage", "total free")
    monkeypatch.setattr(shutil, "disk_usage", lambda place: usage(2 * needed, needed))
    check_limits(plan, tmp_path / "not" / "there" / "yet.zarr")
    monkeypatch.setattr(shutil, "disk_usage", lambda place: usage(2 * needed, needed - 1))
    with pytest.raises(StudyError, match=r"^orbits\.per_table = 1024 on 100 tables needs .* free at .* choose another"):
        check_limits(plan, tmp_path / "yet.zarr")
    check_limits(plan, tmp_path / "yet.zarr", remaining=0.5)
    check_limits(plan)
