"""Area-preserving maps with known answers, which fill the same buffer as the billiard does."""

from __future__ import annotations

import math
from collections.abc import Callable

import numba
import numpy as np

from scanner.bounce.lanes import (
    ADVANCE,
    BUFFER,
    BUFFER_ROWS,
    CHORD,
    D_PP,
    D_PS,
    D_SP,
    D_SS,
    LANES,
    OBSERVABLES,
    P_AFTER,
)
from scanner.indicators.blocks import Streams
from scanner.indicators.readings import Readings, read_streams
from scanner.indicators.schedule import make_schedule
from scanner.indicators.streams import GROWTH, PATH, RUNNING_ROWS, absorb_block, start_running
from scanner.indicators.verdicts import Verdicts, judge

TWO_PI = 2 * math.pi
Step = Callable[[np.ndarray, np.ndarray, np.ndarray, int], None]


def standard_map(strength: float) -> Step:
    """Chirikov's map: p' = p + K / (2 pi) sin(2 pi x), x' = x + p'."""

    @numba.njit
    def fill(x: np.ndarray, p: np.ndarray, buffer: np.ndarray, count: int) -> None:
        for row in range(count):
            for j in range(LANES):
                kick = strength * math.cos(TWO_PI * x[j])
                p[j] += strength / TWO_PI * math.sin(TWO_PI * x[j])
                x[j] = (x[j] + p[j]) % 1.0
                buffer[ADVANCE, row, j] = p[j]
                buffer[P_AFTER, row, j] = math.sin(TWO_PI * p[j])
                buffer[CHORD, row, j] = 1.0 + 0.5 * math.cos(TWO_PI * x[j])
                buffer[D_SS, row, j] = 1.0 + kick
                buffer[D_SP, row, j] = 1.0
                buffer[D_PS, row, j] = kick
                buffer[D_PP, row, j] = 1.0

    return fill


@numba.njit
def cat_map(x: np.ndarray, p: np.ndarray, buffer: np.ndarray, count: int) -> None:
    """Arnold's map (x, p) -> (2 x + p, x + p) of the torus."""
    for row in range(count):
        for j in range(LANES):
            advance = x[j] + p[j]
            x[j], p[j] = (x[j] + advance) % 1.0, advance % 1.0
            buffer[ADVANCE, row, j] = 0.5 * advance
            buffer[P_AFTER, row, j] = p[j]
            buffer[CHORD, row, j] = 1.0 + 0.5 * math.cos(TWO_PI * x[j])
            buffer[D_SS, row, j] = 2.0
            buffer[D_SP, row, j] = 1.0
            buffer[D_PS, row, j] = 1.0
            buffer[D_PP, row, j] = 1.0


def run_map(fill: Step, x: np.ndarray, p: np.ndarray, steps: int) -> tuple[list[Readings], list[Verdicts]]:
    """Readings and verdicts at every horizon for orbits of a map, a multiple of LANES of them."""
    schedule = make_schedule(steps)
    averages = np.zeros((OBSERVABLES * schedule.windows.shape[0], x.size))
    growth = np.empty((schedule.marks.size, x.size))
    path = np.empty((schedule.marks.size, x.size))
    for first_orbit in range(0, x.size, LANES):
        lanes = slice(first_orbit, first_orbit + LANES)
        xs, ps = x[lanes].copy(), p[lanes].copy()
        block = np.zeros((OBSERVABLES * schedule.windows.shape[0], LANES))
        buffer = np.zeros((BUFFER_ROWS, BUFFER, LANES))
        running = np.empty((RUNNING_ROWS, LANES))
        start_running(running)
        first = 0
        for number, mark in enumerate(schedule.marks):
            while first < mark:
                count = min(BUFFER, int(mark) - first)
                fill(xs, ps, buffer, count)
                absorb_block(buffer, count, first, schedule.windows, schedule.weights, block, running)
                first += count
            growth[number, lanes] = running[GROWTH]
            path[number, lanes] = running[PATH]
        averages[:, lanes] = block
    streams = Streams(averages.reshape(-1, OBSERVABLES, x.size), growth, path, np.zeros(x.size, dtype=bool))
    readings = [read_streams(streams, schedule, number, 1.0) for number in range(len(schedule.horizons))]
    return readings, [judge(reading, streams.failed) for reading in readings]
