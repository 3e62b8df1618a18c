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
    KEPT_ROWS,
    LANES,
    P_AFTER,
    busy_lanes,
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

    def of(self, chosen: Whole) -> ReturnMap:
        """The map at some of the points."""
        return ReturnMap(self.shift[chosen], self.p[chosen], self.matrix[:, :, chosen], self.speed[chosen])

    def put(self, chosen: Whole, at: ReturnMap) -> None:
        """Replace the map at some of the points."""
        self.shift[chosen], self.p[chosen], self.speed[chosen] = at.shift, at.p, at.speed
        self.matrix[:, :, chosen] = at.matrix


@kernel
def return_block(
    harmonics: Floats,
    turns: Floats,
    momenta: Floats,
    periods: Whole,
    size: int,
    shift: Floats,
    p: Floats,
    matrix: Floats,
) -> None:
    """Follow the first ``size`` orbits of a block, each for its own number of bounces; fills the last three arrays."""
    state = np.empty((KEPT_ROWS, LANES))
    buffer = np.empty((BUFFER_ROWS, BUFFER, LANES))
    start_block(harmonics, turns, momenta, state)
    for j in range(size):
        shift[j] = 0.0
        matrix[0, 0, j] = matrix[1, 1, j] = 1.0
        matrix[0, 1, j] = matrix[1, 0, j] = 0.0
    longest = periods.max()
    for first in range(0, longest, BUFFER):
        bounce_block(harmonics, state, buffer, min(BUFFER, longest - first), busy_lanes(size))
        for j in range(size):
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
    # Orbits of like periods in a block, as all of its orbits make as many bounces as the longest of them.
    order = np.argsort(periods, kind="stable")
    full_turns, full_p, full_periods = fill_up(turns[order]), fill_up(p[order]), fill_up(periods[order])
    shift, after, matrix = np.empty(turns.size), np.empty(turns.size), np.empty((2, 2, turns.size))
    for first in range(0, turns.size, LANES):
        block = slice(first, first + LANES)
        size = min(LANES, turns.size - first)
        tangent = np.empty((2, 2, size))
        return_block(
            harmonics,
            full_turns[block],
            full_p[block],
            full_periods[block],
            size,
            shift[block],
            after[block],
            tangent,
        )
        matrix[:, :, block] = tangent
    place = np.argsort(order)
    return ReturnMap(shift[place] - rotations, after[place], matrix[:, :, place], boundary_speed(harmonics, turns))


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
    at = return_map(harmonics, turns, p, periods, rotations)
    reached = np.zeros(turns.shape, dtype=bool)
    moving = np.arange(turns.size)
    for _ in range(MOST_NEWTON_STEPS):
        dt, dp = _newton_step(at.of(moving), p[moving])
        length = np.maximum(np.abs(dt), np.abs(dp))
        reached[moving] = length <= SETTLED
        going = (length > SETTLED) & np.isfinite(length)
        moving = moving[going]
        if not moving.size:
            break
        cut = np.minimum(1.0, LONGEST_STEP / np.maximum(length[going], LONGEST_STEP))
        turns[moving] += cut * dt[going]
        p[moving] = np.clip(p[moving] + cut * dp[going], -1.0 + 1e-9, 1.0 - 1e-9)
        at.put(moving, return_map(harmonics, turns[moving], p[moving], periods[moving], rotations[moving]))
    return np.where(reached, turns, np.nan), np.where(reached, p, np.nan), at


def _newton_step(at: ReturnMap, p: Floats) -> tuple[Floats, Floats]:
    """Steps in (t, p) from points of momentum ``p`` to fixed points of the linearised map; NaN where there is no map.

    The speed at the image is taken to be that at the point, which is true at a fixed point.
    """
    a, b = at.matrix[0, 0] - 1.0, at.matrix[0, 1] / at.speed
    c, d = at.matrix[1, 0] * at.speed, at.matrix[1, 1] - 1.0
    across = a * d - b * c
    short, miss = at.shift, at.p - p
    # On a resonant curve every point is fixed and the determinant nothing but rounding: there is no step to take.
    amiss = np.maximum(np.abs(short), np.abs(miss)) > ROUNDING * np.max(np.abs(at.matrix), axis=(0, 1))
    dt, dp = np.where(np.isfinite(short), np.zeros((2, p.size)), np.nan)
    np.divide(miss * b - short * d, across, out=dt, where=amiss & (across != 0.0))
    np.divide(short * c - miss * a, across, out=dp, where=amiss & (across != 0.0))
    return dt, dp
