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
    BEND_X,
    BEND_Y,
    COSINE,
    FAILED,
    HALF_COS,
    HALF_SIN,
    LANES,
    MOMENTUM,
    RAY_X,
    RAY_Y,
    REACH,
    SETTLED,
    SLOPE_X,
    SLOPE_Y,
    START_1,
    START_2,
    START_3,
    TANGENT_X,
    TANGENT_Y,
    TURN_IM,
    TURN_RE,
)
from scanner.bounce.series import (
    CUBE,
    ORDER,
    SQUARE,
    XC,
    XS,
    YC,
    YS,
    Gaps,
    Plan,
    Terms,
    difference_of_products,
    next_power,
    product,
    put_term,
    raise_to_gaps,
    sum_of_products,
)
from scanner.compiled import inlined, kernel, pasted
from scanner.elementary import inverse_root
from scanner.vectors import WIDTH, fused, how_many, put, take, where

Floats = npt.NDArray[np.float64]

REMAINDER = 1e-16
"""What may remain of h, relative to sin(h), after the last step.  One of fourth order of relative size r leaves c r^4;
the step before it, of size r0, left r = c r0^4, which tells c: the last one has r^5 < REMAINDER r0^4."""
LONGEST_LAST_STEP = 2e-4
"""Whatever the step before, which may be long by chance, and even if it is rounding: next to h = 0 all steps are."""
FIRST_REACH = REMAINDER * 3e-3**4
"""As if a step of 3e-3 had been before the first: the guess is kept if it is right to 6e-6."""
STEP_ABSOLUTE = 1e-14
"""Corrections below this are rounding, where they are short against sin(h) too."""
MOST_CORRECTIONS = 6
"""Blocks that need more leave the remaining orbits to bisection."""


@inlined
def project(plan: Plan, number: int, rx: float, ry: float) -> tuple[float, float]:
    """Real and imaginary part of i F_k for harmonic ``number``: the cross product of the ray with its coefficients."""
    series = plan.series
    odd = rx * series[number, YS]
    even = ry * -series[number, XC]
    if not plan.mirrored:
        odd = fused(ry, -series[number, XS], odd)
        even = fused(rx, series[number, YC], even)
    return odd, even


@inlined
def guess_by_ellipse(plan: Plan, re: float, im: float, p: float, c: float) -> tuple[float, float]:
    """Chord of the first-harmonic ellipse at the same parameter and angle: 0 < h < pi, small when glancing."""
    series = plan.series
    tx = im * -series[0, XC]
    ty = re * series[0, YS]
    if not plan.mirrored:
        tx = fused(re, series[0, XS], tx)
        ty = fused(im, -series[0, YC], ty)
    rx, ry = product(tx, ty, p, c)
    odd, even = project(plan, 0, rx, ry)
    across, along = product(odd, even, re, im)
    scale = math.copysign(inverse_root(sum_of_products(along, along, across, across)), across)
    return along * scale, across * scale


@inlined
def set_up_sums(plan: Plan, rx: float, ry: float, state: Floats, terms: Terms, first: int) -> None:
    """Turn the powers of exp(i t0) into the coefficients C_k, and begin the derivatives of the cross product."""
    start_1 = difference_of_products(rx, take(state, SLOPE_Y, first), ry, take(state, SLOPE_X, first))
    start_2 = difference_of_products(rx, take(state, BEND_Y, first), ry, take(state, BEND_X, first))
    start_3 = 0.0 * rx
    for i in range(plan.series.shape[0]):
        odd, even = project(plan, i, rx, ry)
        re, im = product(odd, even, take(terms.re, i, first), take(terms.im, i, first))
        put_term(terms, i, first, re, im)
        start_3 = fused(-plan.series[i, CUBE], re, start_3)
    put(state, START_1, first, start_1)
    put(state, START_2, first, 2.0 * start_2)
    put(state, START_3, first, start_3)


