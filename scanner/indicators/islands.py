"""Orbits inside islands: the island's centre, and the winding about it.

The leading frequency of an island orbit is not its rotation number, which is the island's p/q to all digits, but the
winding of the q-fold map about the island's centre.  Both are had from the orbit's own last bounces.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from scanner.bounce.lanes import LANES
from scanner.bounce.return_map import ReturnMap, find_fixed_points
from scanner.compiled import kernel
from scanner.elementary import FIXED_UNIT, angle_turns, pair_of
from scanner.indicators.blocks import Recording
from scanner.indicators.schedule import quick_weights

Floats = npt.NDArray[np.float64]
Whole = npt.NDArray[np.int64]
Fixed = npt.NDArray[np.int32]

PARABOLIC = 1e-9
"""A trace this close to 2 is that of a shear: rounding moves it by 1e-11, and no island met has one as close."""
AT_REST = 1e-7
"""A return as close as this to the start, in turns and in p, has not moved; rounding adds up to 1e-9."""
SAME_PLACE = 1e-12
"""Centres are found to better than this, in turns."""
FEWEST_RETURNS = 8
"""Returns to the island's part without which nothing is said of the motion in it."""
ARCS = 128
"""Arcs of the circle in which the steps of the angle are looked for."""


@dataclass(frozen=True)
class Windings:
    """Motion of n orbits about the centres of their islands; NaN where no elliptic centre was found.

    Attributes
    ----------
    winding
        Shape (n,): turns of the q-fold map about the centre, folded to [0, 1/2].
    change
        Shape (n,): its change between the two halves of the bounces.
    centre_turns, centre_p
        Shape (n,): the centre in the part of the island where the orbit starts.
    trace
        Shape (n,): trace of the q-fold tangent map at the periodic point that was found, elliptic or not.
    at_rest
        Shape (n,): 1 where every return is at the start, else 0.
    """

    winding: Floats
    change: Floats
    centre_turns: Floats
    centre_p: Floats
    trace: Floats
    at_rest: Floats

    @property
    def resonant(self) -> npt.NDArray[np.bool_]:
        """Where the orbit is itself a parabolic periodic point: on a curve of such points and not in an island.

        A circle has such curves.  Orbits that move about a parabolic point are in an island.
        """
        found: npt.NDArray[np.bool_] = (np.abs(self.trace - 2.0) < PARABOLIC) & (self.at_rest > 0.0)
        return found


@kernel
def pick_returns(
    rows: Whole, columns: Whole, periods: Whole, waits: Whole, places: Whole, start: Fixed, shifts: Floats, p: Floats
) -> None:
    """Add every q-th bounce of a recording to the returns of each orbit.

    ``waits`` counts down to the next return, ``places`` is where the last one went, -1 before the first; ``start``
    is the boundary parameter of the first, from which the shifts are measured.  All of them are updated.
    """
    for j in range(columns.size):
        block = columns[j] // LANES
        lane = columns[j] % LANES
        row = waits[j] - 1
        while row < rows.shape[1]:
            turns, half_p = pair_of(rows[block, row, lane])
            if places[j] < 0:
                start[j] = turns
            places[j] += 1
            shifts[j, places[j]] = FIXED_UNIT * np.int32(turns - start[j])  # whole turns drop out
            p[j, places[j]] = 2.0 * FIXED_UNIT * half_p
            row += periods[j]
        waits[j] = row - rows.shape[1] + 1


@dataclass(frozen=True)
class Returns:
    """Every q-th bounce of n orbits from the first that is kept on: returns to one part of the island.

    Attributes
    ----------
    orbits
        Shape (n,): their numbers.
    turns
        Shape (n,): boundary parameter at the first return.
    shifts, p
        Shape (n, places): parameter less ``turns``, and momentum.
    counts
        Shape (n,): how many returns there are after the first, FEWEST_RETURNS or more.
    periods, rotations
        Shape (n,): q and p of each orbit's island.
    """

    orbits: Whole
    turns: Floats
    shifts: Floats
    p: Floats
    counts: Whole
    periods: Whole
    rotations: Whole


