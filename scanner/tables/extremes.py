"""Extremes of a smooth periodic function, for what a family knows of its curve in closed form."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from scanner.tables.boundary import FloatArray

_NEIGHBOURHOOD = np.linspace(-1.0, 1.0, 17)


def find_extremes(function: Callable[[FloatArray], FloatArray], count: int) -> tuple[float, float, float, float]:
    """Find the smallest value of a function of an angle in turns and where, the largest and where.

    Every local extreme of ``count`` equally spaced values is refined, all of them at once, by laying a finer grid
    over its neighbourhood again and again.
    """
    turns = np.arange(count) / count
    low, low_at = _find_lowest(function, turns, 1.0)
    high, high_at = _find_lowest(function, turns, -1.0)
    return low, low_at, -high, high_at


def _find_lowest(function: Callable[[FloatArray], FloatArray], turns: FloatArray, sign: float) -> tuple[float, float]:
    values = sign * function(turns)
    valleys = turns[(values <= np.roll(values, 1)) & (values <= np.roll(values, -1))]
    width = 1.0 / len(turns)
    while width > 1e-9:  # the value is then exact to the square of that
        nearby = valleys[:, None] + width * _NEIGHBOURHOOD
        values = sign * function(nearby)
        best = np.argmin(values, axis=1)[:, None]
        valleys = np.take_along_axis(nearby, best, axis=1)[:, 0]
        lowest = np.take_along_axis(values, best, axis=1)[:, 0]
        width *= 2.0 / (len(_NEIGHBOURHOOD) - 1)
    found = int(np.argmin(lowest))
    return float(lowest[found]), float(valleys[found] % 1.0)
