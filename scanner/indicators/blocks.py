"""The indicators of many orbits of one table, a block of them at a time."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from scanner.bounce.lanes import BUFFER, BUFFER_ROWS, FAILED, LANES, OBSERVABLES, STATE_ROWS, fill_up
from scanner.bounce.orbits import bounce_lanes, start_block
from scanner.compiled import kernel
from scanner.indicators.schedule import Schedule
from scanner.indicators.streams import GROWTH, PATH, RUNNING_ROWS, absorb, start_running

Floats = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]


@dataclass(frozen=True)
class Streams:
    """What the streaming indicators hold at the end, for n orbits.

    Attributes
    ----------
    averages
        Shape (windows, 3, n): weighted averages of advance (perimeters), p and chord (length).
    growth
        Shape (marks, n): logarithm of the growth of a tangent vector up to each mark.
    path
        Shape (n,): length travelled.
    failed
        Shape (n,): true where a chord could not be found; the orbit's other numbers mean nothing then.
    """

    averages: Floats
    growth: Floats
    path: Floats
    failed: npt.NDArray[np.bool_]


@kernel
def measure_block(
    harmonics: Floats,
    turns: Floats,
    momenta: Floats,
    windows: Integers,
    weights: Floats,
    marks: Integers,
    averages: Floats,
    growth: Floats,
    path: Floats,
    failed: Floats,
) -> None:
    """Follow one block of LANES orbits to the last mark and leave its streams in the last four arrays."""
    state = np.empty((STATE_ROWS, LANES))
    powers = np.empty((2 * harmonics.shape[1], LANES))
    quotient = np.empty((2 * harmonics.shape[1] + 2, LANES))
    buffer = np.zeros((BUFFER_ROWS, BUFFER, LANES))
    running = np.empty((RUNNING_ROWS, LANES))
    start_block(harmonics, turns, momenta, state, powers)
    start_running(running)
    averages[:] = 0.0
    first = 0
    for mark in range(marks.shape[0]):
        while first < marks[mark]:
            count = min(BUFFER, marks[mark] - first)
            bounce_lanes(harmonics, state, powers, quotient, buffer, count)
            absorb(buffer, count, first, windows, weights, averages, running)
            first += count
        for j in range(LANES):
            growth[mark, j] = running[GROWTH, j]
    for j in range(LANES):
        path[j] = running[PATH, j]
        failed[j] = state[FAILED, j]


def stream_orbits(harmonics: Floats, turns: Floats, momenta: Floats, schedule: Schedule) -> Streams:
    """Follow orbits from boundary parameters ``turns`` and momenta ``momenta``, both of shape (n,), n > 0."""
    size = turns.size
    turns, momenta = fill_up(turns), fill_up(momenta)
    blocks = turns.size // LANES
    averages = np.empty((blocks, schedule.windows.shape[0], OBSERVABLES, LANES))
    growth = np.empty((blocks, schedule.marks.size, LANES))
    path = np.empty((blocks, LANES))
    failed = np.empty((blocks, LANES))
    for number in range(blocks):
        lanes = slice(number * LANES, (number + 1) * LANES)
        measure_block(
            harmonics,
            turns[lanes],
            momenta[lanes],
            schedule.windows,
            schedule.weights,
            schedule.marks,
            averages[number],
            growth[number],
            path[number],
            failed[number],
        )

    return Streams(
        averages=np.moveaxis(averages, 0, 2).reshape(*averages.shape[1:3], -1)[..., :size],
        growth=np.moveaxis(growth, 0, 1).reshape(growth.shape[1], -1)[:, :size],
        path=path.reshape(-1)[:size],
        failed=failed.reshape(-1)[:size] > 0.0,
    )
