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

from scanner.bounce.chord import find_half_advance
from scanner.bounce.lanes import (
    ADVANCE,
    BEND_X,
    BEND_Y,
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
    KEPT_ROWS,
    LANES,
    MOMENTUM,
    P_AFTER,
    POINT_X,
    POINT_Y,
    RAY_X,
    RAY_Y,
    SLOPE_X,
    SLOPE_Y,
    STATE_ROWS,
    TANGENT_X,
    TANGENT_Y,
    TURN_IM,
    TURN_RE,
)
from scanner.bounce.series import (
    X1C,
    X1S,
    X2C,
    X2S,
    XC,
    XS,
    Y1C,
    Y1S,
    Y2C,
    Y2S,
    YC,
    YS,
    Gaps,
    Plan,
    Terms,
    difference_of_products,
    make_room,
    next_term,
    plan_here,
    product,
    put_term,
    raise_to_gaps,
    sum_of_products,
)
from scanner.compiled import inlined, kernel, pasted, stack_array, use_widest_vectors
from scanner.elementary import angle_turns, cos_sin_turns, inverse_root
from scanner.vectors import WIDTH, fused, put, take, where

Floats = npt.NDArray[np.float64]
Derivatives = tuple[float, float, float, float, float, float]
"""Point (x, y) on the boundary and its first and second derivative by t."""


@inlined
def sum_series(plan: Plan, re: float, im: float, terms: Terms, gaps: Gaps, first: int) -> Derivatives:
    """Sum the boundary at exp(i t), and keep the powers of exp(i t).

    The first harmonic is at hand; its second derivative is minus the point itself.
    """
    series = plan.series
    x0 = sum_of_products(series[0, XC], re, series[0, XS], im)
    y0 = sum_of_products(series[0, YC], re, series[0, YS], im)
    x1 = sum_of_products(series[0, X1C], re, series[0, X1S], im)
    y1 = sum_of_products(series[0, Y1C], re, series[0, Y1S], im)
    x2 = -x0
    y2 = -y0
    for i in range(1, series.shape[0]):
        re, im = next_term(plan, terms, gaps, i, first, re, im)
        x0 = fused(series[i, XC], re, fused(series[i, XS], im, x0))
        y0 = fused(series[i, YC], re, fused(series[i, YS], im, y0))
        x1 = fused(series[i, X1C], re, fused(series[i, X1S], im, x1))
        y1 = fused(series[i, Y1C], re, fused(series[i, Y1S], im, y1))
        x2 = fused(series[i, X2C], re, fused(series[i, X2S], im, x2))
        y2 = fused(series[i, Y2C], re, fused(series[i, Y2S], im, y2))
    return x0, y0, x1, y1, x2, y2


@inlined
def sum_mirrored_series(plan: Plan, re: float, im: float, terms: Terms, gaps: Gaps, first: int) -> Derivatives:
    """Do what ``sum_series`` does, for a mirrored boundary with half the work."""
    series = plan.series
    x0 = series[0, XC] * re
    y0 = series[0, YS] * im
    x1 = series[0, X1S] * im
    y1 = series[0, Y1C] * re
    x2 = -x0
    y2 = -y0
    for i in range(1, series.shape[0]):
        re, im = next_term(plan, terms, gaps, i, first, re, im)
        x0 = fused(series[i, XC], re, x0)
        y0 = fused(series[i, YS], im, y0)
        x1 = fused(series[i, X1S], im, x1)
        y1 = fused(series[i, Y1C], re, y1)
        x2 = fused(series[i, X2C], re, x2)
        y2 = fused(series[i, Y2S], im, y2)
    return x0, y0, x1, y1, x2, y2


@inlined
def evaluate_boundary(
    plan: Plan, re: float, im: float, state: Floats, terms: Terms, gaps: Gaps, first: int
) -> Derivatives:
    """Sum the boundary at exp(i t), and prepare what the next chord needs to know of this end."""
    put(state, TURN_RE, first, re)
    put(state, TURN_IM, first, im)
    put_term(terms, 0, first, re, im)
    raise_to_gaps(plan, re, im, gaps, first)
    if plan.mirrored:
        x0, y0, x1, y1, x2, y2 = sum_mirrored_series(plan, re, im, terms, gaps, first)
    else:
        x0, y0, x1, y1, x2, y2 = sum_series(plan, re, im, terms, gaps, first)
    put(state, SLOPE_X, first, x1)
    put(state, SLOPE_Y, first, y1)
    put(state, BEND_X, first, x2)
    put(state, BEND_Y, first, y2)
    return x0, y0, x1, y1, x2, y2


@inlined
def to_unit(x: float, y: float) -> tuple[float, float]:
    """Bring a vector that is of unit length but for rounding to unit length."""
    scale = fused(-0.5, sum_of_products(x, x, y, y), 1.5)
    return x * scale, y * scale


@inlined
def face(state: Floats, first: int, at: Derivatives) -> tuple[float, float, float]:
    """Unit tangent and curvature of the boundary at a point of it; kept with the point."""
    x0, y0, x1, y1, x2, y2 = at
    over_speed = inverse_root(sum_of_products(x1, x1, y1, y1))
    tx = x1 * over_speed
    ty = y1 * over_speed
    curvature = difference_of_products(x1, y2, y1, x2) * over_speed * over_speed * over_speed
    put(state, POINT_X, first, x0)
    put(state, POINT_Y, first, y0)
    put(state, TANGENT_X, first, tx)
    put(state, TANGENT_Y, first, ty)
    put(state, CURVATURE, first, curvature)
    return tx, ty, curvature


