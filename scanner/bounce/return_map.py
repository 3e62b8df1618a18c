"""The q-fold map of the section, its derivative, and its fixed points by Newton's method."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from scanner.bounce.lanes import (
    ADVANCE,
    BUFFER,
    BUFFER_ROWS,
    D_PP,
    D_PS,
    D_SP,
    D_SS,
    LANES,
    P_AFTER,
    STATE_ROWS,
    fill_up,
)
from scanner.bounce.orbits import bounce_block, start_block
from scanner.compiled import kernel
from scanner.tables.boundary import evaluate

Floats = npt.NDArray[np.float64]
Whole = npt.NDArray[np.int64]

MOST_NEWTON_STEPS = 20
SETTLED = 1e-13
"""A fixed point is found when a Newton step moves it by less than this, in turns and in p."""
ROUNDING = 1e-15
"""A point that returns to itself as closely as this times the entries of its tangent map cannot be improved."""
LONGEST_STEP = 0.1
"""Newton steps are cut to this length, in turns and in p: a longer one leaves the island it started in."""


@dataclass(frozen=True)
class ReturnMap:
    """The q-fold map at n points.

    Attributes
    ----------
    shift
        Shape (n,): advance of the boundary parameter in q bounces, in turns, less the whole turns expected.
    p
        Shape (n,): momentum after them.
    matrix
        Shape (2, 2, n): tangent map in (s, p), s in units of length.
    speed
        Shape (n,): length of boundary per turn of its parameter at the points.
    """

    shift: Floats
    p: Floats
    matrix: Floats
    speed: Floats

    @property
    def trace(self) -> Floats:
        """Trace of the tangent map: between -2 and 2 where it is elliptic."""
        found: Floats = self.matrix[0, 0] + self.matrix[1, 1]
        return found


@kernel
def return_block(
    harmonics: Floats, turns: Floats, momenta: Floats, periods: Whole, shift: Floats, p: Floats, matrix: Floats
) -> None:
    """Follow each orbit of a block for its own number of bounces; fills the last three arrays."""
    state = np.empty((STATE_ROWS, LANES))
    buffer = np.empty((BUFFER_ROWS, BUFFER, LANES))
    start_block(harmonics, turns, momenta, state)
    for j in range(LANES):
        shift[j] = 0.0
        p[j] = momenta[j]
        matrix[0, 0, j] = matrix[1, 1, j] = 1.0
        matrix[0, 1, j] = matrix[1, 0, j] = 0.0
    for first in range(0, periods.max(), BUFFER):
        bounce_block(harmonics, state, buffer, BUFFER)
        for j in range(LANES):
            for row in range(min(BUFFER, periods[j] - first)):
                shift[j] += buffer[ADVANCE, row, j]
                p[j] = buffer[P_AFTER, row, j]
                for column in range(2):
                    s_part = matrix[0, column, j]
                    p_part = matrix[1, column, j]
                    matrix[0, column, j] = buffer[D_SS, row, j] * s_part + buffer[D_SP, row, j] * p_part
                    matrix[1, column, j] = buffer[D_PS, row, j] * s_part + buffer[D_PP, row, j] * p_part


def return_map(harmonics: Floats, turns: Floats, p: Floats, periods: Whole, rotations: Whole) -> ReturnMap:
    """The q-fold map at each point, with its own q; not finite where a chord was lost.

    Parameters
    ----------
    harmonics
        Boundary, shape (4, K + 1).
    turns, p
        Points, shape (n,): boundary parameter and momentum.
    periods, rotations
        Shape (n,): q, and the turns p that q bounces are expected to make.
    """
    size = turns.size
    full_turns, full_p, full_periods = fill_up(turns), fill_up(p), fill_up(periods)
    shift, after = np.empty(full_turns.size), np.empty(full_turns.size)
    matrix = np.empty((2, 2, full_turns.size))
    for first in range(0, size, LANES):
        lanes = slice(first, first + LANES)
        block = np.empty((2, 2, LANES))
        return_block(
            harmonics, full_turns[lanes], full_p[lanes], full_periods[lanes], shift[lanes], after[lanes], block
        )
        matrix[:, :, lanes] = block
    return ReturnMap(shift[:size] - rotations, after[:size], matrix[:, :, :size], boundary_speed(harmonics, turns))


def boundary_speed(harmonics: Floats, turns: Floats) -> Floats:
    """Length of boundary per turn of its parameter, at parameters of shape (n,)."""
    values = evaluate(harmonics, turns)
    speed: Floats = 2.0 * math.pi * np.sqrt(values[2] * values[2] + values[3] * values[3])
    return speed


def find_fixed_points(
    harmonics: Floats, turns: Floats, p: Floats, periods: Whole, rotations: Whole
) -> tuple[Floats, Floats, ReturnMap]:
    """Fixed points of the q-fold map near given points, by Newton's method with steps of bounded length.

    Returns
    -------
    turns, p
        Shape (n,): the fixed points; NaN where none was reached.
    at
        The q-fold map there.
    """
    turns, p = turns.copy(), p.copy()
    step = np.full(turns.shape, np.inf)
    for _ in range(MOST_NEWTON_STEPS):
        at = return_map(harmonics, turns, p, periods, rotations)
        # In (t, p): the speed at the image is taken to be that at the point, which is true at a fixed point.
        a, b = at.matrix[0, 0] - 1.0, at.matrix[0, 1] / at.speed
        c, d = at.matrix[1, 0] * at.speed, at.matrix[1, 1] - 1.0
        across = a * d - b * c
        short, miss = at.shift, at.p - p
        # On a resonant curve every point is fixed and the determinant nothing but rounding: there is no step to take.
        amiss = np.maximum(np.abs(short), np.abs(miss)) > ROUNDING * np.max(np.abs(at.matrix), axis=(0, 1))
        dt, dp = np.zeros(turns.shape), np.zeros(turns.shape)
        np.divide(miss * b - short * d, across, out=dt, where=amiss & (across != 0.0))
        np.divide(short * c - miss * a, across, out=dp, where=amiss & (across != 0.0))
        step = np.where(np.isfinite(short), np.maximum(np.abs(dt), np.abs(dp)), np.inf)
        moving = (step > SETTLED) & np.isfinite(step)
        if not moving.any():
            break
        cut = np.minimum(1.0, LONGEST_STEP / np.maximum(step, LONGEST_STEP))
        turns = np.where(moving, turns + cut * dt, turns)
        p = np.clip(np.where(moving, p + cut * dp, p), -1.0 + 1e-9, 1.0 - 1e-9)
    reached = step <= SETTLED
    return np.where(reached, turns, np.nan), np.where(reached, p, np.nan), at