@inlined
def aim(plan: Plan, state: Floats, terms: Terms, first: int) -> None:
    """Turn the tangent by the angle of the outgoing ray, and guess where the chord ends."""
    p = take(state, MOMENTUM, first)
    c = take(state, COSINE, first)
    rx, ry = product(take(state, TANGENT_X, first), take(state, TANGENT_Y, first), p, c)
    half_cos, half_sin = guess_by_ellipse(plan, take(state, TURN_RE, first), take(state, TURN_IM, first), p, c)
    put(state, RAY_X, first, rx)
    put(state, RAY_Y, first, ry)
    put(state, HALF_COS, first, half_cos)
    put(state, HALF_SIN, first, half_sin)
    put(state, REACH, first, FIRST_REACH)
    put(state, SETTLED, first, 0.0)
    if plan.series.shape[0] > 1:
        set_up_sums(plan, rx, ry, state, terms, first)


@inlined
def add_harmonics(
    plan: Plan, count: int, vr: float, vi: float, terms: Terms, gaps: Gaps, first: int
) -> tuple[float, float, float, float]:
    """Sum the first ``count`` harmonics of the cross product and its derivatives at v, less these at the near end."""
    raise_to_gaps(plan, vr, vi, gaps, first)
    even, odd = product(take(terms.re, 0, first), take(terms.im, 0, first), vr, vi)
    even *= vi
    odd *= vi
    part_0 = even
    part_1 = odd
    part_2 = even
    part_3 = odd
    for i in range(1, count):
        order = plan.series[i, ORDER]
        square = plan.series[i, SQUARE]
        vr, vi = next_power(plan, gaps, i, first, vr, vi)
        even, odd = product(take(terms.re, i, first), take(terms.im, i, first), vr, vi)
        even *= vi
        odd *= vi
        part_0 += even
        part_1 = fused(order, odd, part_1)
        part_2 = fused(square, even, part_2)
        part_3 = fused(order * square, odd, part_3)
    return part_0, part_1, part_2, part_3


@inlined
def correct(plan: Plan, count: int, state: Floats, terms: Terms, gaps: Gaps, first: int) -> None:
    """One Householder step of fourth order on g, by the first ``count`` harmonics.

    The unknown is x, twice the tangent of half the step, over s = sin(h): nearly the step over s, and what turns v by
    the step follows from it without a series.  The derivatives of g by x enter times s: they are s^(m + 1) g^(m), the
    third of them less s^4 g' / 2.
    """
    c = take(state, HALF_COS, first)
    s = take(state, HALF_SIN, first)
    g0, part_1, part_2, part_3 = add_harmonics(plan, count, c, s, terms, gaps, first)
    square = s * s
    slope = fused(-2.0, part_1, take(state, START_1, first))
    bend = fused(-4.0, part_2, take(state, START_2, first))
    twist = fused(8.0, part_3, take(state, START_3, first))
    g1 = difference_of_products(s, slope, c, g0)
    g2 = fused(square, bend + g0, -2.0 * c * g1)
    g3 = fused(square, fused(s, twist, fused(c, g0, 2.5 * g1)), -3.0 * c * g2)
    slope_square = g1 * g1
    product_02 = g0 * g2
    top = g0 * fused(3.0, product_02, -6.0 * slope_square)
    bottom = fused(6.0 * g1, slope_square - product_02, g0 * g0 * g3)
    # A settled lane takes no further step, so that an orbit does not depend on its neighbours by a rounding.
    top = where(take(state, SETTLED, first) > 0.0, 0.0, top)
    half = 0.5 * s * top
    scale = 1.0 / fused(half, half, bottom * bottom)
    sine = top * bottom * scale  # of the step, over s
    size = abs(sine)
    fourth = sine * sine
    fourth *= fourth
    small = (fourth * size < take(state, REACH, first)) | (size * s < STEP_ABSOLUTE)
    small = small & (size < LONGEST_LAST_STEP) & (s > 0.0)
    put(state, REACH, first, REMAINDER * fourth)
    put(state, SETTLED, first, where(small, 1.0, 0.0))
    c, s = product(c, s, fused(-2.0 * half, half * scale, 1.0), s * sine)
    put(state, HALF_COS, first, c)
    put(state, HALF_SIN, first, s)


