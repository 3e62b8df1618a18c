"""From a study to its tasks and to the shape of what they write."""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property
from math import prod
from typing import Literal, overload

from scanner.indicators.schedule import horizons
from scanner.quantities import CURVES, DIRECTIONS, ORBITS, P_BINS, PERIODS, REGISTER, RESONANCES, ROOT, Quantity
from scanner.study.layout import NOMINAL_SHARE, ceil_divide, lay_out
from scanner.study.model import Study, Value

Kind = Literal["survey", "orbits", "reduce"]
Index = tuple[int, ...]
Region = tuple[slice, ...]

GROUPS: dict[Kind, tuple[str, ...]] = {"survey": (ROOT, ORBITS), "orbits": (ORBITS,), "reduce": (ROOT,)}
"""Groups of the store that a task of each kind writes."""


@dataclass(frozen=True)
class Task:
    """One unit of work: whole chunks of every array it writes.

    Attributes
    ----------
    number
        Its place in ``plan.tasks``.
    box
        Slice of the grid along each swept dimension.
    orbits
        Slice of the orbits of every table in the box.
    kind
        "survey" computes orbits and root values of its tables; "orbits" some orbits of one table; "reduce" reads all
        orbits of one table back and computes its root values.
    needs
        Numbers of the tasks that must be finished before this one; empty but for "reduce".
    resonances
        Whether the study asks for resonances.
    """

    number: int
    box: Region
    orbits: slice
    kind: Kind
    needs: range = range(0)
    resonances: bool = False

    @property
    def groups(self) -> tuple[str, ...]:
        """Groups of the store that it writes."""
        return (*GROUPS[self.kind], RESONANCES) if self.resonances and self.kind != "orbits" else GROUPS[self.kind]

    @property
    def tables(self) -> int:
        """Number of tables in the box."""
        return prod(part.stop - part.start for part in self.box)

    def region(self, quantity: Quantity) -> Region:
        """Where it writes in the array of a quantity: a slice for each dimension, the whole of all but its own."""
        inner = (self.orbits if dim == "orbit" else slice(None) for dim in quantity.dims)
        return (*self.box, *inner)


class TaskList(Sequence[Task]):
    """All tasks of a plan, each made when it is asked for."""

    def __init__(
        self, shape: tuple[int, ...], box: tuple[int, ...], per_table: int, orbit_chunk: int, resonances: bool
    ) -> None:
        self._shape = shape
        self._box = box
        self._per_table = per_table
        self._orbit_chunk = orbit_chunk
        self._resonances = resonances
        self._boxes = tuple(map(ceil_divide, shape, box))
        self._chunks = ceil_divide(per_table, orbit_chunk)
        self._tasks_per_box = 1 if self._chunks == 1 else self._chunks + 1

    def __len__(self) -> int:
        """Count the tasks."""
        return prod(self._boxes) * self._tasks_per_box

    @overload
    def __getitem__(self, number: int) -> Task: ...
    @overload
    def __getitem__(self, number: slice) -> list[Task]: ...
    def __getitem__(self, number: int | slice) -> Task | list[Task]:
        """Make the task of a number, or those of a slice of numbers."""
        if isinstance(number, slice):
            return [self[place] for place in range(*number.indices(len(self)))]
        if not -len(self) <= number < len(self):
            raise IndexError(f"task {number} of {len(self)}")
        return self._make(number % len(self))

    def _make(self, number: int) -> Task:
        place, part = divmod(number, self._tasks_per_box)
        box = self._box_at(place)
        if self._chunks == 1:
            return Task(number, box, slice(0, self._per_table), "survey", resonances=self._resonances)
        if part < self._chunks:
            start = part * self._orbit_chunk
            return Task(number, box, slice(start, min(start + self._orbit_chunk, self._per_table)), "orbits")
        needs = range(number - self._chunks, number)
        return Task(number, box, slice(0, self._per_table), "reduce", needs, self._resonances)

    def _box_at(self, place: int) -> Region:
        """Find the box at a place, the last dimension running fastest."""
        slices: list[slice] = []
        for size, part, count in zip(reversed(self._shape), reversed(self._box), reversed(self._boxes), strict=True):
            place, along = divmod(place, count)
            slices.append(slice(along * part, min((along + 1) * part, size)))
        return tuple(reversed(slices))


