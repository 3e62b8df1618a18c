"""The cut into tasks: every cell once, sizes within bounds, a function of the study alone."""

from math import prod

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from scanner.bounce.lanes import LANES
from scanner.quantities import ORBITS, REGISTER, ROOT, in_group
from scanner.study import make_plan
from scanner.study.layout import (
    LONGEST_TASK,
    NOMINAL_BOUNCE,
    NOMINAL_TABLE,
    ORBITS_AT_ONCE,
    ORBITS_HELD,
    SHORTEST_TASK,
    lay_out,
)
from scanner.study.model import Orbits, Resources, Study
from scanner.study.plan import TaskList

shapes = st.lists(st.integers(1, 12), max_size=4).map(tuple)
big_shapes = st.lists(st.integers(1, 2000), max_size=3).map(tuple).filter(lambda shape: prod(shape) <= 10**6)


def study_of(shape: tuple[int, ...], per_table: int, bounces: int, workers: int = 1) -> Study:
    swept = {f"axis{i}": tuple(float(value) for value in range(size)) for i, size in enumerate(shape)}
    orbits = Orbits(per_table=per_table, bounces=bounces, replicates=2)
    return Study("grid", 1, "any", {"other": 1}, swept, orbits, Resources(workers=workers), "", ".", False, {})


@settings(deadline=None, max_examples=60)
@given(shapes, st.integers(1, 60), st.sampled_from([64, 8192, 10**6, 10**7]))
def test_every_cell_of_every_array_belongs_to_one_task(shape, pairs, bounces):
    plan = make_plan(study_of(shape, pairs * 2, bounces))
    for quantity in (REGISTER[ROOT, "perimeter"], REGISTER[ORBITS, "verdict"], REGISTER[ORBITS, "verdict_by_horizon"]):
        visits = np.zeros(plan.array_shape(quantity), dtype=int)
        for task in plan.tasks:
            if quantity.group in task.groups:
                visits[task.region(quantity)] += 1
        assert (visits == 1).all()


