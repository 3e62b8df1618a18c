"""Closed polygons of q vertices and given rotation: their length, and the longest ones at a fixed mean phase.

The length of an inscribed polygon is stationary where every vertex reflects (Birkhoff 1927).  Let G(m) be the greatest
length of the polygons of one rotation whose vertices have the mean parameter m.  Its derivative is the gradient that
all vertices then share, its maximum is the longest polygon, and its minimum the minimax between that polygon and
the same one with each vertex moved on to the next: a period of 1/q in m.  So one parameter is left, along which the
length hardly changes near a resonant curve, and the other directions stay stiff.
"""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from scanner.compiled import kernel
from scanner.tables.boundary import evaluate

Floats = npt.NDArray[np.float64]

TWO_PI = 2.0 * math.pi
MOST_STEPS = 60
SETTLED = 1e-14
"""A step this small, in radians of the boundary parameter, is rounding."""
NEARLY_SETTLED = 1e-9
"""Steps below this that no longer shrink are rounding too, on a table of high curvature."""
CLOSEST = 0.5
"""Share of the way to the next vertex that a step must leave: polygons of other rotations may be longer."""
FIRST_DAMPING = 1e-3
"""Relative to the mean second derivative; falls and grows by factors of 4, and is dropped below a tenth of this."""

POWER_STEPS = 40
MOST_CLIMBS = 300
CLIMBING_STEP = 0.05
"""Largest step over 2 pi / q on the way to a saddle, where nothing tells a step that went too far."""


@kernel
def measure_polygon(harmonics: Floats, turns: Floats, gradient: Floats, hessian: Floats) -> float:
    """Length of the closed polygon with vertices at boundary parameters ``turns``, shape (q,).

    Fills its gradient, shape (q,), and its Hessian, shape (q, q), by the angles 2 pi t.
    """
    q = turns.size
    rows = evaluate(harmonics, turns)
    for i in range(q):
        gradient[i] = 0.0
        for j in range(q):
            hessian[i, j] = 0.0
    length = 0.0
    rest = 0.0
    for i in range(q):
        j = i + 1 if i + 1 < q else 0
        dx = rows[0, j] - rows[0, i]
        dy = rows[1, j] - rows[1, i]
        chord = math.sqrt(dx * dx + dy * dy)
        ux = dx / chord
        uy = dy / chord
        along_i = rows[2, i] * ux + rows[3, i] * uy
        along_j = rows[2, j] * ux + rows[3, j] * uy
        across_i = rows[3, i] * ux - rows[2, i] * uy
        across_j = rows[3, j] * ux - rows[2, j] * uy
        gradient[i] -= along_i
        gradient[j] += along_j
        hessian[i, i] += across_i * across_i / chord - (rows[4, i] * ux + rows[5, i] * uy)
        hessian[j, j] += across_j * across_j / chord + (rows[4, j] * ux + rows[5, j] * uy)
        hessian[i, j] -= across_i * across_j / chord
        hessian[j, i] -= across_i * across_j / chord
        longer = length + chord
        rest += (length - longer) + chord if length > chord else (chord - longer) + length
        length = longer
    return length + rest


@kernel
def total(values: Floats) -> float:
    """Sum of the values, by a loop that compiles at once."""
    found = 0.0
    for i in range(values.size):
        found += values[i]
    return found


@kernel
def factorise(matrix: Floats) -> bool:
    """Replace the lower triangle by its Cholesky factor; False where the matrix is not positive definite."""
    size = matrix.shape[0]
    for i in range(size):
        for j in range(i + 1):
            left = matrix[i, j]
            for k in range(j):
                left -= matrix[i, k] * matrix[j, k]
            if i > j:
                matrix[i, j] = left / matrix[j, j]
            elif left > 0.0:
                matrix[i, i] = math.sqrt(left)
            else:
                return False
    return True


@kernel
def substitute(factor: Floats, values: Floats) -> None:
    """Solve in place with a Cholesky factor."""
    size = values.size
    for i in range(size):
        for k in range(i):
            values[i] -= factor[i, k] * values[k]
        values[i] /= factor[i, i]
    for i in range(size - 1, -1, -1):
        for k in range(i + 1, size):
            values[i] -= factor[k, i] * values[k]
        values[i] /= factor[i, i]


@kernel
def uncrossed_share(turns: Floats, step: Floats, rotation: int) -> float:
    """Share of a step, in radians, after which every vertex is still ahead of the last one by less than a round."""
    q = turns.size
    share = 1.0
    for i in range(q):
        j = i + 1 if i + 1 < q else 0
        gap = turns[j] - turns[i] + (0.0 if j > 0 else rotation)
        growth = (step[j] - step[i]) / TWO_PI
        room = (1.0 - CLOSEST) * (gap if growth < 0.0 else 1.0 - gap)
        if room < share * abs(growth):
            share = room / abs(growth)
    return share


