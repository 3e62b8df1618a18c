"""Where the next chord ends, for a block of orbits at once.

Write t0 and t1 for the boundary parameters of the two ends, h = (t1 - t0) / 2 for half the advance and
v = exp(i h).  With n the unit normal of the ray, half the cross product of the ray and the chord is

    n . (w(t1) - w(t0)) / 2 = G(h) = sum_k sin(k h) Re(C_k v^k),

where C_k is i F_k exp(i k t0) and F_k the k-th Fourier coefficient of n . w: a sum over the harmonics that there are.
Each sine is had from the power v^k and is as exact, relative to itself, as h: dividing by sin(h), which takes the
trivial root h = 0 out, leaves g(h) = G(h) / sin(h) with its full accuracy for glancing chords.  On a convex table g
has one zero in 0 < h < pi: the chord's direction turns from the tangent to its opposite.

The derivatives of G are what they are at h = 0, known from the boundary at t0, and sums of the same products:

    G'   = n . w'(t0)     - 2 sum_k k   sin(k h) Im(C_k v^k)
    G''  = 2 n . w''(t0)  - 4 sum_k k^2 sin(k h) Re(C_k v^k)
    G''' = 4 n . w'''(t0) + 8 sum_k k^3 sin(k h) Im(C_k v^k)

For an ellipse the sum has one term and the zero is v ~ i conj(C_1): the first guess for every other table.  It is
corrected by steps of fourth order on g.
"""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from scanner.bounce.bracket import bracket_half_advance
from scanner.bounce.lanes import (
    COSINE,
    FAILED,
    HALF_COS,
    HALF_SIN,
    LANES,
    LAST_STEP,
    MOMENTUM,
    PART_0,
    PART_1,
    PART_2,
    PART_3,
    POWER_IM,
    POWER_RE,
    RAY_X,
    RAY_Y,
    SETTLED,
    START_1,
    START_2,
    START_3,
    SUM_2,
    SUM_3,
    SUM_4,
    SUM_5,
    TANGENT_X,
    TANGENT_Y,
    TURN_IM,
    TURN_RE,
)
from scanner.bounce.series import (
    Gaps,
    Plan,
    Terms,
    difference_of_products,
    product,
    raise_to_gaps,
    sum_of_products,
)
from scanner.compiled import fused, kernel, pasted

Floats = npt.NDArray[np.float64]

REMAINDER = 1e-16
"""What may remain of h, relative to sin(h), after the last step.  One of fourth order of relative size r leaves c r^4;
the step before it, of size r0, left r = c r0^4, which tells c."""
LONGEST_LAST_STEP = 2e-4
"""Whatever the step before, which may be long by chance, and even if it is rounding: next to h = 0 all steps are."""
FIRST_REACH = 3e-3
"""Size of step that stands for the one before the first: the guess is kept if it is right to 6e-6."""
STEP_ABSOLUTE = 1e-14
"""Corrections below this are rounding, where they are short against sin(h) too."""
MOST_CORRECTIONS = 6
"""Blocks that need more leave the remaining orbits to bisection."""


@pasted
def aim(state: Floats, lanes: int) -> None:
    """Turn the tangent by the angle of the outgoing ray."""
    for j in range(lanes):
        p = state[MOMENTUM, j]
        c = state[COSINE, j]
        tx = state[TANGENT_X, j]
        ty = state[TANGENT_Y, j]
        state[RAY_X, j], state[RAY_Y, j] = product(tx, ty, p, c)


@pasted
def project(harmonics: Floats, plan: Plan, state: Floats, terms: Terms, lanes: int) -> None:
    """Turn the powers of exp(i t0) into the coefficients C_k, and begin the derivatives of the cross product."""
    orders = plan.orders
    term_re, term_im = terms
    for j in range(lanes):
        rx = state[RAY_X, j]
        ry = state[RAY_Y, j]
        state[START_1, j] = difference_of_products(rx, state[SUM_3, j], ry, state[SUM_2, j])
        state[START_2, j] = 2.0 * difference_of_products(rx, state[SUM_5, j], ry, state[SUM_4, j])
        state[START_3, j] = 0.0
    for i in range(orders.shape[0]):
        k = orders[i]
        xc = harmonics[0, k]
        xs = harmonics[1, k]
        yc = harmonics[2, k]
        ys = harmonics[3, k]
        order = float(k)
        cube = 4.0 * order * order * order
        for j in range(lanes):
            rx = state[RAY_X, j]
            ry = state[RAY_Y, j]
            even = difference_of_products(rx, yc, ry, xc)
            odd = difference_of_products(rx, ys, ry, xs)
            re, im = product(odd, even, term_re[i, j], term_im[i, j])
            term_re[i, j] = re
            term_im[i, j] = im
            state[START_3, j] = fused(-cube, re, state[START_3, j])