@settings(deadline=None, max_examples=60)
@given(shapes, st.integers(1, 2000), st.sampled_from([64, 8192, 10**6]))
def test_a_task_writes_whole_chunks(shape, pairs, bounces):
    plan = make_plan(study_of(shape, pairs * 2, bounces))
    tasks = plan.tasks
    for number in {0, len(tasks) // 2, len(tasks) - 1}:
        task = tasks[number]
        for quantity in in_group(task.groups[0]):
            full = plan.array_shape(quantity)
            for part, chunk, size in zip(task.region(quantity), plan.chunk_shape(quantity), full, strict=True):
                start, stop, _ = part.indices(size)
                assert start % chunk == 0
                assert stop == min(start + chunk, size)


@settings(deadline=None, max_examples=200)
@given(big_shapes, st.integers(1, 2**20), st.integers(64, 10**7))
def test_tasks_are_neither_long_nor_many_more_than_needed(shape, pairs, bounces):
    per_table = 2 * pairs
    layout = lay_out(shape, per_table, bounces)
    tables = prod(layout.box)
    one_orbit = bounces * NOMINAL_BOUNCE
    nominal = tables * (layout.orbit_chunk * one_orbit + NOMINAL_TABLE)
    total = prod(shape) * (per_table * one_orbit + NOMINAL_TABLE)
    stretched = max(LONGEST_TASK, min(3 * LONGEST_TASK, total // 100_000))
    # Half as much again at most, as a table counts as one task up to that, and what fills up a block of lanes.
    assert nominal <= 1.5 * stretched + (LANES - 1) * one_orbit + NOMINAL_TABLE
    assert layout.orbit_chunk <= ORBITS_AT_ONCE
    assert tables * layout.orbit_chunk <= ORBITS_HELD
    assert layout.orbit_chunk == per_table or (layout.orbit_chunk % LANES == 0 and tables == 1)
    assert all(1 <= part <= size for part, size in zip(layout.box, shape, strict=True))


@pytest.mark.parametrize(
    ("shape", "per_table", "bounces", "box", "chunk"),
    [
        ((), 64, 64, (), 64),
        # 0.69 s a table: one by one where the whole study is short.
        ((25,), 1024, 8192, (1,), 1024),
        # An overnight study: 20 s are 28 tables; the last dimension is taken whole, the one before in part.
        ((200, 50, 7), 1024, 8192, (1, 4, 7), 1024),
        # One long table is split over its orbits: 84 s in about 64 tasks.
        ((), 1024, 1024 * 1024, (), 64),
        # 2.7 s a table: 5 parts of about half a second, but no more than 2^16 orbits at once.
        ((3,), 2**19, 64, (1,), 2**16),
        # 1.5 s a table: 3 parts, in whole blocks of lanes.
        ((3,), 30_000, 640, (1,), 10_048),
    ],
)
def test_known_layouts(shape, per_table, bounces, box, chunk):
    layout = lay_out(shape, per_table, bounces)
    assert (layout.box, layout.orbit_chunk) == (box, chunk)


@settings(deadline=None, max_examples=100)
@given(big_shapes, st.integers(1, 2**12), st.integers(0, 10), st.integers(64, 10**6))
def test_tables_that_come_in_rounds_are_never_split(shape, pairs, doublings, bounces):
    first, most = 2 * pairs, 2 * pairs * 2**doublings
    layout = lay_out(shape, first, bounces, most_per_table=most)
    assert layout.orbit_chunk == most
    tables = prod(layout.box)
    assert tables == 1 or tables * most <= ORBITS_HELD
    # The middle round of the doublings is what a task is made for; all first rounds together take less.
    assert tables == 1 or tables * first * bounces * NOMINAL_BOUNCE <= 3 * LONGEST_TASK
    # With room for one round only, boxes are those of a study without a target, where that does not split tables.
    fixed = lay_out(shape, first, bounces)
    if fixed.orbit_chunk == first:
        assert lay_out(shape, first, bounces, most_per_table=first) == fixed


def test_small_studies_still_make_many_tasks_of_half_a_second():
    plan = make_plan(study_of((32, 40), 256, 2048))
    nominal = 256 * 2048 * NOMINAL_BOUNCE + NOMINAL_TABLE
    assert len(plan.tasks) >= 64
    assert prod(plan.box) * nominal >= 0.5 * SHORTEST_TASK


def test_layout_does_not_depend_on_workers():
    few, many = (make_plan(study_of((40, 30), 1024, 8192, workers)) for workers in (1, 500))
    assert (few.box, few.orbit_chunk, len(few.tasks)) == (many.box, many.orbit_chunk, len(many.tasks))


def test_split_tables_are_reduced_after_their_orbits():
    tasks = TaskList((2,), (1,), per_table=200, orbit_chunk=64, resonances=False)
    kinds = [task.kind for task in tasks]
    assert kinds == ["orbits"] * 4 + ["reduce"] + ["orbits"] * 4 + ["reduce"]
    assert list(tasks[9].needs) == [5, 6, 7, 8]
    assert all(tasks[number].box == tasks[9].box for number in tasks[9].needs)
    assert [tasks[number].orbits for number in tasks[9].needs] == [
        slice(0, 64),
        slice(64, 128),
        slice(128, 192),
        slice(192, 200),
    ]
    assert tasks[9].orbits == slice(0, 200)


def test_task_list_is_a_sequence():
    tasks = TaskList((5, 7), (2, 7), per_table=64, orbit_chunk=64, resonances=False)
    assert len(tasks) == 3
    assert tasks[-1] == tasks[2]
    assert tasks[1:] == [tasks[1], tasks[2]]
    assert [task.number for task in tasks] == [0, 1, 2]
    assert [task.tables for task in tasks] == [14, 14, 7]
    with pytest.raises(IndexError, match="task 3 of 3"):
        tasks[3]


def test_tables_of_a_task_are_those_of_its_box():
    plan = make_plan(study_of((5, 40), 256, 8192))
    found = [index for task in plan.tasks for index, _ in plan.tables(task)]
    assert sorted(found) == list(np.ndindex(5, 40))
    index, parameters = next(plan.tables(plan.tasks[-1]))
    assert parameters == {"other": 1, "axis0": float(index[0]), "axis1": float(index[1])}
    assert list(plan.tables())[41] == ((1, 1), {"other": 1, "axis0": 1.0, "axis1": 1.0})


def test_a_million_tables_are_planned_lazily():
    plan = make_plan(study_of((1000, 1000), 1024, 8192))
    assert len(plan.tasks) >= 10_000
    assert plan.tasks[len(plan.tasks) - 1].box[0].stop == 1000
    assert next(plan.tables())[0] == (0, 0)
