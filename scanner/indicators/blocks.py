"""Many orbits of one table on their way from horizon to horizon, a block of them at a time.

Orbits that need not go on are taken out at a horizon and the others close up, so that blocks stay full.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from scanner.bounce.lanes import (
    ADVANCE,
    BUFFER,
    BUFFER_ROWS,
    FAILED,
    KEPT_ROWS,
    LANES,
    OBSERVABLES,
    P_AFTER,
    STATE_ROWS,
    TURN_IM,
    TURN_RE,
    busy_lanes,
    fill_up,
)
from scanner.bounce.orbits import bounce_lanes, set_out, start_block
from scanner.bounce.series import make_room, plan_here
from scanner.compiled import kernel, pasted, stack_array, use_widest_vectors
from scanner.elementary import angle_turns, fixed_point, pair_up
from scanner.indicators.schedule import Schedule
from scanner.indicators.streams import GROWTH, PATH, RUNNING_ROWS, absorb, start_running

Floats = npt.NDArray[np.float64]
Whole = npt.NDArray[np.int64]
Mask = npt.NDArray[np.bool_]

RECORDED = 2048
"""Last bounces of an orbit of which is kept where they led, for the motion inside islands."""


@dataclass(frozen=True)
class Streams:
    """What the streaming indicators of n orbits hold at a horizon.

    Attributes
    ----------
    averages
        Shape (windows, 3, n): weighted averages of advance (perimeters), p and chord (length).
    growth, path
        Shape (marks, n): logarithm of the growth of a tangent vector and length travelled up to each mark.
    failed
        Shape (n,): true where a chord could not be found; the orbit's other numbers mean nothing then.
    """

    averages: Floats
    growth: Floats
    path: Floats
    failed: Mask


@dataclass(frozen=True)
class Recording:
    """Where the bounces of a stage from number ``first`` on led, shape (blocks, bounces, LANES).

    Boundary parameter and p / 2 in fixed point, both in one word, as what is kept of a bounce passes through memory:
    with twice as many bits that took up to three tenths of the time of following it.  ``columns`` has the place of each
    orbit, block after block; it means nothing for those that had been left before.
    """

    first: int
    rows: Whole
    columns: Whole


@kernel
def start_blocks(harmonics: Floats, turns: Floats, momenta: Floats, state: Floats) -> None:
    """Set up all blocks; ``state`` has a column an orbit."""
    here = np.empty((KEPT_ROWS, LANES))
    for first in range(0, turns.size, LANES):
        start_block(harmonics, turns[first : first + LANES], momenta[first : first + LANES], here)
        put_columns(here, state, first)


@kernel
def take_columns(source: Floats, first: int, target: Floats) -> None:
    """Copy a block of columns out of a table of all orbits."""
    for row in range(source.shape[0]):
        for j in range(LANES):
            target[row, j] = source[row, first + j]


@kernel
def put_columns(source: Floats, target: Floats, first: int) -> None:
    """Copy a block of columns back into a table of all orbits."""
    for row in range(target.shape[0]):
        for j in range(LANES):
            target[row, first + j] = source[row, j]


@pasted
def take_down(buffer: Floats, count: int, place: int, turns: Floats, record: Whole) -> None:
    """Bring the boundary parameters up to date, and record ``count`` bounces from ``place`` on, none before 0."""
    for row in range(count):
        for j in range(LANES):
            moved = turns[j] + buffer[ADVANCE, row, j]
            turns[j] = moved - np.rint(moved)
        if place + row >= 0:
            for j in range(LANES):
                half_p = 0.5 * buffer[P_AFTER, row, j]
                record[place + row, j] = pair_up(fixed_point(turns[j]), fixed_point(half_p))


@kernel
def follow_blocks(
    harmonics: Floats,
    windows: Whole,
    weights: Floats,
    marks: Whole,
    start: int,
    record_from: int,
    size: int,
    state: Floats,
    running: Floats,
    averages: Floats,
    growth: Floats,
    path: Floats,
    record: Whole,
) -> None:
    """Follow every block from bounce ``start`` to the last of ``marks``.

    The arrays from ``state`` on have a column an orbit and are updated; ``growth`` and ``path`` get a row a mark,
    ``record`` is filled as told in ``Recording`` with the bounces from number ``record_from`` on.
    """
    use_widest_vectors()
    plan = plan_here(harmonics)
    here = stack_array((STATE_ROWS, LANES), np.float64)
    buffer = stack_array((BUFFER_ROWS, BUFFER, LANES), np.float64)
    tangent = stack_array((RUNNING_ROWS, LANES), np.float64)
    sums = stack_array((averages.shape[0], LANES), np.float64)
    turns = stack_array((LANES,), np.float64)
    terms, gaps = make_room(plan)
    for number in range(record.shape[0]):
        block = number * LANES
        take_columns(state, block, here)
        set_out(plan, here, terms, gaps)
        take_columns(running, block, tangent)
        take_columns(averages, block, sums)
        lanes = busy_lanes(size - block)
        for j in range(LANES):
            turns[j] = angle_turns(here[TURN_IM, j], here[TURN_RE, j])
        first = start
        for mark in range(marks.shape[0]):
            while first < marks[mark]:
                count = min(BUFFER, marks[mark] - first)
                bounce_lanes(plan, here, terms, gaps, buffer, count, lanes)
                absorb(buffer, count, first, windows, weights, sums, tangent, lanes)
                take_down(buffer, count, first - record_from, turns, record[number])
                first += count
            for j in range(LANES):
                growth[mark, block + j] = tangent[GROWTH, j]
                path[mark, block + j] = tangent[PATH, j]
        put_columns(here, state, block)
        put_columns(tangent, running, block)
        put_columns(sums, averages, block)


class Batch:
    """Orbits of one table that are followed together.

    Parameters
    ----------
    harmonics
        Boundary, shape (4, K + 1).
    turns, momenta
        Start of each orbit, shape (n,): boundary parameter and p.
    schedule
        Where the horizons lie.

    Attributes
    ----------
    harmonics
        The boundary.
    orbits
        Numbers of the orbits that are still on their way, in order.
    """

    def __init__(self, harmonics: Floats, turns: Floats, momenta: Floats, schedule: Schedule) -> None:
        self.orbits = np.arange(turns.size)
        self.harmonics = harmonics
        self._schedule = schedule
        turns, momenta = fill_up(turns), fill_up(momenta)
        self._state = np.empty((KEPT_ROWS, turns.size))
        start_blocks(harmonics, turns, momenta, self._state)
        self._running = np.empty((RUNNING_ROWS, turns.size))
        start_running(self._running)
        self._averages = np.zeros((OBSERVABLES * schedule.windows.shape[0], turns.size))
        self._growth = np.zeros((schedule.marks.size, turns.size))
        self._path = np.zeros((schedule.marks.size, turns.size))
        self._recordings: list[Recording] = []

    def advance(self, number: int) -> Streams:
        """Follow all orbits from the horizon before to horizon ``number``."""
        schedule = self._schedule
        start = schedule.horizons[number - 1] if number else 0
        end = schedule.horizons[number]
        stage = np.flatnonzero((schedule.marks > start) & (schedule.marks <= end))
        among = slice(stage[0], stage[-1] + 1)
        record_from = max(start, end - RECORDED)
        record = np.empty((self._state.shape[1] // LANES, end - record_from, LANES), dtype=np.int64)
        follow_blocks(
            self.harmonics,
            schedule.windows,
            schedule.weights,
            schedule.marks[among],
            start,
            record_from,
            self.orbits.size,
            self._state,
            self._running,
            self._averages,
            self._growth[among],
            self._path[among],
            record,
        )
        columns = np.zeros(self.orbits[-1] + 1, dtype=np.int64)
        columns[self.orbits] = np.arange(self.orbits.size)
        earlier = [part for part in self._recordings if part.first + part.rows.shape[1] > end - RECORDED]
        self._recordings = [*earlier, Recording(record_from, record, columns)]
        size = self.orbits.size
        return Streams(
            averages=self._averages.reshape(-1, OBSERVABLES, self._averages.shape[1])[..., :size],
            growth=self._growth[:, :size],
            path=self._path[:, :size],
            failed=self._state[FAILED, :size] > 0.0,
        )

    def recall(self, chosen: Whole) -> list[Recording]:
        """What is kept of the last bounces of some of the orbits on their way.

        Parameters
        ----------
        chosen
            Shape (m,): places in ``orbits``.

        Returns
        -------
        recordings
            One stage after the other up to the present horizon, with columns for the chosen orbits.
        """
        orbits = self.orbits[chosen]
        return [Recording(part.first, part.rows, part.columns[orbits]) for part in self._recordings]

    def keep(self, going: Mask) -> None:
        """Leave out the orbits that need not go on; the others close up."""
        self.orbits = self.orbits[going]
        if not self.orbits.size:
            return
        columns = fill_up(np.flatnonzero(going))

        def of_these(values: Floats) -> Floats:
            # take, as plain indexing would leave the columns one after the other in memory
            return np.take(values, columns, axis=1)

        self._state = of_these(self._state)
        self._running = of_these(self._running)
        self._averages = of_these(self._averages)
        self._growth = of_these(self._growth)
        self._path = of_these(self._path)
