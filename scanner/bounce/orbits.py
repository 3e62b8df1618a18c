"""From one bounce to the next, for a block of orbits: chord, reflection and the tangent map in (s, p).

The tangent map of one bounce, with curvatures k0 and k1, cosines c0 and c1 and chord length l, is

    [ (k0 l - c0) / c1                -l / (c0 c1)      ]
    [ k0 c1 + k1 c0 - k0 k1 l         (k1 l - c1) / c0  ]

with determinant 1 (Berry, Eur. J. Phys. 2:91, 1981).
"""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from scanner.bounce.chord import aim, find_half_advance
from scanner.bounce.lanes import (
    ADVANCE,
    BUFFER,
    BUFFER_ROWS,
    CHORD,
    COSINE,
    CURVATURE,
    D_PP,
    D_PS,
    D_SP,
    D_SS,
    FAILED,
    HALF_COS,
    HALF_SIN,
    LANES,
    MOMENTUM,
    P_AFTER,
    POINT_X,
    POINT_Y,
    POWER_IM,
    POWER_RE,
    RAY_X,
    RAY_Y,
    STATE_ROWS,
    SUM_0,
    SUM_1,
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
    make_plan,
    make_room,
    product,
    raise_to_gaps,
    sum_of_products,
)
from scanner.compiled import fused, inlined, kernel, pasted, stack_array, use_widest_vectors
from scanner.elementary import angle_turns, cos_sin_turns

Floats = npt.NDArray[np.float64]


@pasted
def begin_powers(state: Floats, terms: Terms, gaps: Gaps, lanes: int) -> None:
    """Begin the powers of exp(i t) with the first one."""
    term_re, term_im = terms
    gap_re, gap_im = gaps
    for j in range(lanes):
        re = state[TURN_RE, j]
        im = state[TURN_IM, j]
        gap_re[0, j] = term_re[0, j] = state[POWER_RE, j] = re
        gap_im[0, j] = term_im[0, j] = state[POWER_IM, j] = im


@pasted
def fill_powers(plan: Plan, state: Floats, terms: Terms, gaps: Gaps, lanes: int) -> None:
    """Fill in the powers of exp(i t) of every harmonic."""
    gap_of = plan.gap_of
    term_re, term_im = terms
    gap_re, gap_im = gaps
    begin_powers(state, terms, gaps, lanes)
    raise_to_gaps(plan, gaps, lanes)
    for i in range(1, gap_of.shape[0]):
        gap = gap_of[i]
        for j in range(lanes):
            re, im = product(state[POWER_RE, j], state[POWER_IM, j], gap_re[gap, j], gap_im[gap, j])
            state[POWER_RE, j] = term_re[i, j] = re
            state[POWER_IM, j] = term_im[i, j] = im


@pasted
def evaluate_boundary(harmonics: Floats, plan: Plan, state: Floats, terms: Terms, gaps: Gaps, lanes: int) -> None:
    """Sum point, tangent and second derivative at exp(i t) of every lane, and keep the powers of exp(i t)."""
    orders = plan.orders
    gap_of = plan.gap_of
    term_re, term_im = terms
    gap_re, gap_im = gaps
    xc = harmonics[0, 1]
    xs = harmonics[1, 1]
    yc = harmonics[2, 1]
    ys = harmonics[3, 1]
    for j in range(lanes):
        re = state[TURN_RE, j]
        im = state[TURN_IM, j]
        x = sum_of_products(xc, re, xs, im)
        y = sum_of_products(yc, re, ys, im)
        state[SUM_0, j] = harmonics[0, 0] + x
        state[SUM_1, j] = harmonics[2, 0] + y
        state[SUM_2, j] = difference_of_products(xs, re, xc, im)
        state[SUM_3, j] = difference_of_products(ys, re, yc, im)
        state[SUM_4, j] = -x
        state[SUM_5, j] = -y
    raise_to_gaps(plan, gaps, lanes)
    for i in range(1, orders.shape[0]):
        k = orders[i]
        gap = gap_of[i]
        xc = harmonics[0, k]
        xs = harmonics[1, k]
        yc = harmonics[2, k]
        ys = harmonics[3, k]
        order = float(k)
        square = order * order
        for j in range(lanes):
            re, im = product(state[POWER_RE, j], state[POWER_IM, j], gap_re[gap, j], gap_im[gap, j])
            state[POWER_RE, j] = re
            state[POWER_IM, j] = im
            x = sum_of_products(xc, re, xs, im)
            y = sum_of_products(yc, re, ys, im)
            term_re[i, j] = re
            term_im[i, j] = im
            state[SUM_0, j] += x
            state[SUM_1, j] += y
            state[SUM_2, j] = fused(order, difference_of_products(xs, re, xc, im), state[SUM_2, j])
            state[SUM_3, j] = fused(order, difference_of_products(ys, re, yc, im), state[SUM_3, j])
            state[SUM_4, j] = fused(-square, x, state[SUM_4, j])
            state[SUM_5, j] = fused(-square, y, state[SUM_5, j])


