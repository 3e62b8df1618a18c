"""Indicators that are fed a few bounces at a time and keep a fixed amount of memory per orbit.

They see only the buffer of a block, so the same code serves any area-preserving map that fills one.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from scanner.bounce.lanes import CHORD, D_PP, D_PS, D_SP, D_SS, LANES, OBSERVABLES
from scanner.compiled import kernel, pasted
from scanner.elementary import log
from scanner.vectors import fused

Floats = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]

VECTOR_S, VECTOR_P, GROWTH, PATH = range(4)
"""Rows of the running state: a tangent vector, the logarithm of its growth so far, the length travelled."""
RUNNING_ROWS = 4


@kernel
def start_running(running: Floats) -> None:
    """Begin with the tangent vector (1, 1) / 2, of unit size in the sum of absolute values."""
    for j in range(running.shape[1]):
        running[VECTOR_S, j] = 0.5
        running[VECTOR_P, j] = 0.5
        running[GROWTH, j] = 0.0
        running[PATH, j] = 0.0


@pasted
def add_to_averages(
    buffer: Floats, count: int, first: int, windows: Integers, weights: Floats, averages: Floats, lanes: int
) -> None:
    """Add bounces ``first`` to ``first + count`` to the weighted averages of every window they fall in.

    ``averages`` has shape (windows * OBSERVABLES, LANES).  Four bounces at a time: each average is loaded and stored
    once for them, and summed in the order of the bounces all the same.
    """
    for w in range(windows.shape[0]):
        start = windows[w, 0]
        shift = windows[w, 2] - start
        low = max(start, first)
        high = min(start + windows[w, 1], first + count)
        number = low
        while number + 4 <= high:
            w0 = weights[shift + number]
            w1 = weights[shift + number + 1]
            w2 = weights[shift + number + 2]
            w3 = weights[shift + number + 3]
            row = number - first
            for q in range(OBSERVABLES):
                for j in range(lanes):
                    total = averages[w * OBSERVABLES + q, j]
                    total = fused(w0, buffer[q, row, j], total)
                    total = fused(w1, buffer[q, row + 1, j], total)
                    total = fused(w2, buffer[q, row + 2, j], total)
                    total = fused(w3, buffer[q, row + 3, j], total)
                    averages[w * OBSERVABLES + q, j] = total
            number += 4
        while number < high:
            weight = weights[shift + number]
            for q in range(OBSERVABLES):
                for j in range(lanes):
                    total = averages[w * OBSERVABLES + q, j]
                    averages[w * OBSERVABLES + q, j] = fused(weight, buffer[q, number - first, j], total)
            number += 1


@pasted
def grow_tangent(buffer: Floats, count: int, running: Floats, lanes: int) -> None:
    """Carry the tangent vector through ``count`` bounces, then bring it back to unit size and note the growth.

    A bounce stretches by at most about 1 / cos of the angle from the normal: 16 of them cannot overflow.
    """
    for row in range(count):
        for j in range(lanes):
            s = running[VECTOR_S, j]
            p = running[VECTOR_P, j]
            running[VECTOR_S, j] = fused(buffer[D_SS, row, j], s, buffer[D_SP, row, j] * p)
            running[VECTOR_P, j] = fused(buffer[D_PS, row, j], s, buffer[D_PP, row, j] * p)
            running[PATH, j] += buffer[CHORD, row, j]
    for j in range(lanes):
        size = abs(running[VECTOR_S, j]) + abs(running[VECTOR_P, j])
        running[GROWTH, j] += log(size)
        running[VECTOR_S, j] /= size
        running[VECTOR_P, j] /= size


@pasted
def absorb(
    buffer: Floats,
    count: int,
    first: int,
    windows: Integers,
    weights: Floats,
    averages: Floats,
    running: Floats,
    lanes: int,
) -> None:
    """Feed all indicators with ``count`` bounces, the first of which has number ``first``."""
    add_to_averages(buffer, count, first, windows, weights, averages, lanes)
    grow_tangent(buffer, count, running, lanes)


@kernel
def absorb_block(
    buffer: Floats, count: int, first: int, windows: Integers, weights: Floats, averages: Floats, running: Floats
) -> None:
    """Feed all indicators with a full block, for callers that are not kernels."""
    absorb(buffer, count, first, windows, weights, averages, running, LANES)