@pasted
def guess_by_ellipse(harmonics: Floats, state: Floats, lanes: int) -> None:
    """Chord of the first-harmonic ellipse at the same parameter and angle: 0 < h < pi, small when glancing."""
    xc = harmonics[0, 1]
    xs = harmonics[1, 1]
    yc = harmonics[2, 1]
    ys = harmonics[3, 1]
    for j in range(lanes):
        re = state[TURN_RE, j]
        im = state[TURN_IM, j]
        tx = difference_of_products(xs, re, xc, im)
        ty = difference_of_products(ys, re, yc, im)
        rx, ry = product(tx, ty, state[MOMENTUM, j], state[COSINE, j])
        even = difference_of_products(rx, yc, ry, xc)
        odd = difference_of_products(rx, ys, ry, xs)
        across, along = product(odd, even, re, im)
        scale = math.copysign(1.0 / math.sqrt(sum_of_products(along, along, across, across)), across)
        state[HALF_COS, j] = along * scale
        state[HALF_SIN, j] = across * scale
        state[SETTLED, j] = 0.0
        state[LAST_STEP, j] = FIRST_REACH


@pasted
def add_harmonics(plan: Plan, count: int, state: Floats, terms: Terms, gaps: Gaps, lanes: int) -> None:
    """Sum the first ``count`` harmonics of the cross product and its derivatives at v, less these at the near end."""
    orders = plan.orders
    gap_of = plan.gap_of
    term_re, term_im = terms
    gap_re, gap_im = gaps
    for j in range(lanes):
        vr = state[HALF_COS, j]
        vi = state[HALF_SIN, j]
        gap_re[0, j] = vr
        gap_im[0, j] = vi
        state[POWER_RE, j] = vr
        state[POWER_IM, j] = vi
        re, im = product(term_re[0, j], term_im[0, j], vr, vi)
        even = vi * re
        odd = vi * im
        state[PART_0, j] = even
        state[PART_1, j] = odd
        state[PART_2, j] = even
        state[PART_3, j] = odd
    raise_to_gaps(plan, gaps, lanes)
    for i in range(1, count):
        gap = gap_of[i]
        order = float(orders[i])
        square = order * order
        for j in range(lanes):
            re, im = product(state[POWER_RE, j], state[POWER_IM, j], gap_re[gap, j], gap_im[gap, j])
            state[POWER_RE, j] = re
            state[POWER_IM, j] = im
            even, odd = product(term_re[i, j], term_im[i, j], re, im)
            even *= im
            odd *= order * im
            state[PART_0, j] += even
            state[PART_1, j] += odd
            state[PART_2, j] = fused(square, even, state[PART_2, j])
            state[PART_3, j] = fused(square, odd, state[PART_3, j])


@pasted
def correct_once(state: Floats, lanes: int) -> int:
    """One Householder step of fourth order on g; returns how many orbits are not found yet.

    With x for the step over s = sin(h), the derivatives of g enter as those by x, times s: s^(m + 1) g^(m).
    """
    moving = 0
    for j in range(lanes):
        c = state[HALF_COS, j]
        s = state[HALF_SIN, j]
        square = s * s
        g0 = state[PART_0, j]
        slope = fused(-2.0, state[PART_1, j], state[START_1, j])
        bend = fused(-4.0, state[PART_2, j], state[START_2, j])
        twist = fused(8.0, state[PART_3, j], state[START_3, j])
        g1 = difference_of_products(s, slope, c, g0)
        g2 = fused(square, bend + g0, -2.0 * c * g1)
        g3 = fused(square, fused(s, twist, fused(c, g0, 3.0 * g1)), -3.0 * c * g2)
        slope_square = g1 * g1
        product_02 = g0 * g2
        step = g0 * fused(3.0, product_02, -6.0 * slope_square)
        step /= fused(6.0 * g1, slope_square - product_02, g0 * g0 * g3)
        # A settled lane takes no further step, so that an orbit does not depend on its neighbours by a rounding.
        settled = state[SETTLED, j] > 0.0
        step = 0.0 if settled else step
        size = abs(step)
        last = state[LAST_STEP, j] * state[LAST_STEP, j]
        now = step * step
        small = (now * now * size < REMAINDER * last * last) | (size * s < STEP_ABSOLUTE)
        small = small & (size < LONGEST_LAST_STEP) & (s > 0.0)
        state[LAST_STEP, j] = size
        state[SETTLED, j] = 1.0 if small else 0.0
        moving += 0 if small else 1
        # exp(i step) with unit modulus whatever the step: the tangent of half of it to fifth order.
        half = 0.5 * step * s
        tangent = half * fused(half * half, 1.0 / 3.0, 1.0)
        scale = 1.0 / fused(tangent, tangent, 1.0)
        cr = fused(-tangent, tangent, 1.0) * scale
        ci = 2.0 * tangent * scale
        state[HALF_COS, j], state[HALF_SIN, j] = product(c, s, cr, ci)
    return moving