@kernel
def start_block(harmonics: Floats, turns: Floats, momenta: Floats, state: Floats) -> None:
    """Set up a block at boundary parameters ``turns`` and momenta ``momenta``, both of shape (LANES,)."""
    plan = make_plan(harmonics)
    terms, gaps = make_room(plan)
    for j in range(LANES):
        state[TURN_RE, j], state[TURN_IM, j] = cos_sin_turns(turns[j])
    begin_powers(state, terms, gaps, LANES)
    evaluate_boundary(harmonics, plan, state, terms, gaps, LANES)
    for j in range(LANES):
        x1 = state[SUM_2, j]
        y1 = state[SUM_3, j]
        over_speed = 1.0 / math.sqrt(x1 * x1 + y1 * y1)
        state[MOMENTUM, j] = momenta[j]
        state[COSINE, j] = math.sqrt((1.0 - momenta[j]) * (1.0 + momenta[j]))
        state[TANGENT_X, j] = x1 * over_speed
        state[TANGENT_Y, j] = y1 * over_speed
        state[CURVATURE, j] = (x1 * state[SUM_5, j] - y1 * state[SUM_4, j]) * over_speed * over_speed * over_speed
        state[POINT_X, j] = state[SUM_0, j]
        state[POINT_Y, j] = state[SUM_1, j]
        state[FAILED, j] = 0.0


@inlined
def to_unit(x: float, y: float) -> tuple[float, float]:
    """Bring a vector that is of unit length but for rounding to unit length."""
    scale = fused(-0.5, sum_of_products(x, x, y, y), 1.5)
    return x * scale, y * scale


@pasted
def move_to_end(state: Floats, terms: Terms, gaps: Gaps, buffer: Floats, row: int, lanes: int) -> None:
    """Turn exp(i t) by the full advance, begin its powers there, and note the advance in turns."""
    term_re, term_im = terms
    gap_re, gap_im = gaps
    for j in range(lanes):
        vr, vi = to_unit(state[HALF_COS, j], state[HALF_SIN, j])
        buffer[ADVANCE, row, j] = 2.0 * angle_turns(vi, vr)
        ur = difference_of_products(vr, vr, vi, vi)
        ui = 2.0 * vr * vi
        re, im = product(state[TURN_RE, j], state[TURN_IM, j], ur, ui)
        re, im = to_unit(re, im)
        state[TURN_RE, j] = term_re[0, j] = gap_re[0, j] = state[POWER_RE, j] = re
        state[TURN_IM, j] = term_im[0, j] = gap_im[0, j] = state[POWER_IM, j] = im


@inlined
def tangent_map(k0: float, c0: float, k1: float, c1: float, length: float) -> tuple[float, float, float, float]:
    """Tangent map of one bounce, row by row, from curvatures and cosines at both ends and the chord's length."""
    over_both = 1.0 / (c0 * c1)
    bend = fused(k0, length, -c0)
    return (
        bend * (c0 * over_both),
        -length * over_both,
        difference_of_products(k0, c1, k1, bend),
        fused(k1, length, -c1) * (c1 * over_both),
    )


