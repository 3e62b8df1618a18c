"""How a grid of tables is cut into tasks.

The cut depends on the study alone, never on the machine or the number of workers, so that stores of one study are the
same to the byte.  It takes a nominal cost of a bounce for that; the true one may be two times more or less.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import isqrt, prod

from scanner.bounce.lanes import LANES
from scanner.measure import ORBITS_AT_ONCE

NOMINAL_BOUNCE = 80
"""Nanoseconds."""
NOMINAL_SHARE = 4
"""Orbits that are left as soon as it is clear what they are take about this part of the bounces they might."""
NOMINAL_TABLE = 20_000_000
"""Nanoseconds to build a table and to sum up its orbits."""
NOMINAL_RESONANCE = 3_000_000
"""Nanoseconds to find both orbits of one rotation, with a share of what it takes to judge the curves between."""
LONGEST_TASK = 20_000_000_000
"""Nanoseconds, while that makes no more than MOST_TASKS."""
SHORTEST_TASK = 500_000_000
"""Nanoseconds that a task of a small study should last at least."""
STRETCHED_TASK = 60_000_000_000
"""Nanoseconds a task of a very large study may last."""
FEW_TASKS = 64
"""Tasks wanted of a small study, so that several workers finish together."""
MOST_TASKS = 100_000
LONGEST_ROUNDS = 3_600_000_000_000
"""Nanoseconds a task may last in which every table takes all the rounds it can get."""
ORBITS_HELD = 2**18
"""Orbits of all tables of one task: an orbit takes some 70 bytes once it is computed."""


@dataclass(frozen=True)
class Layout:
    """Size of one task.

    Attributes
    ----------
    box
        Tables along each swept dimension; also the chunk of every array there.
    orbit_chunk
        Orbits of a table in one task; all of them unless a single table is too much for one task.
    """

    box: tuple[int, ...]
    orbit_chunk: int


def lay_out(
    shape: tuple[int, ...], per_table: int, bounces: int, resonances: int = 0, most_per_table: int | None = None
) -> Layout:
    """Choose the size of the tasks of a grid of tables.

    Parameters
    ----------
    shape
        Tables along each swept dimension.
    per_table, bounces
        Orbits of a table and bounces of an orbit.
    resonances
        Rotations of a table whose periodic orbits are wanted.
    most_per_table
        Orbits of a table at most, if they come in rounds.  Such a table is not split, as it is known only after each
        round whether there will be another.
    """
    # Of rounds that double, none is likelier to be the last than another: the middle one is taken.
    orbits_cost = isqrt(per_table * (most_per_table or per_table)) * bounces * NOMINAL_BOUNCE
    table_cost = orbits_cost + NOMINAL_TABLE + resonances * NOMINAL_RESONANCE
    target = _choose_target(prod(shape) * table_cost)
    if most_per_table is not None:
        return Layout(_fill_box(shape, _fit(target, table_cost, most_per_table)), most_per_table)
    parts = max((2 * orbits_cost + target) // (2 * target), ceil_divide(per_table, ORBITS_AT_ONCE))
    chunk = LANES * ceil_divide(ceil_divide(per_table, parts), LANES) if parts > 1 else per_table
    if chunk < per_table:
        return Layout((1,) * len(shape), chunk)
    return Layout(_fill_box(shape, _fit(target, table_cost, per_table)), per_table)


def _fit(target: int, table_cost: int, orbits: int) -> int:
    """Count the whole tables that a task has time and room for."""
    return max(1, min(target // table_cost, ORBITS_HELD // orbits))


def _choose_target(total: int) -> int:
    """Choose how long a task should last, in nominal nanoseconds, from the cost of the whole study."""
    longest = max(LONGEST_TASK, min(STRETCHED_TASK, total // MOST_TASKS))
    return min(max(total // FEW_TASKS, SHORTEST_TASK), longest)


def _fill_box(shape: tuple[int, ...], budget: int) -> tuple[int, ...]:
    """Take whole trailing dimensions while they fit, an even part of the next one, and 1 of the others."""
    box: list[int] = []
    for size in reversed(shape):
        taken = ceil_divide(size, ceil_divide(size, min(size, budget)))
        box.append(taken)
        budget = budget // size if taken == size else 1
    return tuple(reversed(box))


def ceil_divide(whole: int, part: int) -> int:
    """Count the parts of one size that make up the whole, the last one perhaps smaller."""
    return -(-whole // part)
