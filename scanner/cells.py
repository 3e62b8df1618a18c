"""One unit of work: from a plan and a task to arrays in memory.

A table that cannot be used never stops a task: one that is not convex, or whose code fails, is recorded as such.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from scanner.bounce.resonances import resonance_numbers
from scanner.errors import ScannerError
from scanner.indicators import orbit_numbers
from scanner.measure import curve_numbers, follow_rounds, section_points, table_numbers
from scanner.quantities import DONE, FAILED, NOT_CONVEX, ORBITS, RESONANCES, ROOT, in_group
from scanner.study import Plan, Task
from scanner.tables import Table, build_table

Array = npt.NDArray[np.generic]
Index = tuple[int, ...]


@dataclass
class CellResult:
    """What one task computed.

    Attributes
    ----------
    groups
        Group of the store to name to array; shape of the task's box, then the variable's own dimensions.
    failures
        Index in the whole grid of every failed table, with a one-line reason.
    bounces
        Bounces that were really computed.
    """

    groups: dict[str, dict[str, Array]]
    failures: list[tuple[Index, str]] = field(default_factory=list)
    bounces: int = 0

    def count(self, status: int) -> int:
        """Count the tables that got this status; a task that writes no root variable settles none."""
        return int(np.count_nonzero(self.groups[ROOT]["table_status"] == status)) if ROOT in self.groups else 0

    def fill(self, group: str, place: Index, numbers: Mapping[str, float | Array]) -> None:
        """Put numbers of one table at its place in the box."""
        for name, values in numbers.items():
            self.groups[group][name][place] = values

    def fill_shares(self, place: Index, numbers: Mapping[str, Array], replicates: int) -> None:
        """Put orbits of one table at the beginning of the room that each replicate has for its own."""
        for name, values in numbers.items():
            room = self.groups[ORBITS][name][place]
            shares = values.reshape(replicates, -1, *values.shape[1:])
            room.reshape(replicates, -1, *room.shape[1:])[:, : shares.shape[1]] = shares

    def set_status(self, place: Index, status: int) -> None:
        """Settle a table, if the task settles tables at all."""
        if ROOT in self.groups:
            self.groups[ROOT]["table_status"][place] = status

    def record_failure(self, place: Index, index: Index, reason: str) -> None:
        """Note why a table failed and leave no half result of it."""
        for group in self.groups:
            self.fill(group, place, {quantity.name: quantity.fill_value for quantity in in_group(group)})
        self.set_status(place, FAILED)
        self.failures.append((index, reason))


def compute(plan: Plan, task: Task) -> CellResult:
    """Follow orbits on every table of a task of kind "survey" or "orbits"; the former also sums them up."""
    asked = plan.study.orbits

    def survey(result: CellResult, place: Index, table: Table) -> None:
        numbers = follow_rounds(
            table,
            plan.study.seed,
            asked.replicates,
            asked.per_table,
            asked.bounces,
            asked.target_error,
            asked.most_per_table,
            asked.exponent_bounces,
            asked.adaptive,
        )
        result.fill_shares(place, numbers, asked.replicates)
        result.fill(ROOT, place, table_numbers(table, numbers, asked.replicates))
        result.bounces += int(numbers["bounces_used"].sum())

    def follow(result: CellResult, place: Index, table: Table) -> None:
        share = (task.orbits.start, task.orbits.stop)
        s, p = section_points(table, plan.study.seed, asked.replicates, asked.per_table, *share)
        numbers = orbit_numbers(table, s, p, asked.bounces, asked.exponent_bounces, asked.adaptive)
        result.fill(ORBITS, place, numbers)
        result.bounces += int(numbers["bounces_used"].sum())

    return _settle_tables(plan, task, survey if task.kind == "survey" else follow, {})


def reduce(plan: Plan, task: Task, orbits: Mapping[str, Array], failures: Mapping[Index, str]) -> CellResult:
    """Sum up the stored orbits of the tables of a task of kind "reduce".

    Parameters
    ----------
    plan, task
        What to compute.
    orbits
        Every variable of group ``orbits``: shape of the task's box, all orbits, the variable's own dimensions.
    failures
        Tables, by index in the grid, whose orbits could not all be computed, and why.
    """

    def sum_up(result: CellResult, place: Index, table: Table) -> None:
        own = {name: values[place] for name, values in orbits.items()}
        result.fill(ROOT, place, table_numbers(table, own, plan.study.orbits.replicates))

    return _settle_tables(plan, task, sum_up, failures)


def _settle_tables(
    plan: Plan, task: Task, settle: Callable[[CellResult, Index, Table], None], failures: Mapping[Index, str]
) -> CellResult:
    """Build the tables of a task one by one and leave each either settled or recorded as unusable."""
    result = CellResult({group: _empty_arrays(plan, task, group) for group in task.groups})
    for index, parameters in plan.tables(task):
        place = tuple(i - part.start for i, part in zip(index, task.box, strict=True))
        with _recording_failure(result, place, index):
            if index in failures:
                raise ScannerError(failures[index])
            table = build_table(plan.study.family, allow_code=plan.study.allow_code, **parameters)
            if table.is_convex:
                settle(result, place, table)
                if RESONANCES in result.groups:
                    result.fill(RESONANCES, place, resonance_numbers(table, plan.rotations))
                    result.fill(RESONANCES, place, curve_numbers(table))
            result.set_status(place, DONE if table.is_convex else NOT_CONVEX)
    return result


@contextmanager
def _recording_failure(result: CellResult, place: Index, index: Index) -> Iterator[None]:
    """Turn whatever a table raises into a failure of that table alone.

    Running out of memory says nothing about the table: it is passed on, for the task to be tried again elsewhere.
    The user's own function may also call ``sys.exit``, which would end the worker.
    """
    try:
        yield
    except MemoryError:
        raise
    except (Exception, SystemExit) as error:
        reason = " ".join(str(error).split()) or "no reason given"
        result.record_failure(
            place, index, reason if isinstance(error, ScannerError) else f"{type(error).__name__}: {reason}"
        )


def _empty_arrays(plan: Plan, task: Task, group: str) -> dict[str, Array]:
    """Arrays for all the task will write, holding what a table that is not done holds."""
    arrays = {}
    for quantity in in_group(group):
        region = zip(task.region(quantity), plan.array_shape(quantity), strict=True)
        shape = tuple(len(range(*part.indices(size))) for part, size in region)
        arrays[quantity.name] = np.full(shape, quantity.fill_value, quantity.dtype)
    return arrays
