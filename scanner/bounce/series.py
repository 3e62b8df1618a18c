"""Which harmonics of a boundary do not vanish, and how the powers of exp(i t) are reached without the others.

A boundary with a centre of symmetry has odd harmonics only, one with a single radial harmonic m has three: 1, m - 1 and
m + 1.  The sums over harmonics go over those that there are; from one to the next the power is multiplied by that of
the gap between their orders, of which a boundary has few different ones.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from scanner.bounce.lanes import LANES
from scanner.compiled import inlined, kernel, pasted, stack_array
from scanner.vectors import fused, put, take

Floats = npt.NDArray[np.float64]
Whole = npt.NDArray[np.int64]

WEAK = 1e-7
"""Harmonics that together turn tangents by less are left out of the first correction of a chord."""


XC, XS, YC, YS, X1C, X1S, Y1C, Y1S, X2C, X2S, Y2C, Y2S, ORDER, SQUARE, CUBE = range(15)
"""Columns of a plan's series: what of the cosine and of the sine of a harmonic goes into x and y, into their first and
into their second derivatives; its order k, k^2 and 4 k^3."""
SERIES_COLUMNS = 15


class Plan(NamedTuple):
    """Which harmonics to sum, n of them, and how to come from the power of one to that of the next.

    Attributes
    ----------
    series
        Shape (n, SERIES_COLUMNS): the harmonics by increasing order, the first being 1.
    gap_of
        Shape (n,): number of the power that leads to each order from the one before.
    chain
        Shape (m, 2): each such power is the product of two earlier ones, given by number; number 0 is the first power.
    strong
        So many of them are enough to come close: the others turn no tangent by more than ``WEAK``.
    mirrored
        Whether x is a sum of cosines alone and y one of sines, as where t counts from an axis of symmetry.
    """

    series: Floats
    gap_of: Whole
    chain: Whole
    strong: int
    mirrored: bool


class Terms(NamedTuple):
    """Powers of exp(i t0) at the near end of the chord; once the ray is known, the coefficients C_k in their place.

    Real and imaginary parts, of shape (n, LANES).
    """

    re: Floats
    im: Floats


class Gaps(NamedTuple):
    """Powers of a unit number that the plan's chain makes, real and imaginary parts of shape (m, LANES)."""

    re: Floats
    im: Floats


@kernel
def harmonic_orders(harmonics: Floats) -> Whole:
    """Orders of the harmonics that do not vanish, increasing; the first is there in any case."""
    orders = np.empty(harmonics.shape[1] - 1, dtype=np.int64)
    orders[0] = 1
    count = 1
    for k in range(2, harmonics.shape[1]):
        if harmonics[0, k] != 0.0 or harmonics[1, k] != 0.0 or harmonics[2, k] != 0.0 or harmonics[3, k] != 0.0:
            orders[count] = k
            count += 1
    return orders[:count]


@kernel
def count_strong(harmonics: Floats, orders: Whole) -> int:
    """How many harmonics there are up to where all further ones together are weak, against the shorter axis."""
    long_axis = 0.0
    for row in range(4):
        long_axis += harmonics[row, 1] * harmonics[row, 1]
    area = harmonics[0, 1] * harmonics[3, 1] - harmonics[1, 1] * harmonics[2, 1]
    allowed = WEAK * abs(area) / math.sqrt(long_axis)
    count = orders.size
    rest = 0.0
    while count > 1:
        k = orders[count - 1]
        for row in range(4):
            rest += k * abs(harmonics[row, k])
        if rest > allowed:
            break
        count -= 1
    return count


