import hashlib
import platform
from fractions import Fraction

import mpmath
import numba
import numpy as np
import pytest
from llvmlite.binding import get_host_cpu_features

from scanner import elementary
from scanner.compiled import use_widest_vectors
from scanner.vectors import fused

mpmath.mp.dps = 40

RNG = np.random.default_rng(20261201)


def units_of_last_place(found, exact):
    spacing = [float(np.spacing(abs(float(value)))) for value in exact]
    pairs = zip(np.ravel(found), exact, spacing, strict=True)
    return max(float(abs(mpmath.mpf(float(value)) - true) / unit) for value, true, unit in pairs)


TURNS = np.concatenate([RNG.uniform(-1, 1, 800), RNG.uniform(-1e6, 1e6, 200), 10.0 ** -np.arange(1, 300, 9)])


def test_cosine_and_sine_are_within_two_units_of_the_last_place():
    cosine, sine = elementary.cos_sin_array(TURNS)
    assert units_of_last_place(cosine, [mpmath.cospi(2 * mpmath.mpf(t)) for t in TURNS]) < 2
    assert units_of_last_place(sine, [mpmath.sinpi(2 * mpmath.mpf(t)) for t in TURNS]) < 2


@pytest.mark.parametrize("whole", [0.0, -3.0, 2.0**51, -(2.0**60)])
def test_quarter_turns_are_exact(whole):
    quarters = np.array([0.0, 0.25, 0.5, 0.75]) if abs(whole) < 2.0**51 else np.zeros(4)
    cosine, sine = elementary.cos_sin_array(whole + quarters)
    expected = [(1, 0), (0, 1), (-1, 0), (0, -1)] if quarters.any() else [(1, 0)] * 4
    assert list(zip(cosine, sine, strict=True)) == expected


def test_cosine_of_what_is_not_finite_is_nan():
    assert np.isnan(elementary.cos_sin_array([np.inf, -np.inf, np.nan])).all()


def test_angle_is_exact_to_a_tenth_of_a_rounding_of_one_turn():
    angle, radius = RNG.uniform(-0.5, 0.5, 1000), 10.0 ** RNG.uniform(-100, 100, 1000)
    x, y = radius * np.cos(2 * np.pi * angle), radius * np.sin(2 * np.pi * angle)
    found = elementary.angle_array(y, x)
    exact = [mpmath.atan2(mpmath.mpf(b), mpmath.mpf(a)) / (2 * mpmath.pi) for b, a in zip(y, x, strict=True)]
    # A turn of 1/2 is itself rounded to 5.6e-17.
    assert max(float(abs(mpmath.mpf(u) - v)) for u, v in zip(found, exact, strict=True)) < 6e-17


def test_angle_of_axes_diagonals_and_origin():
    x = [1, 1, 0, -1, -1, -1, 0, 1, 0, -1, -1]
    y = [0, 1, 1, 1, 0, -1, -1, -1, 0, -0.0, -1e-300]
    expected = [0, 0.125, 0.25, 0.375, 0.5, -0.375, -0.25, -0.125, 0, 0.5, 0.5]
    assert elementary.angle_array(y, x).tolist() == expected


def test_fixed_point_rounds_to_multiples_of_its_unit_and_drops_whole_turns():
    @numba.njit
    def fixed(turns):
        return elementary.fixed_point(turns)

    angles = [*RNG.uniform(-0.5, 0.5, 500), *RNG.uniform(-(2.0**18), 2.0**18, 500), 0.5, -0.5, 0.0, 2.0**-34]
    for angle in angles:
        # Exact in Python's integers; half a unit more where two multiples are equally far.
        expected = round(Fraction(angle) / Fraction(elementary.FIXED_UNIT))
        assert (int(fixed(angle)) - expected) % 2**32 == 0
        assert -(2**31) <= fixed(angle) < 2**31


def test_two_whole_numbers_come_back_out_of_one_word():
    @numba.njit
    def there_and_back(high, low):
        return elementary.pair_of(elementary.pair_up(high, low))

    ends = [-(2**31), -1, 0, 1, 2**31 - 1]
    for high in ends:
        for low in ends:
            assert there_and_back(np.int32(high), np.int32(low)) == (high, low)


