"""How a block of orbits lies in memory: every quantity is a row of ``LANES`` numbers, one for each orbit.

A stage of the bounce takes one vector of orbits after the other out of the rows; what only looks at bounces goes over
whole rows in loops of plain arithmetic without branches, which the compiler turns into vector instructions by itself.
"""

from __future__ import annotations

from typing import TypeVar

import numpy as np
import numpy.typing as npt

from scanner.compiled import inlined
from scanner.vectors import WIDTH

Number = TypeVar("Number", np.float64, np.int64)

LANES = 64
"""Orbits in a block; its rows stay in the processor's first cache."""

GRAIN = WIDTH
"""Orbits of a block that is not full are followed so many at a time: only the last of them are idle."""

BUFFER = 16
"""Most bounces that are computed before the indicators look at them."""

# Rows of the state of a block: what is known of the last bounce, and after these the scratch of the next one.
(
    MOMENTUM,  # p, sine of the angle from the inward normal
    COSINE,  # sqrt(1 - p^2), carried beside p: near glancing it cannot be had back from p
    TANGENT_X,  # unit tangent, counter-clockwise
    TANGENT_Y,
    CURVATURE,
    POINT_X,  # from the centre of the table
    POINT_Y,
    TURN_RE,  # exp(i t) at the last bounce
    TURN_IM,
    FAILED,  # 0, or 1 once a chord of this orbit could not be found
    SLOPE_X,  # first and second derivative of the boundary by t there
    SLOPE_Y,
    BEND_X,
    BEND_Y,
    RAY_X,  # unit vector of the outgoing ray
    RAY_Y,
    HALF_COS,  # cosine and sine of half the advance of the boundary parameter
    HALF_SIN,
    START_1,  # what the derivatives of the cross product are at the near end of the chord
    START_2,
    START_3,
    REACH,  # fifth power of the longest step that would be the last one
    SETTLED,  # 1 once the chord in hand is found: its lane is left alone while others are corrected
) = range(23)
STATE_ROWS = 23
KEPT_ROWS = 10
"""The first rows are all that has to be kept of an orbit from one block of bounces to the next."""

# Rows of the buffer, each of shape (BUFFER, LANES).
ADVANCE, P_AFTER, CHORD, D_SS, D_SP, D_PS, D_PP = range(7)
BUFFER_ROWS = 7
OBSERVABLES = 3
"""The first rows of the buffer (advance, p, chord) are averaged; the others are the tangent map in (s, p)."""


@inlined
def busy_lanes(orbits: int) -> int:
    """Lanes to follow for so many orbits: up to the next multiple of GRAIN, at most a block."""
    return GRAIN * min(LANES // GRAIN, (orbits + GRAIN - 1) // GRAIN)


def fill_up(values: npt.NDArray[Number]) -> npt.NDArray[Number]:
    """Repeat the last orbit until the last block is full."""
    return np.concatenate([values, np.repeat(values[-1:], -values.size % LANES)])
