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
from scanner.compiled import fused, inlined, kernel, pasted, stack_array

Floats = npt.NDArray[np.float64]
Whole = npt.NDArray[np.int64]

WEAK = 1e-7
"""Harmonics that together turn tangents by less are left out of the first correction of a chord."""


class Plan(NamedTuple):
    """Which harmonics to sum, n of them, and how to come from the power of one to that of the next.

    Attributes
    ----------
    orders
        Shape (n,): their orders, increasing, the first being 1.
    gap_of
        Shape (n,): number of the power that leads to each order from the one before.
    chain
        Shape (m, 2): each such power is the product of two earlier ones, given by number; number 0 is the first power.
    strong
        So many of them are enough to come close: the others turn no tangent by more than ``WEAK``.
    """

    orders: Whole
    gap_of: Whole
    chain: Whole
    strong: int


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
    return Plan(orders, gap_of, chain, count_strong(harmonics, orders))


@pasted
def make_room(plan: Plan) -> tuple[Terms, Gaps]:
    """Make room for the sums of a plan, on the stack."""
    count = plan.orders.shape[0]
    size = plan.chain.shape[0]
    terms = Terms(stack_array((count, LANES)), stack_array((count, LANES)))
    return terms, Gaps(stack_array((size, LANES)), stack_array((size, LANES)))


@pasted
def raise_to_gaps(plan: Plan, gaps: Gaps, lanes: int) -> None:
    """Fill the powers of all gaps from the first one."""
    chain = plan.chain
    gap_re, gap_im = gaps
    for number in range(1, chain.shape[0]):
        left = chain[number, 0]
        right = chain[number, 1]
        for j in range(lanes):
            re, im = product(gap_re[left, j], gap_im[left, j], gap_re[right, j], gap_im[right, j])
            gap_re[number, j] = re
            gap_im[number, j] = im