@inlined
def take_as_guess(state: Floats, first: int) -> None:
    """Let no lane be settled by a step that left harmonics out, nor the next one be judged by how short that was."""
    reach = take(state, REACH, first)
    put(state, REACH, first, where(reach < FIRST_REACH, FIRST_REACH, reach))
    put(state, SETTLED, first, 0.0)


@pasted
def find_half_advance(plan: Plan, state: Floats, terms: Terms, gaps: Gaps, lanes: int) -> None:
    """Solve for v = exp(i h) in every lane: guess, correct, and bisect where that has not settled."""
    for first in range(0, lanes, WIDTH):
        aim(plan, state, terms, first)
    every = plan.series.shape[0]
    moving = lanes if every > 1 else 0
    corrections = -1 if plan.strong < every else 0
    while moving > 0 and corrections <= MOST_CORRECTIONS:
        moving = 0
        for first in range(0, lanes, WIDTH):
            moving_here = WIDTH - how_many(take(state, SETTLED, first) > 0.0)
            moving += moving_here
            if corrections < 0:
                correct(plan, plan.strong, state, terms, gaps, first)
                take_as_guess(state, first)
            elif moving_here > 0 and corrections < MOST_CORRECTIONS:
                correct(plan, every, state, terms, gaps, first)
        corrections += 1
    if moving > 0:
        bisect_lost_lanes(plan, state, lanes)


@kernel
def divide_out_start(plan: Plan, state: Floats, quotient: Floats, lanes: int) -> None:
    """Divide the cross product by its trivial root: g(h) = Re sum_j B_j v^(2 j - 1), B_j the sum of C_k over k >= j.

    Fills rows 2 j and 2 j + 1 of ``quotient``, of shape (2 K + 4, LANES), with B_j.
    """
    highest = quotient.shape[0] // 2 - 2
    powers = np.empty((2 * highest + 2, lanes))
    for j in range(lanes):
        powers[2, j] = state[TURN_RE, j]
        powers[3, j] = state[TURN_IM, j]
    for k in range(2, highest + 1):
        for j in range(lanes):
            powers[2 * k, j], powers[2 * k + 1, j] = product(
                powers[2 * k - 2, j], powers[2 * k - 1, j], powers[2, j], powers[3, j]
            )
    quotient[:] = 0.0
    for i in range(plan.series.shape[0]):
        k = int(plan.series[i, ORDER])
        xc, xs, yc, ys = plan.series[i, XC], plan.series[i, XS], plan.series[i, YC], plan.series[i, YS]
        for j in range(lanes):
            even = state[RAY_X, j] * yc - state[RAY_Y, j] * xc
            odd = state[RAY_X, j] * ys - state[RAY_Y, j] * xs
            re = powers[2 * k, j]
            im = powers[2 * k + 1, j]
            quotient[2 * k, j] = odd * re - even * im
            quotient[2 * k + 1, j] = even * re + odd * im
    for k in range(highest, 0, -1):
        for j in range(lanes):
            quotient[2 * k, j] += quotient[2 * k + 2, j]
            quotient[2 * k + 1, j] += quotient[2 * k + 3, j]


@kernel
def bisect_lost_lanes(plan: Plan, state: Floats, lanes: int) -> None:
    """Hand to bisection every lane that has not settled."""
    highest = int(plan.series[-1, ORDER])
    quotient = np.empty((2 * highest + 4, LANES))
    divide_out_start(plan, state, quotient, lanes)
    for j in range(lanes):
        if state[SETTLED, j] > 0.0:
            continue
        found, half_cos, half_sin = bracket_half_advance(highest, quotient, j, state[HALF_COS, j], state[HALF_SIN, j])
        state[HALF_COS, j] = half_cos
        state[HALF_SIN, j] = half_sin
        if not found:
            state[FAILED, j] = 1.0