def test_inverse_roots_are_within_one_and_a_half_units_of_the_last_place():
    @numba.njit
    def inverse_root(x):
        return elementary.inverse_root(x)

    x = np.concatenate([10.0 ** RNG.uniform(-300, 300, 500), RNG.uniform(0.5, 2, 500), 4.0 ** np.arange(-500, 500, 37)])
    found = [inverse_root(value) for value in x]
    assert units_of_last_place(found, [1 / mpmath.sqrt(mpmath.mpf(value)) for value in x]) < 1.5
    assert inverse_root(1.0) == 1.0
    assert np.isnan(inverse_root(np.nan))


def test_logarithms_are_within_two_units_of_the_last_place():
    x = np.concatenate(
        [10.0 ** RNG.uniform(-300, 300, 500), RNG.uniform(0.5, 2, 500), 1 + RNG.uniform(-1e-6, 1e-6, 200)]
    )
    exact = [mpmath.log(mpmath.mpf(v)) for v in x]
    assert units_of_last_place(elementary.log_array(x), exact) < 1
    assert units_of_last_place(elementary.log10_array(x), [v / mpmath.log(10) for v in exact]) < 2
    assert elementary.log_array(1.0) == 0.0


def test_exponential_is_within_a_unit_of_the_last_place_and_saturates():
    x = np.concatenate([RNG.uniform(-708, 709, 600), RNG.uniform(-1, 1, 600)])
    assert units_of_last_place(elementary.exp_array(x), [mpmath.exp(mpmath.mpf(v)) for v in x]) < 1
    assert elementary.exp_array([0.0, -1e4, 1e4, np.inf, -np.inf]).tolist() == [1.0, 0.0, np.inf, np.inf, 0.0]
    assert elementary.exp_array(-745.0) == 5e-324
    assert np.isnan(elementary.exp_array(np.nan))


def test_arrays_keep_their_shape():
    square = np.full((2, 3), 0.5)
    assert elementary.exp_array(square).shape == elementary.cos_sin_array(square)[1].shape == (2, 3)
    assert elementary.angle_array(0.5, 0.5).shape == ()


@numba.njit(error_model="numpy")
def all_functions(a, b, c):
    for j in range(64):
        cosine, sine = elementary.cos_sin_turns(a[j])
        b[j] = elementary.angle_turns(sine, cosine) + elementary.log(a[j])
        c[j] = elementary.exp(b[j])


def test_loops_call_no_library_and_are_vectorised():
    all_functions(np.ones(64), np.ones(64), np.ones(64))
    (code,) = all_functions.inspect_llvm().values()
    for name in ("sin", "cos", "atan2", "atan", "log", "exp", "pow"):
        assert f"@{name}(" not in code
        assert f"@llvm.{name}.f64" not in code
    if platform.machine() in ("x86_64", "AMD64"):
        (assembly,) = all_functions.inspect_asm().values()
        assert assembly.count("mulpd") > 20  # packed products


def test_bits_are_those_of_every_other_processor():
    # computed here; any processor must give the same bits
    x = np.arange(1, 4001) / 997
    results = [*elementary.cos_sin_array(x), elementary.angle_array(x - 2, x - 1), elementary.log_array(x)]
    digest = hashlib.sha256(b"".join(result.tobytes() for result in [*results, elementary.exp_array(x)]))
    assert digest.hexdigest()[:16] == "c1d79c799b91ce4c"


def test_products_are_fused_with_sums_where_that_is_asked_for():
    @numba.njit
    def in_one_rounding(a, b, c):
        return fused(a, b, c)

    @numba.njit
    def in_two_roundings(a, b, c):
        return a * b + c

    small = 2.0**-30
    # (1 + small) (1 - small) - 1 is -small^2, which the product alone rounds away
    assert in_one_rounding(1.0 + small, 1.0 - small, -1.0) == -(small**2)
    assert in_two_roundings(1.0 + small, 1.0 - small, -1.0) == 0.0


@pytest.mark.skipif(not get_host_cpu_features().get("avx512f", False), reason="needs vectors of eight")
def test_loops_use_the_widest_vectors_where_that_is_asked_for():
    @numba.njit
    def scale(values, found):
        use_widest_vectors()
        for j in range(values.size):
            found[j] = 3.0 * values[j] + 1.0

    numbers = np.arange(100.0)
    found = np.empty(100)
    scale(numbers, found)
    assert np.array_equal(found, 3.0 * numbers + 1.0)
    assert "zmm" in next(iter(scale.inspect_asm().values()))