@pasted
def reflect(state: Floats, buffer: Floats, row: int, lanes: int) -> None:
    """Reflect at the new point: momentum, chord and tangent map of this bounce."""
    for j in range(lanes):
        x1 = state[SUM_2, j]
        y1 = state[SUM_3, j]
        over_speed = 1.0 / math.sqrt(sum_of_products(x1, x1, y1, y1))
        tx = x1 * over_speed
        ty = y1 * over_speed
        k1 = difference_of_products(x1, state[SUM_5, j], y1, state[SUM_4, j]) * over_speed * over_speed * over_speed
        rx = state[RAY_X, j]
        ry = state[RAY_Y, j]
        length = fused(state[SUM_0, j] - state[POINT_X, j], rx, (state[SUM_1, j] - state[POINT_Y, j]) * ry)
        p, c1 = to_unit(sum_of_products(tx, rx, ty, ry), difference_of_products(ty, rx, tx, ry))
        c0 = state[COSINE, j]
        k0 = state[CURVATURE, j]
        ss, sp, ps, pp = tangent_map(k0, c0, k1, c1, length)
        buffer[P_AFTER, row, j] = p
        buffer[CHORD, row, j] = length
        buffer[D_SS, row, j] = ss
        buffer[D_SP, row, j] = sp
        buffer[D_PS, row, j] = ps
        buffer[D_PP, row, j] = pp
        state[FAILED, j] += 0.0 if c1 > 0.0 else 1.0
        state[MOMENTUM, j] = p
        state[COSINE, j] = c1
        state[TANGENT_X, j] = tx
        state[TANGENT_Y, j] = ty
        state[CURVATURE, j] = k1
        state[POINT_X, j] = state[SUM_0, j]
        state[POINT_Y, j] = state[SUM_1, j]


@pasted
def bounce_lanes(
    harmonics: Floats,
    plan: Plan,
    state: Floats,
    terms: Terms,
    gaps: Gaps,
    buffer: Floats,
    count: int,
    lanes: int,
) -> None:
    """Bounce every orbit of a block ``count`` times (at most BUFFER) and fill as many rows of the buffer.

    Only the first ``lanes`` orbits are followed, a multiple of GRAIN; ``fill_powers`` must have gone before.  The
    arrays must be on the stack of the kernel this is copied into: then the compiler knows the length of their rows and
    that none overlap, and the loops over lanes become vector instructions.
    """
    for row in range(count):
        aim(state, lanes)
        find_half_advance(harmonics, plan, state, terms, gaps, lanes)
        move_to_end(state, terms, gaps, buffer, row, lanes)
        evaluate_boundary(harmonics, plan, state, terms, gaps, lanes)
        reflect(state, buffer, row, lanes)


@pasted
def copy_rows(source: Floats, target: Floats) -> None:
    """Copy a block's rows by a loop: numba's own assignment of slices takes seconds to compile."""
    for row in range(source.shape[0]):
        for j in range(LANES):
            target[row, j] = source[row, j]


@kernel
def bounce_block(harmonics: Floats, state: Floats, buffer: Floats, count: int, lanes: int) -> None:
    """Bounce the first orbits of a block ``count`` times: for callers that need not be as fast as can be.

    Parameters
    ----------
    harmonics
        Boundary, shape (4, K + 1).
    state
        Shape (STATE_ROWS, LANES): where the orbits are, set up by ``start_block``; updated.
    buffer
        Shape (BUFFER_ROWS, BUFFER, LANES): advance, p, chord and tangent map of each bounce.
    count
        Bounces to make, at most BUFFER.
    lanes
        Orbits to follow, a multiple of GRAIN.
    """
    use_widest_vectors()
    plan = make_plan(harmonics)
    here = stack_array((STATE_ROWS, LANES))
    seen = stack_array((BUFFER_ROWS, BUFFER, LANES))
    terms, gaps = make_room(plan)
    copy_rows(state, here)
    fill_powers(plan, here, terms, gaps, LANES)
    bounce_lanes(harmonics, plan, here, terms, gaps, seen, count, lanes)
    copy_rows(here, state)
    for kind in range(BUFFER_ROWS):
        for row in range(count):
            for j in range(lanes):
                buffer[kind, row, j] = seen[kind, row, j]
