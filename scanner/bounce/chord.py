"""Where the next chord ends, for a block of orbits at once.

Write t0 and t1 for the boundary parameters of the two ends, h = (t1 - t0) / 2 for half the advance and
v = exp(i h).  With n the unit normal of the ray, the cross product of the ray and the chord is

    n . (w(t1) - w(t0)) = 2 sin(h) g(h),        g(h) = Re sum_j B_j v^(2 j - 1),

where B_j is the sum over k >= j of i F_k exp(i k t0) and F_k the k-th Fourier coefficient of n . w.  The trivial
root h = 0 is divided out exactly, term by term, so that g keeps its full accuracy for glancing chords.  On a convex
table g has one zero in 0 < h < pi: the chord's direction turns from the tangent to its opposite.

For an ellipse the sum has one term and the zero is v ~ i conj(B_1): the first guess for every other table.
"""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from scanner.bounce.bracket import bracket_half_advance
from scanner.bounce.lanes import (
    COSINE,
    FACTOR_IM,
    FACTOR_RE,
    FAILED,
    HALF_COS,
    HALF_SIN,
    LANES,
    MOMENTUM,
    POWER_IM,
    POWER_RE,
    RAY_X,
    RAY_Y,
    SETTLED,
    SUM_0,
    SUM_1,
    SUM_2,
    SUM_3,
    TANGENT_X,
    TANGENT_Y,
)
from scanner.compiled import inlined

Floats = npt.NDArray[np.float64]

STEP_RELATIVE = 5e-6
"""A correction this small against sin(h) is the last one: the method is of fourth order, what remains is its
fourth power, below 1e-21 times a constant that the harmonics in use keep below 1e5."""
STEP_ABSOLUTE = 1e-14
"""Corrections below this are rounding."""
MOST_CORRECTIONS = 6
"""Blocks that need more leave the remaining orbits to bisection."""


@inlined
def aim(state: Floats) -> None:
    """Turn the tangent by the angle of the outgoing ray."""
    for j in range(LANES):
        p = state[MOMENTUM, j]
        c = state[COSINE, j]
        tx = state[TANGENT_X, j]
        ty = state[TANGENT_Y, j]
        state[RAY_X, j] = tx * p - ty * c
        state[RAY_Y, j] = tx * c + ty * p


@inlined
def divide_out_start(harmonics: Floats, state: Floats, powers: Floats, quotient: Floats) -> None:
    """Fill ``quotient`` with the coefficients B_j (rows 2 j and 2 j + 1) of the cross product over its trivial root."""
    highest = harmonics.shape[1] - 1
    for j in range(LANES):
        quotient[2 * highest + 2, j] = 0.0
        quotient[2 * highest + 3, j] = 0.0
    for k in range(highest, 0, -1):
        xc = harmonics[0, k]
        xs = harmonics[1, k]
        yc = harmonics[2, k]
        ys = harmonics[3, k]
        for j in range(LANES):
            even = state[RAY_X, j] * yc - state[RAY_Y, j] * xc
            odd = state[RAY_X, j] * ys - state[RAY_Y, j] * xs
            re = powers[2 * k, j]
            im = powers[2 * k + 1, j]
            quotient[2 * k, j] = quotient[2 * k + 2, j] + (odd * re - even * im)
            quotient[2 * k + 1, j] = quotient[2 * k + 3, j] + (even * re + odd * im)


@inlined
def guess_by_ellipse(harmonics: Floats, state: Floats, powers: Floats) -> None:
    """Chord of the first-harmonic ellipse at the same parameter and angle: 0 < h < pi, small when glancing."""
    xc = harmonics[0, 1]
    xs = harmonics[1, 1]
    yc = harmonics[2, 1]
    ys = harmonics[3, 1]
    for j in range(LANES):
        re = powers[2, j]
        im = powers[3, j]
        tx = xs * re - xc * im
        ty = ys * re - yc * im
        p = state[MOMENTUM, j]
        c = state[COSINE, j]
        rx = tx * p - ty * c
        ry = tx * c + ty * p
        even = rx * yc - ry * xc
        odd = rx * ys - ry * xs
        along = even * re + odd * im
        across = odd * re - even * im
        scale = math.copysign(1.0 / math.sqrt(along * along + across * across), across)
        state[HALF_COS, j] = along * scale
        state[HALF_SIN, j] = across * scale
        state[SETTLED, j] = 0.0


