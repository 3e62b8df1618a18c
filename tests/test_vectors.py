"""Vectors do to each of their numbers what kernels do to plain ones, bit for bit."""

import math

import numba
import numpy as np
import pytest

from scanner import elementary
from scanner.vectors import WIDTH, fused, how_many, put, take, where

RNG = np.random.default_rng(20261202)
SPECIAL = [0.0, -0.0, np.inf, -np.inf, np.nan, 5e-324, 1.0, -1.0]
SIZE = 64
OPERANDS = RNG.normal(size=(3, SIZE)) * 10.0 ** RNG.uniform(-20, 20, (3, SIZE))
for row in range(3):
    OPERANDS[row, row : row + len(SPECIAL)] = SPECIAL


def arithmetic(a, b, c):
    return (a + b) * c - a / b + 2.0 * c - c * 0.5 + 1.0


def in_place(a, b, c):
    a += b
    a *= c
    return a


def compare(a, b, c):
    return where((a < b) & (b > 0.0) | (c == a), -a, abs(b))


def fuse(a, b, c):
    return fused(a, b, c) + fused(-a, 3.0, c) + fused(2.0, b, 1.0)


def sign(a, b, c):
    return math.copysign(a, b) + where(c > 1.0, 0.0, 1.0)


def angle(a, b, c):
    return elementary.angle_turns(a, b) + c


def root(a, b, c):
    return elementary.inverse_root(abs(a)) + b * c


@pytest.mark.parametrize("function", [arithmetic, in_place, compare, fuse, sign, angle, root])
def test_vectors_have_the_bits_of_plain_numbers(function) -> None:
    compiled = numba.njit(function, error_model="numpy")

    @numba.njit(error_model="numpy")
    def one_by_one(rows, found):
        for j in range(rows.shape[1]):
            found[0, j] = compiled(rows[0, j], rows[1, j], rows[2, j])

    @numba.njit(error_model="numpy")
    def by_vectors(rows, found):
        for first in range(0, rows.shape[1], WIDTH):
            put(found, 0, first, compiled(take(rows, 0, first), take(rows, 1, first), take(rows, 2, first)))

    expected, found = np.empty((2, 1, SIZE))
    with np.errstate(all="ignore"):
        one_by_one(OPERANDS, expected)
        by_vectors(OPERANDS, found)
    # But for the sign of what is not a number, which has no meaning.
    assert np.array_equal(found, expected, equal_nan=True)
    assert np.array_equal(np.signbit(found) | np.isnan(found), np.signbit(expected) | np.isnan(found))
    assert np.isfinite(found).sum() > SIZE // 2  # the comparison is of numbers, not of NaN with NaN


def test_plain_numbers_and_vectors_go_where_they_are_put() -> None:
    @numba.njit
    def fill(rows, blocks):
        put(rows, 1, WIDTH, 7.0)
        put(rows, 2, 1, take(rows, 0, 3))
        put(blocks, 3, 0, 1.0)  # rows of an array of three dimensions are numbered through

    rows, blocks = np.zeros((3, 2 * WIDTH)), np.zeros((2, 2, WIDTH))
    rows[0] = np.arange(2 * WIDTH)
    fill(rows, blocks)
    assert np.array_equal(rows[1], np.repeat([0.0, 7.0], WIDTH))
    assert np.array_equal(rows[2], [0.0, *range(3, 3 + WIDTH), *np.zeros(WIDTH - 1)])
    assert blocks[1, 1].all()
    assert not blocks[0].any()
    assert not blocks[1, 0].any()


def test_how_many_counts_where_a_comparison_holds() -> None:
    @numba.njit
    def above(rows, bound):
        return how_many(take(rows, 0, 0) > bound)

    rows = np.arange(float(WIDTH)).reshape(1, WIDTH)
    assert [above(rows, bound) for bound in (-1.0, 0.0, 4.5, WIDTH - 1.0, np.nan)] == [
        WIDTH,
        WIDTH - 1,
        WIDTH - 5,
        0,
        0,
    ]
