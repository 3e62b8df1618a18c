"""Elementary functions in plain arithmetic, so that results have the same bits on every processor.

Libraries of mathematical functions differ between processors in the last digit, and one changed digit changes a
chaotic orbit.  These use only + - * / , products fused with sums, selects and moves of bits; they have no branches,
so that loops over arrays of orbits vectorise.  Angles are in turns, for which the reduction of the range is exact.

The polynomials are near-minimax (Chebyshev) fits computed with 50 digits; what they leave out is below a tenth
of the last place.  The reductions are the classical ones (Cody and Waite, Software Manual for the Elementary
Functions, 1980).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from scanner.compiled import inlined, kernel
from scanner.vectors import fused, near_inverse_root, where

FloatArray = NDArray[np.float64]

TWO_PI = 6.283185307179586
_TWO_PI_REST = 2.4492935982947064e-16
_TWO_PI_SQUARED = 19.739208802178716
_TURNS_PER_RADIAN = 0.15915494309189535
_LN2_HEAD = 0.6931471805592082  # 40 bits, so that its multiples by an exponent are exact
_LN2_REST = 7.371002565167799e-13
_PER_LN2 = 1.4426950408889634
_PER_LN10 = 0.4342944819032518
_TAN_SIXTEENTH = 0.41421356237309503  # tangent of a sixteenth of a turn

# Adding it rounds to a whole number and leaves that number in the low bits.
_ROUNDER = 6755399441055744.0
_EXPONENT_SHIFT = np.int64(52)
_EXPONENT_BIAS = np.int64(1023)
_MANTISSA_MASK = np.int64((1 << 52) - 1)
_HALF_ROOT_TWO_BITS = np.int64(0x3FE6A09E667F3BCD)
_BIAS_BITS = np.int64(1023 << 52)
_ROUNDER_BITS = np.int64(0x4338000000000000)
_FIXED_ROUNDER = 1572864.0  # the same for multiples of FIXED_UNIT, whose lowest 32 bits then stand for one turn
FIXED_UNIT = 2.0**-32
_HALF_A_WORD = np.int64(32)
_LOW_HALF = np.int64((1 << 32) - 1)


@inlined
def _bits(x: float) -> np.int64:
    return np.float64(x).view(np.int64)


@inlined
def _from_bits(bits: np.int64) -> float:
    return np.int64(bits).view(np.float64)


@inlined
def cos_sin_turns(turns: float) -> tuple[float, float]:
    """Cosine and sine of an angle in turns, within 1.5 units of the last place; NaN if not finite."""
    quarters = np.rint(4.0 * turns)
    rest = turns - 0.25 * quarters
    square = rest * rest
    tail = 42.05868918088512 + square * (-15.094054182079999 + square * 3.78643334956545)
    tail = -41.341702240399755 + square * (81.6052492760517 + square * (-76.70585973562093 + square * tail))
    sine = TWO_PI * rest + rest * (_TWO_PI_REST + square * tail)
    tail = -26.426254911246687 + square * (7.903305164742319 + square * -1.7012215232027945)
    tail = 64.9393940226683 + square * (-85.45681720668455 + square * (60.24464136502278 + square * tail))
    drop = _TWO_PI_SQUARED * square
    near = 1.0 - drop
    cosine = near + (((1.0 - near) - drop) + square * square * tail)
    quadrant = quarters - 4.0 * np.rint(0.25 * quarters)  # -2, -1, 0, 1, 2
    odd = quadrant * quadrant == 1.0
    c = sine if odd else cosine
    s = cosine if odd else sine
    c = -c if (quadrant > 0.5 or quadrant < -1.5) else c
    s = -s if (quadrant < -0.5 or quadrant > 1.5) else s
    return c, s


@inlined
def angle_turns(y: float, x: float) -> float:
    """Angle of the point (x, y) in turns, in (-1/2, 1/2], to 1e-16 turns; 0 for the origin."""
    across = abs(y)
    along = abs(x)
    steep = across > along
    low = where(steep, along, across)
    high = where(steep, across, along)
    wide = low > _TAN_SIXTEENTH * high
    top = where(wide, low - high, low)
    bottom = where(wide, low + high, high)
    slope = top / where(bottom == 0.0, 1.0, bottom)
    square = slope * slope
    tail = fused(square, -0.0030497379878334507, 0.006241985651407801)
    tail = fused(square, tail, -0.008093077387038777)
    tail = fused(square, tail, 0.009323405996267038)
    tail = fused(square, tail, -0.010606884708709996)
    tail = fused(square, tail, 0.012242488736289614)
    tail = fused(square, tail, -0.014468623962907377)
    tail = fused(square, tail, 0.017683882412101896)
    tail = fused(square, tail, -0.022736420440018033)
    tail = fused(square, tail, 0.03183098861837187)
    tail = fused(square, tail, -0.05305164769729844)
    angle = fused(slope, _TURNS_PER_RADIAN, slope * square * tail)
    # The offset, an exact number of eighths, is added last: one rounding.
    offset = where(wide, 0.125, 0.0)
    angle = where(steep, -angle, angle)
    offset = where(steep, 0.25 - offset, offset)
    left = x < 0.0
    angle = where(left, -angle, angle)
    offset = where(left, 0.5 - offset, offset)
    angle = offset + angle
    angle = where(y < 0.0, -angle, angle)
    return where(angle == -0.5, 0.5, angle)


@inlined
def inverse_root(x: float) -> float:
    """One over the square root of a positive normal number, within 1.5 units of the last place.

    Two steps of third order and one of Newton's from a rough value: their products and sums take a third of the time
    that a root and a division do.
    """
    half = 0.5 * x
    y = near_inverse_root(x)
    rest = fused(-(half * y), y, 0.5)
    y = fused(y, fused(1.5 * rest, rest, rest), y)
    rest = fused(-(half * y), y, 0.5)
    y = fused(y, fused(1.5 * rest, rest, rest), y)
    return fused(y, fused(-(half * y), y, 0.5), y)


@inlined
def fixed_point(turns: float) -> np.int32:
    """Angle below 2^19 turns in units of FIXED_UNIT, rounded; whole turns drop out."""
    return np.int32(_bits(turns + _FIXED_ROUNDER))


@inlined
def pair_up(high: np.int32, low: np.int32) -> np.int64:
    """Two whole numbers in one word."""
    return np.int64(np.int64(high) << _HALF_A_WORD) | (np.int64(low) & _LOW_HALF)


@inlined
def pair_of(word: np.int64) -> tuple[np.int32, np.int32]:
    """The two whole numbers of a word."""
    return np.int32(word >> _HALF_A_WORD), np.int32(word & _LOW_HALF)


@inlined
def log(x: float) -> float:
    """Natural logarithm of a positive normal number, within 1 unit of the last place."""
    bits = _bits(x) - _HALF_ROOT_TWO_BITS + _BIAS_BITS
    # The exponent as a float: its bits are put where _ROUNDER has its whole part.
    biased = (bits >> _EXPONENT_SHIFT) & np.int64(0xFFF)
    exponent = _from_bits(biased | _ROUNDER_BITS) - (_ROUNDER + 1023.0)
    mantissa = _from_bits((bits & _MANTISSA_MASK) + _HALF_ROOT_TWO_BITS)
    step = mantissa - 1.0
    ratio = step / (2.0 + step)
    square = ratio * ratio
    tail = 0.15386244737621665 + square * (0.13268638369266825 + square * 0.13088034850927555)
    tail = 0.28571428570799784 + square * (0.22222222392581045 + square * (0.18181795547521137 + square * tail))
    tail = square * (0.6666666666666666 + square * (0.40000000000000885 + square * tail))
    half = 0.5 * step * step
    return exponent * _LN2_HEAD - ((half - (ratio * (half + tail) + exponent * _LN2_REST)) - step)


@inlined
def exp(x: float) -> float:
    """Exponential within 1 unit of the last place, 0 below and infinite above the range of doubles."""
    bounded = 710.0 if x > 710.0 else x
    bounded = -746.0 if bounded < -746.0 else bounded
    whole = (bounded * _PER_LN2 + _ROUNDER) - _ROUNDER
    head = bounded - whole * _LN2_HEAD
    rest = whole * _LN2_REST
    r = head - rest
    tail = 2.755727364311030e-07 + r * (2.5105217004720745e-08 + r * 2.0914686968086876e-09)
    tail = 0.00019841269874820627 + r * (2.4801587325547743e-05 + r * (2.7557255400206422e-06 + r * tail))
    tail = 0.04166666666666667 + r * (0.008333333333326136 + r * (0.0013888888888883748 + r * tail))
    tail = 0.5 + r * (0.1666666666666667 + r * tail)
    # The correction by what `r` lost in rounding goes in with the small terms.
    near = 1.0 + (head + (r * r * tail - rest))
    # Two factors, because one alone cannot reach the subnormal numbers nor the largest ones.
    first = 0.5 * whole + _ROUNDER
    second = (whole - (first - _ROUNDER)) + _ROUNDER
    return near * _power_of_two(first) * _power_of_two(second)


@inlined
def _power_of_two(rounded: float) -> float:
    """Two to the whole number that sits in the low bits of ``number + _ROUNDER``."""
    return _from_bits((_bits(rounded) + _EXPONENT_BIAS) << _EXPONENT_SHIFT)


@kernel
def _cos_sin(turns: FloatArray, cosine: FloatArray, sine: FloatArray) -> None:
    for i in range(turns.size):
        c, s = cos_sin_turns(turns[i])
        cosine[i] = c
        sine[i] = s


@kernel
def _angle(y: FloatArray, x: FloatArray, turns: FloatArray) -> None:
    for i in range(x.size):
        turns[i] = angle_turns(y[i], x[i])


@kernel
def _log(x: FloatArray, found: FloatArray) -> None:
    for i in range(x.size):
        found[i] = log(x[i])


@kernel
def _exp(x: FloatArray, found: FloatArray) -> None:
    for i in range(x.size):
        found[i] = exp(x[i])


def _flat(values: ArrayLike) -> FloatArray:
    return np.ascontiguousarray(values, dtype=np.float64).ravel()


def cos_sin_array(turns: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Cosine and sine of angles in turns.

    Parameters
    ----------
    turns : array_like
        Angles, any shape.

    Returns
    -------
    cosine, sine : ndarray
        Same shape, within 1.5 units of the last place.
    """
    flat = _flat(turns)
    cosine, sine = np.empty_like(flat), np.empty_like(flat)
    _cos_sin(flat, cosine, sine)
    shape = np.shape(turns)
    return cosine.reshape(shape), sine.reshape(shape)


def angle_array(y: ArrayLike, x: ArrayLike) -> FloatArray:
    """Angles of points in turns, in (-1/2, 1/2]; ``y`` and ``x`` of one shape."""
    flat = _flat(x)
    turns = np.empty_like(flat)
    _angle(_flat(y), flat, turns)
    return turns.reshape(np.shape(x))


def log_array(x: ArrayLike) -> FloatArray:
    """Natural logarithm of positive normal numbers, any shape; use only on numbers above 2.3e-308."""
    flat = _flat(x)
    found = np.empty_like(flat)
    _log(flat, found)
    return found.reshape(np.shape(x))


def log10_array(x: ArrayLike) -> FloatArray:
    """Logarithm to base ten of positive normal numbers, any shape, to about 2 units of the last place."""
    return log_array(x) * _PER_LN10


def exp_array(x: ArrayLike) -> FloatArray:
    """Exponential of numbers of any shape."""
    flat = _flat(x)
    found = np.empty_like(flat)
    _exp(flat, found)
    return found.reshape(np.shape(x))
