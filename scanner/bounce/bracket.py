"""The chord of one orbit by bisection with Newton steps inside the bracket: slow, and cannot fail on a convex table."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from scanner.compiled import kernel
from scanner.elementary import cos_sin_turns

Floats = npt.NDArray[np.float64]

TWO_PI = 2.0 * math.pi
MOST_STEPS = 200
"""Bisection alone needs 54; every second step is one."""
RESOLUTION = 1e-16
"""A bracket this wide, in turns, cannot be halved in double precision except next to zero."""
SETTLED = 1e-9
"""Newton is of second order: after a step this small what remains is rounding."""


@kernel
def quotient_value(highest: int, quotient: Floats, lane: int, vr: float, vi: float) -> tuple[float, float]:
    """Value and derivative by h of g(h) = Re sum_j B_j v^(2 j - 1) at v = vr + i vi."""
    fr = vr * vr - vi * vi
    fi = 2.0 * vr * vi
    value = 0.0
    slope = 0.0
    pr = vr
    pi = vi
    for k in range(1, highest + 1):
        value += quotient[2 * k, lane] * pr - quotient[2 * k + 1, lane] * pi
        slope -= (2 * k - 1) * (quotient[2 * k, lane] * pi + quotient[2 * k + 1, lane] * pr)
        pr, pi = pr * fr - pi * fi, pr * fi + pi * fr
    return value, slope


@kernel
def turned(vr: float, vi: float, step: float) -> tuple[float, float]:
    """Unit complex number turned by a small angle in radians."""
    cr, ci = cos_sin_turns(step / TWO_PI)
    return vr * cr - vi * ci, vr * ci + vi * cr


@kernel
def bracket_half_advance(highest: int, quotient: Floats, lane: int, vr: float, vi: float) -> tuple[bool, float, float]:
    """Zero of g in 0 < h < pi for one lane: (found, cos h, sin h); an estimate that has settled is kept."""
    value, slope = quotient_value(highest, quotient, lane, vr, vi)
    step = -value / slope
    if vi > 0.0 and abs(step) < SETTLED * vi:
        vr, vi = turned(vr, vi, step)
        return True, vr, vi
    start, _ = quotient_value(highest, quotient, lane, 1.0, 0.0)
    end, _ = quotient_value(highest, quotient, lane, -1.0, 0.0)
    if not (start < 0.0 and end > 0.0):
        return False, vr, vi
    low = 0.0
    high = 0.5
    half = 0.25
    for count in range(MOST_STEPS):
        vr, vi = cos_sin_turns(half)
        value, slope = quotient_value(highest, quotient, lane, vr, vi)
        if value < 0.0:
            low = half
        else:
            high = half
        step = -value / slope
        if abs(step) < SETTLED * vi and low <= half + step / TWO_PI <= high:
            vr, vi = turned(vr, vi, step)
            return True, vr, vi
        newton = half + step / TWO_PI
        half = newton if count % 2 == 0 and low < newton < high else 0.5 * (low + high)
        if high - low < RESOLUTION * high:
            return True, vr, vi
    return False, vr, vi