@dataclass(frozen=True)
class Plan:
    """The tables of a study and the tasks they are cut into; small, and the same on every machine.

    Attributes
    ----------
    study
        What is asked.
    dims, shape
        Names and sizes of the swept dimensions, in the order written; empty for a study of one table.
    box, orbit_chunk
        Chunk of every array along the swept dimensions and along ``orbit``.
    tasks
        All tasks, each made when it is asked for.
    """

    study: Study
    box: tuple[int, ...]
    orbit_chunk: int

    @property
    def dims(self) -> tuple[str, ...]:
        """Names of the swept dimensions."""
        return tuple(self.study.swept)

    @property
    def shape(self) -> tuple[int, ...]:
        """Number of values along each swept dimension."""
        return tuple(len(values) for values in self.study.swept.values())

    @property
    def table_count(self) -> int:
        """Number of tables."""
        return prod(self.shape)

    @property
    def horizons(self) -> tuple[int, ...]:
        """Numbers of bounces after which a verdict is given."""
        return horizons(self.study.orbits.bounces)

    @property
    def rotations(self) -> list[tuple[int, int]]:
        """Rotations (p, q) whose orbits are wanted; none unless the study asks for them."""
        return self.study.rotations

    @property
    def quantities(self) -> tuple[Quantity, ...]:
        """Everything that is stored."""
        groups = (ROOT, ORBITS, RESONANCES) if self.rotations else (ROOT, ORBITS)
        return tuple(quantity for quantity in REGISTER.values() if quantity.group in groups)

    @property
    def sizes(self) -> dict[str, int]:
        """Size of every dimension in the store."""
        orbits = self.study.orbits
        inner = {
            "orbit": orbits.room,
            "replicate": orbits.replicates,
            "p_bin": P_BINS,
            "direction": len(DIRECTIONS),
            "horizon": len(self.horizons),
            "period": len(PERIODS),
            "resonance": len(self.rotations),
            "curve": len(CURVES),
        }
        return {**dict(zip(self.dims, self.shape, strict=True)), **inner}

    @cached_property
    def tasks(self) -> Sequence[Task]:
        """All tasks, each made when it is asked for."""
        return TaskList(self.shape, self.box, self.study.orbits.room, self.orbit_chunk, bool(self.rotations))

    def array_dims(self, quantity: Quantity) -> tuple[str, ...]:
        """Dimensions of the array of a quantity."""
        return (*self.dims, *quantity.dims)

    def array_shape(self, quantity: Quantity) -> tuple[int, ...]:
        """Shape of the array of a quantity."""
        return tuple(self.sizes[dim] for dim in self.array_dims(quantity))

    def chunk_shape(self, quantity: Quantity) -> tuple[int, ...]:
        """Shape of a chunk of that array: what one task writes."""
        inner = (self.orbit_chunk if dim == "orbit" else self.sizes[dim] for dim in quantity.dims)
        return (*self.box, *inner)

    def parameters_at(self, index: Index) -> dict[str, Value]:
        """Parameters of the table at a place of the grid, for ``build_table``."""
        swept = {name: values[i] for (name, values), i in zip(self.study.swept.items(), index, strict=True)}
        return {**self.study.fixed, **swept}

    def tables(self, task: Task | None = None) -> Iterator[tuple[Index, dict[str, Value]]]:
        """Go through the tables of a task, or of the whole study: place in the grid and parameters."""
        ranges = [range(part.start, part.stop) for part in task.box] if task else [range(size) for size in self.shape]
        for index in itertools.product(*ranges):
            yield index, self.parameters_at(index)


def make_plan(study: Study) -> Plan:
    """Cut a study into tasks."""
    shape = tuple(len(values) for values in study.swept.values())
    orbits = study.orbits
    bounces = orbits.bounces
    if orbits.adaptive:
        bounces = max(bounces // NOMINAL_SHARE, orbits.exponent_bounces or 1)
    layout = lay_out(shape, orbits.per_table, bounces, len(study.rotations), orbits.most_per_table)
    return Plan(study, layout.box, layout.orbit_chunk)