@inlined
def correct_once(harmonics: Floats, state: Floats, quotient: Floats) -> int:
    """One Householder step of fourth order on g; returns how many orbits moved by more than the last step may."""
    highest = harmonics.shape[1] - 1
    for j in range(LANES):
        vr = state[HALF_COS, j]
        vi = state[HALF_SIN, j]
        re = quotient[2, j] * vr - quotient[3, j] * vi
        im = quotient[2, j] * vi + quotient[3, j] * vr
        state[SUM_0, j] = re
        state[SUM_1, j] = -im
        state[SUM_2, j] = -re
        state[SUM_3, j] = im
        state[FACTOR_RE, j] = vr * vr - vi * vi
        state[FACTOR_IM, j] = 2.0 * vr * vi
        state[POWER_RE, j] = vr
        state[POWER_IM, j] = vi
    for k in range(2, highest + 1):
        order = 2.0 * k - 1.0
        square = order * order
        cube = square * order
        for j in range(LANES):
            fr = state[FACTOR_RE, j]
            fi = state[FACTOR_IM, j]
            vr = state[POWER_RE, j] * fr - state[POWER_IM, j] * fi
            vi = state[POWER_RE, j] * fi + state[POWER_IM, j] * fr
            state[POWER_RE, j] = vr
            state[POWER_IM, j] = vi
            re = quotient[2 * k, j] * vr - quotient[2 * k + 1, j] * vi
            im = quotient[2 * k, j] * vi + quotient[2 * k + 1, j] * vr
            state[SUM_0, j] += re
            state[SUM_1, j] -= order * im
            state[SUM_2, j] -= square * re
            state[SUM_3, j] += cube * im
    moving = 0
    for j in range(LANES):
        g = state[SUM_0, j]
        g1 = state[SUM_1, j]
        g2 = state[SUM_2, j]
        settled = state[SETTLED, j] > 0.0
        step = -g * (6.0 * g1 * g1 - 3.0 * g * g2) / (6.0 * g1 * (g1 * g1 - g * g2) + g * g * state[SUM_3, j])
        # A settled lane takes no further step, so that an orbit does not depend on its neighbours by a rounding.
        step = 0.0 if settled else step
        small = abs(step) < STEP_RELATIVE * state[HALF_SIN, j] + STEP_ABSOLUTE
        state[SETTLED, j] = 1.0 if small else 0.0
        moving += 0 if small else 1
        # exp(i step) with unit modulus whatever the step: the tangent of half of it to fifth order.
        half = 0.5 * step
        tangent = half * (1.0 + half * half * (1.0 / 3.0))
        scale = 1.0 / (1.0 + tangent * tangent)
        cr = (1.0 - tangent * tangent) * scale
        ci = 2.0 * tangent * scale
        vr = state[HALF_COS, j]
        vi = state[HALF_SIN, j]
        state[HALF_COS, j] = vr * cr - vi * ci
        state[HALF_SIN, j] = vr * ci + vi * cr
    return moving


@inlined
def find_half_advance(harmonics: Floats, state: Floats, powers: Floats, quotient: Floats) -> None:
    """Solve for v = exp(i h) in every lane: guess, correct, and bisect where that has not settled."""
    guess_by_ellipse(harmonics, state, powers)
    highest = harmonics.shape[1] - 1
    if highest > 1:
        divide_out_start(harmonics, state, powers, quotient)
        moving = LANES
        corrections = 0
        while moving > 0 and corrections < MOST_CORRECTIONS:
            moving = correct_once(harmonics, state, quotient)
            corrections += 1
        if moving > 0:
            bisect_lost_lanes(highest, state, quotient)


@inlined
def bisect_lost_lanes(highest: int, state: Floats, quotient: Floats) -> None:
    """Hand to bisection every lane that has not settled."""
    for j in range(LANES):
        if state[SETTLED, j] > 0.0:
            continue
        found, half_cos, half_sin = bracket_half_advance(highest, quotient, j, state[HALF_COS, j], state[HALF_SIN, j])
        state[HALF_COS, j] = half_cos
        state[HALF_SIN, j] = half_sin
        if not found:
            state[FAILED, j] = 1.0