@pasted
def take_as_guess(state: Floats, lanes: int) -> None:
    """Let no lane be settled by a step that left harmonics out, nor the next one be judged by how short that was."""
    for j in range(lanes):
        state[SETTLED, j] = 0.0
        state[LAST_STEP, j] = max(state[LAST_STEP, j], FIRST_REACH)


@pasted
def find_half_advance(harmonics: Floats, plan: Plan, state: Floats, terms: Terms, gaps: Gaps, lanes: int) -> None:
    """Solve for v = exp(i h) in every lane: guess, correct, and bisect where that has not settled."""
    guess_by_ellipse(harmonics, state, lanes)
    if plan.orders.shape[0] > 1:
        project(harmonics, plan, state, terms, lanes)
        if plan.strong < plan.orders.shape[0]:
            add_harmonics(plan, plan.strong, state, terms, gaps, lanes)
            correct_once(state, lanes)
            take_as_guess(state, lanes)
        moving = lanes
        corrections = 0
        while moving > 0 and corrections < MOST_CORRECTIONS:
            add_harmonics(plan, plan.orders.shape[0], state, terms, gaps, lanes)
            moving = correct_once(state, lanes)
            corrections += 1
        if moving > 0:
            bisect_lost_lanes(harmonics, state, lanes)


@kernel
def divide_out_start(harmonics: Floats, state: Floats, quotient: Floats, lanes: int) -> None:
    """Divide the cross product by its trivial root: g(h) = Re sum_j B_j v^(2 j - 1), B_j the sum of C_k over k >= j.

    Fills rows 2 j and 2 j + 1 of ``quotient``, of shape (2 K + 4, LANES), with B_j.
    """
    highest = harmonics.shape[1] - 1
    powers = np.empty((2 * highest + 2, lanes))
    for j in range(lanes):
        powers[2, j] = state[TURN_RE, j]
        powers[3, j] = state[TURN_IM, j]
    for k in range(2, highest + 1):
        for j in range(lanes):
            powers[2 * k, j], powers[2 * k + 1, j] = product(
                powers[2 * k - 2, j], powers[2 * k - 1, j], powers[2, j], powers[3, j]
            )
    for j in range(lanes):
        quotient[2 * highest + 2, j] = 0.0
        quotient[2 * highest + 3, j] = 0.0
    for k in range(highest, 0, -1):
        for j in range(lanes):
            even = state[RAY_X, j] * harmonics[2, k] - state[RAY_Y, j] * harmonics[0, k]
            odd = state[RAY_X, j] * harmonics[3, k] - state[RAY_Y, j] * harmonics[1, k]
            re = powers[2 * k, j]
            im = powers[2 * k + 1, j]
            quotient[2 * k, j] = quotient[2 * k + 2, j] + (odd * re - even * im)
            quotient[2 * k + 1, j] = quotient[2 * k + 3, j] + (even * re + odd * im)


@kernel
def bisect_lost_lanes(harmonics: Floats, state: Floats, lanes: int) -> None:
    """Hand to bisection every lane that has not settled."""
    highest = harmonics.shape[1] - 1
    quotient = np.empty((2 * highest + 4, LANES))
    divide_out_start(harmonics, state, quotient, lanes)
    for j in range(lanes):
        if state[SETTLED, j] > 0.0:
            continue
        found, half_cos, half_sin = bracket_half_advance(highest, quotient, j, state[HALF_COS, j], state[HALF_SIN, j])
        state[HALF_COS, j] = half_cos
        state[HALF_SIN, j] = half_sin
        if not found:
            state[FAILED, j] = 1.0