@kernel
def plan_gaps(orders: Whole) -> tuple[Whole, Whole]:
    """Reach the powers of all gaps between the orders by few multiplications: ``gap_of`` and ``chain`` of the plan."""
    widest = 1
    for i in range(1, orders.size):
        widest = max(widest, orders[i] - orders[i - 1])
    place = np.zeros(widest + 1, dtype=np.int64)
    for i in range(1, orders.size):
        place[orders[i] - orders[i - 1]] = 1
    for gap in range(widest, 1, -1):
        if place[gap] > 0:
            place[gap // 2] = place[gap - gap // 2] = 1
    place[1] = 0
    chain = np.zeros((widest, 2), dtype=np.int64)
    count = 1
    for gap in range(2, widest + 1):
        if place[gap] > 0:
            place[gap] = count
            chain[count, 0] = place[gap // 2]
            chain[count, 1] = place[gap - gap // 2]
            count += 1
    gap_of = np.zeros(orders.size, dtype=np.int64)
    for i in range(1, orders.size):
        gap_of[i] = place[orders[i] - orders[i - 1]]
    return gap_of, chain[:count]


@inlined
def sum_of_products(a: float, b: float, c: float, d: float) -> float:
    """Sum a b + c d."""
    return fused(a, b, c * d)


@inlined
def difference_of_products(a: float, b: float, c: float, d: float) -> float:
    """Difference a b - c d."""
    return fused(a, b, -(c * d))


@inlined
def product(a_re: float, a_im: float, b_re: float, b_im: float) -> tuple[float, float]:
    """Product of two complex numbers."""
    return difference_of_products(a_re, b_re, a_im, b_im), sum_of_products(a_re, b_im, a_im, b_re)


@kernel
def make_plan(harmonics: Floats) -> Plan:
    """Plan the sums over the harmonics of a boundary."""
    orders = harmonic_orders(harmonics)
    gap_of, chain = plan_gaps(orders)
    series = np.empty((orders.size, SERIES_COLUMNS))
    mirrored = True
    for i in range(orders.size):
        order = float(orders[i])
        square = order * order
        for row in range(4):
            series[i, row] = harmonics[row, orders[i]]
            series[i, X2C + row] = -square * harmonics[row, orders[i]]
        series[i, X1C] = order * series[i, XS]
        series[i, X1S] = -order * series[i, XC]
        series[i, Y1C] = order * series[i, YS]
        series[i, Y1S] = -order * series[i, YC]
        series[i, ORDER] = order
        series[i, SQUARE] = square
        series[i, CUBE] = 4.0 * square * order
        mirrored = mirrored and series[i, XS] == 0.0 and series[i, YC] == 0.0
    return Plan(series, gap_of, chain, count_strong(harmonics, orders), mirrored)


@pasted
def plan_here(harmonics: Floats) -> Plan:
    """Plan the sums and keep the plan on the stack.

    Whoever hands on an array that is not there has it counted, at every bounce, by instructions that stop all others.
    """
    plan = make_plan(harmonics)
    count = plan.gap_of.shape[0]
    series = stack_array((count, SERIES_COLUMNS), np.float64)
    gap_of = stack_array((count,), np.int64)
    chain = stack_array((plan.chain.shape[0], 2), np.int64)
    for i in range(count):
        gap_of[i] = plan.gap_of[i]
        for column in range(SERIES_COLUMNS):
            series[i, column] = plan.series[i, column]
    for number in range(plan.chain.shape[0]):
        chain[number, 0] = plan.chain[number, 0]
        chain[number, 1] = plan.chain[number, 1]
    return Plan(series, gap_of, chain, plan.strong, plan.mirrored)


@pasted
def make_room(plan: Plan) -> tuple[Terms, Gaps]:
    """Make room for the sums of a plan, on the stack."""
    count = plan.gap_of.shape[0]
    size = plan.chain.shape[0]
    terms = Terms(stack_array((count, LANES), np.float64), stack_array((count, LANES), np.float64))
    return terms, Gaps(stack_array((size, LANES), np.float64), stack_array((size, LANES), np.float64))


@inlined
def raise_to_gaps(plan: Plan, re: float, im: float, gaps: Gaps, first: int) -> None:
    """Fill the powers of all gaps of a vector of unit numbers."""
    chain = plan.chain
    put(gaps.re, 0, first, re)
    put(gaps.im, 0, first, im)
    for number in range(1, chain.shape[0]):
        left = chain[number, 0]
        right = chain[number, 1]
        power_re, power_im = product(
            take(gaps.re, left, first),
            take(gaps.im, left, first),
            take(gaps.re, right, first),
            take(gaps.im, right, first),
        )
        put(gaps.re, number, first, power_re)
        put(gaps.im, number, first, power_im)


@inlined
def next_power(plan: Plan, gaps: Gaps, number: int, first: int, re: float, im: float) -> tuple[float, float]:
    """Power of harmonic ``number`` from that of the one before."""
    gap = plan.gap_of[number]
    return product(re, im, take(gaps.re, gap, first), take(gaps.im, gap, first))


@inlined
def put_term(terms: Terms, number: int, first: int, re: float, im: float) -> None:
    """Keep a power or a coefficient of harmonic ``number``."""
    put(terms.re, number, first, re)
    put(terms.im, number, first, im)


@inlined
def next_term(
    plan: Plan, terms: Terms, gaps: Gaps, number: int, first: int, re: float, im: float
) -> tuple[float, float]:
    """Power of harmonic ``number`` from that of the one before; kept."""
    re, im = next_power(plan, gaps, number, first, re, im)
    put_term(terms, number, first, re, im)
    return re, im
