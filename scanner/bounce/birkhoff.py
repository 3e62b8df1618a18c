"""The two Birkhoff orbits of a rotation p/q: the longest polygon and the minimax one, with what belongs to them."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from scanner.bounce.polygons import TWO_PI, climb_to_saddle, relax
from scanner.compiled import kernel
from scanner.elementary import exp, log
from scanner.tables.boundary import evaluate

Floats = npt.NDArray[np.float64]
Whole = npt.NDArray[np.int64]

SLICES = 16
"""Polygons on the way from the longest one to the same with each vertex moved on to the next."""
START_SAMPLES = 256
FLATTEST = 1e-3
"""Curvature, relative to the mean, below which vertices are spread as if it were this."""
MOST_REFINEMENTS = 80
NOTHING = 1e-16
"""Moves of the mean below this, in turns, are rounding."""
STATIONARY = 1e-12
"""Gradient, relative to the length, below which a polygon reflects at every vertex."""
SAME_PLACE = 1e-9
"""A vertex this close to the origin of the boundary, in turns, counts as there, to whichever side it was rounded."""

# Rows of what is known of an orbit.
LENGTH, TRACE, FIRST_TURNS, FIRST_P, COSINES, FOUND = range(6)
NUMBERS = 6


@kernel
def affine_length(harmonics: Floats) -> Floats:
    """Integral of kappa^(2/3) ds from the origin of the boundary to evenly spaced parameters, the whole round last."""
    grid = np.empty(START_SAMPLES)
    for i in range(START_SAMPLES):
        grid[i] = (i + 0.5) / START_SAMPLES
    rows = evaluate(harmonics, grid)
    curvature = np.empty(START_SAMPLES)
    speed = np.empty(START_SAMPLES)
    mean = 0.0
    for i in range(START_SAMPLES):
        speed[i] = math.sqrt(rows[2, i] * rows[2, i] + rows[3, i] * rows[3, i])
        curvature[i] = (rows[2, i] * rows[5, i] - rows[3, i] * rows[4, i]) / (speed[i] * speed[i] * speed[i])
        mean += curvature[i] / START_SAMPLES
    reached = np.zeros(START_SAMPLES + 1)
    for i in range(START_SAMPLES):
        bend = max(curvature[i], FLATTEST * mean)
        reached[i + 1] = reached[i] + exp(log(bend) * (2.0 / 3.0)) * speed[i]
    return reached


@kernel
def spread_vertices(reached: Floats, rotation: int, phase: float, turns: Floats) -> None:
    """Put vertices equally far apart in that length, which is right near glancing (Lazutkin 1973).

    The phase, from 0 to 1, is that of the first vertex on its way to the place of the next one along the boundary.
    """
    q = turns.size
    for j in range(q):
        rounds = (j * rotation) // q
        wanted = (j * rotation - rounds * q + phase) * reached[START_SAMPLES] / q
        at = 0
        while at < START_SAMPLES - 1 and reached[at + 1] < wanted:
            at += 1
        share = (wanted - reached[at]) / (reached[at + 1] - reached[at])
        turns[j] = rounds + (at + share) / START_SAMPLES


@kernel
def refine(harmonics: Floats, turns: Floats, rotation: int, sign: float, reach: float) -> tuple[bool, float]:
    """Move the mean of a polygon to where the slope is 0, by Newton's method inside a bracket.

    Parameters
    ----------
    turns
        A polygon; moved.
    sign
        -1 for a maximum over the mean, 1 for a minimum.
    reach
        How far the mean may move, in turns.

    Returns
    -------
    found, length
        Whether it is stationary there, and its length.
    """
    follow = np.empty(turns.size)
    low = -reach
    high = reach
    here = 0.0
    settled, length, slope, bend = relax(harmonics, turns, rotation, follow)
    for _ in range(MOST_REFINEMENTS):
        if not settled:
            return False, length
        if sign * slope > 0.0:
            high = here
        else:
            low = here
        move = -slope / (bend * TWO_PI) if sign * bend > 0.0 else 2.0 * reach
        if not low <= here + move <= high:
            move = 0.5 * (low + high) - here
        if abs(move) < NOTHING:
            break
        here += move
        for i in range(turns.size):
            turns[i] += move * follow[i]
        settled, length, slope, bend = relax(harmonics, turns, rotation, follow)
    return abs(slope) < STATIONARY * length, length


@kernel
def sort_vertices(turns: Floats) -> Floats:
    """Vertices in the order of the boundary, in [0, 1)."""
    found = np.empty(turns.size)
    for i in range(turns.size):
        value = turns[i] - math.floor(turns[i])
        j = i
        while j > 0 and found[j - 1] > value:
            found[j] = found[j - 1]
            j -= 1
        found[j] = value
    return found


@kernel
def interlace(one: Floats, other: Floats) -> bool:
    """Whether each arc of the boundary between neighbouring vertices of one polygon has one vertex of the other."""
    a = sort_vertices(one)
    b = sort_vertices(other)
    ahead = a[0] < b[0]
    for i in range(a.size):
        if a[i] == b[i] or (a[i] < b[i]) != ahead:
            return False
        if i + 1 < a.size and (b[i] >= a[i + 1] if ahead else a[i] >= b[i + 1]):
            return False
    return True


@kernel
def describe(harmonics: Floats, turns: Floats, numbers: Floats, row: int) -> None:
    """Fill in the trace of the q-fold tangent map, the first vertex, p there and the sum of the cosines of an orbit."""
    q = turns.size
    rows = evaluate(harmonics, turns)
    speed = np.empty(q)
    curvature = np.empty(q)
    first = 0
    nearest = 1.0
    for i in range(q):
        speed[i] = math.sqrt(rows[2, i] * rows[2, i] + rows[3, i] * rows[3, i])
        curvature[i] = (rows[2, i] * rows[5, i] - rows[3, i] * rows[4, i]) / (speed[i] * speed[i] * speed[i])
        place = turns[i] + SAME_PLACE - math.floor(turns[i] + SAME_PLACE)
        if place < nearest:
            nearest = place
            first = i
    ss = 1.0
    sp = 0.0
    ps = 0.0
    pp = 1.0
    cosines = 0.0
    for step in range(q):
        i = (first + step) % q
        j = (i + 1) % q
        dx = rows[0, j] - rows[0, i]
        dy = rows[1, j] - rows[1, i]
        chord = math.sqrt(dx * dx + dy * dy)
        c0 = (rows[2, i] * dy - rows[3, i] * dx) / (speed[i] * chord)
        c1 = (rows[3, j] * dx - rows[2, j] * dy) / (speed[j] * chord)
        k0 = curvature[i]
        k1 = curvature[j]
        a = (k0 * chord - c0) / c1
        b = -chord / (c0 * c1)
        c = k0 * c1 + k1 * c0 - k0 * k1 * chord
        d = (k1 * chord - c1) / c0
        ss, sp, ps, pp = a * ss + b * ps, a * sp + b * pp, c * ss + d * ps, c * sp + d * pp
        cosines += c0
        if step == 0:
            numbers[row, FIRST_TURNS] = max(nearest - SAME_PLACE, 0.0)
            numbers[row, FIRST_P] = (rows[2, i] * dx + rows[3, i] * dy) / (speed[i] * chord)
    numbers[row, TRACE] = ss + pp
    numbers[row, COSINES] = cosines


@kernel
def find_pair(harmonics: Floats, reached: Floats, rotation: int, period: int, numbers: Floats, first: int) -> None:
    """Fill rows ``first`` (longest) and ``first + 1`` (minimax) of the numbers with the orbits of one rotation."""
    polygons = np.empty((SLICES, period))
    lengths = np.empty(SLICES)
    turns = np.empty(period)
    follow = np.empty(period)
    longest = np.empty(period)
    reach = 2.0 / (SLICES * period)
    best = 0
    least = 0
    for number in range(SLICES):
        spread_vertices(reached, rotation, number / SLICES, turns)
        _, lengths[number], _, _ = relax(harmonics, turns, rotation, follow)
        for i in range(period):
            polygons[number, i] = turns[i]
        best = number if lengths[number] > lengths[best] else best
        least = number if lengths[number] < lengths[least] else least
    for i in range(period):
        longest[i] = polygons[best, i]
    found, greatest = refine(harmonics, longest, rotation, -1.0, reach)
    numbers[first, LENGTH] = greatest
    numbers[first, FOUND] = 1.0 if found else 0.0
    describe(harmonics, longest, numbers, first)
    for i in range(period):
        turns[i] = polygons[least, i]
    found, length = refine(harmonics, turns, rotation, 1.0, reach)
    for number in range(SLICES):
        if found:
            break
        at = (least + (number + 1) // 2 * (1 if number % 2 else -1)) % SLICES
        for i in range(period):
            turns[i] = polygons[at, i]
        found, length = climb_to_saddle(harmonics, turns, rotation)
        found = found and length < greatest and interlace(longest, turns)
    numbers[first + 1, LENGTH] = length
    numbers[first + 1, FOUND] = 1.0 if found else 0.0
    describe(harmonics, turns, numbers, first + 1)


@kernel
def find_pairs(harmonics: Floats, rotations: Whole, periods: Whole) -> Floats:
    """Both orbits of each rotation: shape (2 n, NUMBERS), the longest before the minimax one."""
    reached = affine_length(harmonics)
    numbers = np.empty((2 * periods.size, NUMBERS))
    for i in range(periods.size):
        find_pair(harmonics, reached, rotations[i], periods[i], numbers, 2 * i)
    return numbers