def collect_returns(orbits: Whole, recordings: list[Recording], periods: Whole, rotations: Whole) -> Returns:
    """Collect the returns of island orbits, and leave out those that have too few.

    Parameters
    ----------
    orbits
        Their numbers, shape (n,), n > 0.
    recordings
        Their last bounces, with columns of shape (n,).
    periods, rotations
        q and p of each orbit's island, shape (n,).
    """
    length = sum(part.rows.shape[1] for part in recordings)
    shifts, p = np.empty((2, periods.size, length // int(periods.min()) + 1))
    # A whole number of q-fold maps from the start of the orbit, so that the centre is that of the start's part.
    waits = periods - recordings[0].first % periods
    places = np.full(periods.size, -1)
    start = np.zeros(periods.size, dtype=np.int32)
    for part in recordings:
        pick_returns(part.rows, part.columns, periods, waits, places, start, shifts, p)
    enough = places >= FEWEST_RETURNS
    return Returns(
        orbits=orbits[enough],
        turns=np.float64(FIXED_UNIT) * start[enough],
        shifts=shifts[enough],
        p=p[enough],
        counts=places[enough],
        periods=periods[enough],
        rotations=rotations[enough],
    )


def wind_orbits(harmonics: Floats, stages: list[Returns]) -> Windings:
    """Find the centres of islands and the windings about them, of the orbits of some stages in turn.

    The centres are looked for together, as Newton's method takes as many rounds as the slowest orbit.

    Parameters
    ----------
    harmonics
        Boundary, shape (4, K + 1).
    stages
        Returns of n orbits in all.
    """
    windows = [_windows_of(stage.counts) for stage in stages]
    shift, p = np.concatenate(
        [average_points(stage.shifts, stage.p, stage.counts, *at) for stage, at in zip(stages, windows, strict=True)],
        axis=1,
    )
    turns, periods, rotations = (
        np.concatenate([getattr(stage, name) for stage in stages]) for name in ("turns", "periods", "rotations")
    )
    centre_turns, centre_p, at = find_fixed_points(harmonics, turns + shift, p, periods, rotations)
    centres = np.stack([centre_turns - turns, centre_p, *_normal_form(at)])
    ends = np.cumsum([stage.counts.size for stage in stages])
    winding, change, at_rest = np.concatenate(
        [
            average_windings(stage.shifts, stage.p, stage.counts, *window, *centre)
            for stage, window, centre in zip(stages, windows, np.split(centres, ends[:-1], axis=1), strict=True)
        ],
        axis=1,
    )
    known = np.where(np.isfinite(winding), 1.0, np.nan)
    # A centre at the origin of the boundary stays there, to whichever side it was rounded.
    centre_turns = np.maximum((centre_turns + SAME_PLACE) % 1.0 - SAME_PLACE, 0.0)
    return Windings(winding, change, centre_turns * known, centre_p * known, at.trace, at_rest)


def _windows_of(counts: Whole) -> tuple[Floats, Whole]:
    """Weights of windows of each count and of half of it, and where the two start for each orbit, shape (2, n)."""
    lengths, which = np.unique(np.stack([counts, counts // 2]), return_inverse=True)
    starts = np.cumsum(lengths) - lengths
    return np.concatenate([quick_weights(int(length)) for length in lengths]), starts[which].reshape(2, -1)


def _normal_form(at: ReturnMap) -> tuple[Floats, Floats]:
    """Shear and stretch that make the tangent map at an elliptic point a rotation of (stretch t, p + shear t).

    The quadratic form m21 t^2 + (m22 - m11) t p - m12 p^2 is invariant under the matrix (m11, m12; m21, m22) of unit
    determinant; it is definite where the trace is between -2 and 2.  NaN elsewhere.
    """
    m12 = at.matrix[0, 1] / at.speed
    inside = 4.0 - at.trace * at.trace
    stretch = np.sqrt(np.where(inside > 4.0 * PARABOLIC, inside, np.nan)) / (2.0 * np.abs(m12))
    return (at.matrix[0, 0] - at.matrix[1, 1]) / (2.0 * m12), stretch


@kernel
def average_points(shifts: Floats, p: Floats, counts: Whole, weights: Floats, places: Whole) -> Floats:
    """Weighted averages of shift and p over the returns of each orbit, shape (2, n): near its island's centre."""
    means = np.zeros((2, counts.size))
    for j in range(counts.size):
        for n in range(counts[j]):
            weight = weights[places[0, j] + n]
            means[0, j] += weight * shifts[j, n]
            means[1, j] += weight * p[j, n]
    return means


@kernel
def average_windings(
    shifts: Floats,
    p: Floats,
    counts: Whole,
    weights: Floats,
    places: Whole,
    centre_shift: Floats,
    centre_p: Floats,
    shear: Floats,
    stretch: Floats,
) -> Floats:
    """Winding of each orbit about its centre, folded to [0, 1/2], its change between two halves, and ``at_rest``.

    Shape (3, n); the first two are NaN where the centre is not elliptic or not that of the orbit's island.
    """
    found = np.full((3, counts.size), np.nan)
    for j in range(counts.size):
        count = counts[j]
        angles = np.empty(count + 1)
        right = 0
        above = 0
        right_above = 0
        moved = 0
        for n in range(count + 1):
            x = shifts[j, n] - centre_shift[j]
            y = p[j, n] - centre_p[j]
            moved += 1 if abs(shifts[j, n]) > AT_REST or abs(p[j, n] - p[j, 0]) > AT_REST else 0
            right += 1 if x > 0.0 else 0
            above += 1 if y > 0.0 else 0
            right_above += 1 if x > 0.0 and y > 0.0 else 0
            angles[n] = angle_turns(y + shear[j] * x, stretch[j] * x)
        found[2, j] = 0.0 if moved > 0 else 1.0
        steps = np.empty(count)
        for n in range(count):
            step = angles[n + 1] - angles[n]
            steps[n] = step - math.floor(step)
        # With a quarter left empty, or steps all round the circle, the centre is not that of this orbit's island.
        quarters = (right_above, right - right_above, above - right_above, count + 1 - right - above + right_above)
        cut = widest_gap(steps)
        if not (math.isfinite(stretch[j]) and min(quarters) > 0 and cut >= 0.0):
            continue
        for n in range(count):
            steps[n] -= 1.0 if steps[n] > cut else 0.0
        whole = 0.0
        for n in range(count):
            whole += weights[places[0, j] + n] * steps[n]
        half = count // 2
        early = 0.0
        late = 0.0
        for n in range(half):
            early += weights[places[1, j] + n] * steps[count - 2 * half + n]
            late += weights[places[1, j] + n] * steps[count - half + n]
        found[0, j] = abs(whole - math.floor(whole + 0.5))
        found[1, j] = late - early
    return found


@kernel
def widest_gap(steps: Floats) -> float:
    """Middle of the widest arc of the circle [0, 1) that no step falls in; -1 where there is none to a 1/128 turn.

    The steps of an orbit about its centre fill an arc; cut open elsewhere, the circle becomes a line again.
    """
    taken = np.zeros(ARCS, dtype=np.bool_)
    for n in range(steps.size):
        if not math.isfinite(steps[n]):
            return -1.0
        taken[min(int(steps[n] * ARCS), ARCS - 1)] = True
    widest = 0
    middle = -1.0
    run = 0
    for number in range(2 * ARCS):
        run = 0 if taken[number % ARCS] else run + 1
        if run > widest and run <= ARCS:
            widest = run
            middle = ((number + 1.0 - 0.5 * run) / ARCS) % 1.0
    return middle