@kernel
def start_block(harmonics: Floats, turns: Floats, momenta: Floats, state: Floats) -> None:
    """Set up a block at boundary parameters ``turns`` and momenta ``momenta``, both of shape (LANES,)."""
    plan = plan_here(harmonics)
    here = stack_array((STATE_ROWS, LANES), np.float64)
    terms, gaps = make_room(plan)
    for j in range(LANES):
        here[TURN_RE, j], here[TURN_IM, j] = cos_sin_turns(turns[j])
        here[MOMENTUM, j] = momenta[j]
        here[COSINE, j] = math.sqrt((1.0 - momenta[j]) * (1.0 + momenta[j]))
        here[FAILED, j] = 0.0
    for first in range(0, LANES, WIDTH):
        re = take(here, TURN_RE, first)
        im = take(here, TURN_IM, first)
        face(here, first, evaluate_boundary(plan, re, im, here, terms, gaps, first))
    copy_rows(here, state)


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


@inlined
def reflect(plan: Plan, state: Floats, terms: Terms, gaps: Gaps, buffer: Floats, row: int, first: int) -> None:
    """Go to the end of the chord and reflect there: advance, momentum, chord and tangent map of this bounce."""
    vr = take(state, HALF_COS, first)
    vi = take(state, HALF_SIN, first)
    advance = 2.0 * angle_turns(vi, vr)
    ur = difference_of_products(vr, vr, vi, vi)
    ui = 2.0 * vr * vi
    re, im = product(take(state, TURN_RE, first), take(state, TURN_IM, first), ur, ui)
    re, im = to_unit(re, im)
    x0 = take(state, POINT_X, first)
    y0 = take(state, POINT_Y, first)
    k0 = take(state, CURVATURE, first)
    c0 = take(state, COSINE, first)
    rx = take(state, RAY_X, first)
    ry = take(state, RAY_Y, first)
    there = evaluate_boundary(plan, re, im, state, terms, gaps, first)
    tx, ty, k1 = face(state, first, there)
    length = fused(there[0] - x0, rx, (there[1] - y0) * ry)
    p, c1 = to_unit(sum_of_products(tx, rx, ty, ry), difference_of_products(ty, rx, tx, ry))
    put(state, FAILED, first, where(c1 > 0.0, take(state, FAILED, first), 1.0))
    put(state, MOMENTUM, first, p)
    put(state, COSINE, first, c1)
    ss, sp, ps, pp = tangent_map(k0, c0, k1, c1, length)
    put(buffer, ADVANCE * BUFFER + row, first, advance)
    put(buffer, P_AFTER * BUFFER + row, first, p)
    put(buffer, CHORD * BUFFER + row, first, length)
    put(buffer, D_SS * BUFFER + row, first, ss)
    put(buffer, D_SP * BUFFER + row, first, sp)
    put(buffer, D_PS * BUFFER + row, first, ps)
    put(buffer, D_PP * BUFFER + row, first, pp)


@pasted
def set_out(plan: Plan, state: Floats, terms: Terms, gaps: Gaps) -> None:
    """Prepare the first chords of a block whose state was kept elsewhere."""
    for first in range(0, LANES, WIDTH):
        evaluate_boundary(plan, take(state, TURN_RE, first), take(state, TURN_IM, first), state, terms, gaps, first)


@pasted
def bounce_lanes(plan: Plan, state: Floats, terms: Terms, gaps: Gaps, buffer: Floats, count: int, lanes: int) -> None:
    """Bounce every orbit of a block ``count`` times (at most BUFFER) and fill as many rows of the buffer.

    Only the first ``lanes`` orbits are followed, a multiple of GRAIN; ``set_out`` must have gone before.  The arrays
    must be on the stack of the kernel this is copied into: then the compiler knows that none overlap.  Stages go over
    all orbits one after the other, so that while one vector waits for a division the next is worked on.
    """
    for row in range(count):
        find_half_advance(plan, state, terms, gaps, lanes)
        for first in range(0, lanes, WIDTH):
            reflect(plan, state, terms, gaps, buffer, row, first)


@pasted
def copy_rows(source: Floats, target: Floats) -> None:
    """Copy the rows that are kept of a block by a loop: numba's own assignment of slices takes seconds to compile."""
    for row in range(KEPT_ROWS):
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
        Shape (KEPT_ROWS, LANES): where the orbits are, set up by ``start_block``; updated.
    buffer
        Shape (BUFFER_ROWS, BUFFER, LANES): advance, p, chord and tangent map of each bounce.
    count
        Bounces to make, at most BUFFER.
    lanes
        Orbits to follow, a multiple of GRAIN.
    """
    use_widest_vectors()
    plan = plan_here(harmonics)
    here = stack_array((STATE_ROWS, LANES), np.float64)
    seen = stack_array((BUFFER_ROWS, BUFFER, LANES), np.float64)
    terms, gaps = make_room(plan)
    copy_rows(state, here)
    set_out(plan, here, terms, gaps)
    bounce_lanes(plan, here, terms, gaps, seen, count, lanes)
    copy_rows(here, state)
    for kind in range(BUFFER_ROWS):
        for row in range(count):
            for j in range(lanes):
                buffer[kind, row, j] = seen[kind, row, j]
