"""Kernels of closed curves as finite Fourier series: samples to series, series to points, arc length, curvature.

A boundary is a float64 array ``harmonics[4, K + 1]``: with t in turns,
``x(t) = sum_k harmonics[0, k] cos 2 pi k t + harmonics[1, k] sin 2 pi k t`` and y likewise from rows 2 and 3.
Derivatives are taken with respect to the angle 2 pi t.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from scanner.compiled import kernel
from scanner.elementary import TWO_PI, angle_turns, cos_sin_turns

FloatArray = NDArray[np.float64]

_GOLDEN = 0.6180339887498949


@kernel
def fourier_series(samples: FloatArray, highest: int) -> FloatArray:
    """Cosine and sine coefficients 0..highest of equally spaced samples of one period, shape (2, highest + 1).

    A direct transform, so that any number of samples will do.  Samples are folded into even and odd parts and
    summed with compensation (Neumaier, Z. angew. Math. Mech. 54:39, 1974): what is left is the rounding of the
    samples themselves, averaged.
    """
    count = samples.size
    half = (count - 1) // 2
    cosine = np.empty(count)
    sine = np.empty(count)
    for j in range(count):
        cosine[j], sine[j] = cos_sin_turns(j / count)
    even = np.empty(half + 1)
    odd = np.empty(half + 1)
    for j in range(1, half + 1):
        even[j] = samples[j] + samples[count - j]
        odd[j] = samples[j] - samples[count - j]
    found = np.zeros((2, highest + 1))
    for k in range(highest + 1):
        in_phase = samples[0]
        if count % 2 == 0:
            in_phase += samples[count // 2] if k % 2 == 0 else -samples[count // 2]
        in_phase_rest = 0.0
        quadrature = 0.0
        quadrature_rest = 0.0
        turn = 0
        for j in range(1, half + 1):
            turn += k
            if turn >= count:
                turn -= count
            term = even[j] * cosine[turn]
            total = in_phase + term
            part = total - in_phase
            in_phase_rest += (in_phase - (total - part)) + (term - part)
            in_phase = total
            term = odd[j] * sine[turn]
            total = quadrature + term
            part = total - quadrature
            quadrature_rest += (quadrature - (total - part)) + (term - part)
            quadrature = total
        scale = 1.0 if k == 0 else 2.0
        found[0, k] = scale * (in_phase + in_phase_rest) / count
        found[1, k] = scale * (quadrature + quadrature_rest) / count
    return found


@kernel
def even_turns(count: int) -> FloatArray:
    """Equally spaced angles of one round, in turns."""
    turns = np.empty(count)
    for j in range(count):
        turns[j] = j / count
    return turns


@kernel
def evaluate(harmonics: FloatArray, turns: FloatArray) -> FloatArray:
    """Rows x, y, x', y', x'', y'' at angles in turns, shape (6, number of angles)."""
    count = turns.size
    found = np.zeros((6, count))
    cosine = np.ones(count)
    sine = np.zeros(count)
    step_cosine = np.empty(count)
    step_sine = np.empty(count)
    for j in range(count):
        step_cosine[j], step_sine[j] = cos_sin_turns(turns[j])
        found[0, j] = harmonics[0, 0]
        found[1, j] = harmonics[2, 0]
    for k in range(1, harmonics.shape[1]):
        xc = harmonics[0, k]
        xs = harmonics[1, k]
        yc = harmonics[2, k]
        ys = harmonics[3, k]
        for j in range(count):
            c = cosine[j] * step_cosine[j] - sine[j] * step_sine[j]
            s = cosine[j] * step_sine[j] + sine[j] * step_cosine[j]
            cosine[j] = c
            sine[j] = s
            x = xc * c + xs * s
            y = yc * c + ys * s
            found[0, j] += x
            found[1, j] += y
            found[2, j] += k * (xs * c - xc * s)
            found[3, j] += k * (ys * c - yc * s)
            found[4, j] -= k * k * x
            found[5, j] -= k * k * y
    return found


@kernel
def _curvature(harmonics: FloatArray, turns: FloatArray) -> FloatArray:
    """Curvature at angles in turns; minus infinity where the boundary stands still."""
    rows = evaluate(harmonics, turns)
    found = np.empty(turns.size)
    for j in range(turns.size):
        squared = rows[2, j] * rows[2, j] + rows[3, j] * rows[3, j]
        bend = rows[2, j] * rows[5, j] - rows[3, j] * rows[4, j]
        found[j] = bend / (squared * np.sqrt(squared)) if squared > 0.0 else -np.inf
    return found


@kernel
def _refine_extreme(harmonics: FloatArray, middle: float, width: float, sign: float) -> tuple[float, float]:
    """Largest ``sign * curvature`` nearer than a width to an angle by golden section, and where.

    The angle itself is kept if that is no worse than rounding.
    """
    inner = np.empty(2)
    one = np.empty(1)
    one[0] = middle
    central = _curvature(harmonics, one)[0]
    low = middle - width
    high = middle + width
    inner[0] = high - _GOLDEN * (high - low)
    inner[1] = low + _GOLDEN * (high - low)
    values = _curvature(harmonics, inner)
    while high - low > 1e-9:  # the value is then exact to the square of that
        if sign * values[0] > sign * values[1]:
            high = inner[1]
            inner[1] = inner[0]
            values[1] = values[0]
            inner[0] = high - _GOLDEN * (high - low)
            one[0] = inner[0]
            values[0] = _curvature(harmonics, one)[0]
        else:
            low = inner[0]
            inner[0] = inner[1]
            values[0] = values[1]
            inner[1] = low + _GOLDEN * (high - low)
            one[0] = inner[1]
            values[1] = _curvature(harmonics, one)[0]
    best = 0 if sign * values[0] > sign * values[1] else 1
    if sign * (values[best] - central) <= 1e-14 * abs(central):
        return central, middle
    return values[best], inner[best]


@kernel
def curvature_range(harmonics: FloatArray) -> tuple[float, float, float, float]:
    """Smallest curvature and where (turns), largest and where: every local extreme of a fine grid, refined.

    The numerator of the curvature has harmonics up to twice those of the boundary: the grid has at least four
    points in the shortest of its waves.
    """
    count = max(64, 8 * harmonics.shape[1])
    turns = even_turns(count)
    values = _curvature(harmonics, turns)
    least, least_at, most, most_at = np.inf, 0.0, -np.inf, 0.0
    for j in range(count):
        if values[j] == -np.inf:
            return values[j], turns[j], np.inf, turns[j]
        before = values[j - 1]
        after = values[(j + 1) % count]
        if values[j] <= before and values[j] <= after:
            value, at = _refine_extreme(harmonics, turns[j], 1.0 / count, -1.0)
            if value < least:
                least, least_at = value, at
        if values[j] >= before and values[j] >= after:
            value, at = _refine_extreme(harmonics, turns[j], 1.0 / count, 1.0)
            if value > most:
                most, most_at = value, at
    return least, least_at % 1.0, most, most_at % 1.0


@kernel
def speed_samples(harmonics: FloatArray, count: int) -> FloatArray:
    """Speed (length per radian of the parameter) at equally spaced angles."""
    rows = evaluate(harmonics, even_turns(count))
    speed = np.empty(count)
    for j in range(count):
        speed[j] = np.sqrt(rows[2, j] * rows[2, j] + rows[3, j] * rows[3, j])
    return speed


@kernel
def turning_number(harmonics: FloatArray) -> float:
    """Count the turns of the tangent in one round: 1 for a curve that bends one way and does not cross itself."""
    count = max(64, 8 * harmonics.shape[1])
    rows = evaluate(harmonics, even_turns(count))
    total = 0.0
    for j in range(count):
        dx, dy = rows[2, j], rows[3, j]
        total += angle_turns(rows[2, j - 1] * dy - rows[3, j - 1] * dx, rows[2, j - 1] * dx + rows[3, j - 1] * dy)
    return total


@kernel
def signed_area(harmonics: FloatArray) -> float:
    """Area inside, positive for a boundary that runs counter-clockwise (Green's theorem, closed form)."""
    total = 0.0
    for k in range(harmonics.shape[1] - 1, 0, -1):
        total += k * (harmonics[0, k] * harmonics[3, k] - harmonics[1, k] * harmonics[2, k])
    return 0.5 * TWO_PI * total


@kernel
def arc_from_turns(arc: FloatArray, turns: FloatArray) -> FloatArray:
    """Arc length as a fraction of the perimeter at angles in turns."""
    found = np.empty(turns.size)
    for j in range(turns.size):
        found[j] = turns[j] + _arc_beyond(arc, turns[j])[0]
    return found


@kernel
def turns_from_arc(arc: FloatArray, fractions: FloatArray) -> FloatArray:
    """Angle in turns at arc lengths, by Newton's steps kept inside a bracket that shrinks."""
    found = np.empty(fractions.size)
    for j in range(fractions.size):
        whole = np.floor(fractions[j])
        target = fractions[j] - whole
        low = 0.0
        high = 1.0
        turns = target
        for _ in range(80):
            beyond, slope = _arc_beyond(arc, turns)
            excess = (turns - target) + beyond
            if excess > 0.0:
                high = turns
            else:
                low = turns
            step = excess / slope
            moved = turns - step
            if not low <= moved <= high:
                moved = 0.5 * (low + high)
            turns, before = moved, turns
            if abs(turns - before) <= 1e-15:  # the step that follows would be far below rounding
                break
        found[j] = whole + turns
    return found


@kernel
def _arc_beyond(arc: FloatArray, turns: float) -> tuple[float, float]:
    """Arc length minus the angle, and the derivative of the arc length."""
    step_cosine, step_sine = cos_sin_turns(turns)
    cosine = 1.0
    sine = 0.0
    beyond = 0.0
    slope = 0.0
    for k in range(1, arc.shape[1]):
        cosine, sine = cosine * step_cosine - sine * step_sine, cosine * step_sine + sine * step_cosine
        beyond += arc[0, k] * sine + arc[1, k] * (1.0 - cosine)
        slope += k * (arc[0, k] * cosine + arc[1, k] * sine)
    return beyond, 1.0 + TWO_PI * slope