@kernel
def relax(harmonics: Floats, turns: Floats, rotation: int, follow: Floats) -> tuple[bool, float, float, float]:
    """Lengthen a polygon to a maximum at constant mean parameter, by damped Newton steps.

    Parameters
    ----------
    harmonics
        Boundary, shape (4, K + 1).
    turns
        Shape (q,): the vertices; moved.
    rotation
        Rounds that the polygon makes.
    follow
        Shape (q,): filled with how the vertices of the maximum move on when the mean does, 1 on the average.

    Returns
    -------
    settled, length, slope, bend
        Whether a maximum was reached; G there, G' and G'' by the mean, all by radians of one vertex: over q.
    """
    q = turns.size
    gradient = np.empty(q)
    hessian = np.empty((q, q))
    trial_gradient = np.empty(q)
    trial_hessian = np.empty((q, q))
    factor = np.empty((q, q))
    step = np.empty(q)
    trial = np.empty(q)
    length = measure_polygon(harmonics, turns, gradient, hessian)
    damping = 0.0
    last = np.inf
    for _ in range(MOST_STEPS):
        scale = 0.0
        for i in range(q):
            for j in range(q):
                scale += abs(hessian[i, j]) / q
        for i in range(q):
            for j in range(q):
                factor[i, j] = scale - hessian[i, j]
            factor[i, i] += damping * scale
            step[i] = gradient[i]
            follow[i] = 1.0
        if not factorise(factor):
            damping = max(FIRST_DAMPING, 4.0 * damping)
            continue
        substitute(factor, step)
        substitute(factor, follow)
        below = total(follow)
        share = total(step) / below
        size = 0.0
        for i in range(q):
            step[i] -= share * follow[i]
            size = max(size, abs(step[i]))
        if damping == 0.0 and (size < SETTLED or (size < NEARLY_SETTLED and size > 0.5 * last)):
            for i in range(q):
                follow[i] *= q / below
            return True, length, total(gradient) / q, (scale - 1.0 / below) * q
        cut = uncrossed_share(turns, step, rotation)
        for i in range(q):
            trial[i] = turns[i] + cut * step[i] / TWO_PI
        trial_length = measure_polygon(harmonics, trial, trial_gradient, trial_hessian)
        if trial_length > length - 1e-14 * length:
            for i in range(q):
                turns[i] = trial[i]
            length = trial_length
            gradient, trial_gradient = trial_gradient, gradient
            hessian, trial_hessian = trial_hessian, hessian
            last = size if damping == 0.0 else np.inf
            damping = 0.25 * damping if damping > 0.1 * FIRST_DAMPING else 0.0
        else:
            damping = max(FIRST_DAMPING, 4.0 * damping)
    return False, length, total(gradient) / q, 0.0


@kernel
def steepest_direction(hessian: Floats, direction: Floats) -> float:
    """Largest eigenvalue of a Hessian and its eigenvector, by the power method.

    Two neighbours that move the same way lengthen each other's effect (the twist): off the diagonal nothing is
    negative, so that the eigenvector is positive and a positive start is close to it (Perron and Frobenius).
    """
    q = direction.size
    shift = 0.0
    for i in range(q):
        row = 0.0
        for j in range(q):
            row += abs(hessian[i, j])
        shift = max(shift, row)
    image = np.empty(q)
    value = 0.0
    for _ in range(POWER_STEPS):
        norm = 0.0
        for i in range(q):
            image[i] = shift * direction[i]
            for j in range(q):
                image[i] += hessian[i, j] * direction[j]
            norm += image[i] * image[i]
        norm = math.sqrt(norm)
        for i in range(q):
            direction[i] = image[i] / norm
        value = norm - shift
    return value


@kernel
def climb_to_saddle(harmonics: Floats, turns: Floats, rotation: int) -> tuple[bool, float]:
    """Move a polygon to where the length is least along the steepest direction and greatest across it.

    For tables so far from integrable that the way from one longest polygon to the next folds over the mean.

    Returns
    -------
    settled, length
        Whether such a polygon was reached, and its length.
    """
    q = turns.size
    gradient = np.empty(q)
    hessian = np.empty((q, q))
    factor = np.empty((q, q))
    step = np.empty(q)
    direction = np.ones(q)
    length = measure_polygon(harmonics, turns, gradient, hessian)
    damping = 0.0
    last = np.inf
    for _ in range(MOST_CLIMBS):
        value = steepest_direction(hessian, direction)
        scale = 0.0
        along = 0.0
        for i in range(q):
            scale += abs(hessian[i, i]) / q
            along += gradient[i] * direction[i]
        for i in range(q):
            for j in range(q):
                factor[i, j] = (value + scale) * direction[i] * direction[j] - hessian[i, j]
            factor[i, i] += damping * scale
            step[i] = gradient[i] - along * direction[i]
        if not factorise(factor):
            damping = max(FIRST_DAMPING, 4.0 * damping)
            continue
        substitute(factor, step)
        descent = -along / max(abs(value), 1e-3 * scale)
        size = 0.0
        for i in range(q):
            step[i] += descent * direction[i]
            size = max(size, abs(step[i]))
        if damping == 0.0 and value > 0.0 and (size < SETTLED or (size < NEARLY_SETTLED and size > 0.5 * last)):
            return True, length
        cut = min(uncrossed_share(turns, step, rotation), CLIMBING_STEP * TWO_PI / q / size)
        for i in range(q):
            turns[i] += cut * step[i] / TWO_PI
        length = measure_polygon(harmonics, turns, gradient, hessian)
        last = size
        damping = 0.25 * damping if damping > 0.1 * FIRST_DAMPING else 0.0
    return False, length
