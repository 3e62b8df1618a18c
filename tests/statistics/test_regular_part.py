"""The regular part fitted to spacings: coverage of its intervals, its ends, comparison, random matrices."""

import math

import numpy as np
import pytest
from scipy.stats import binom

from scanner.errors import ScannerError
from scanner.statistics import compare_regular_parts, draw_spacings, fit_regular_part

REPEATS = 200


def spectra(regular, count, repeats=REPEATS, seed=11):
    generator = np.random.default_rng(seed)
    return [draw_spacings(count, regular, generator=generator) for _ in range(repeats)]


@pytest.mark.parametrize("regular", [0.1, 0.3, 0.6])
def test_intervals_cover_as_often_as_they_say(regular):
    """Away from the ends 95 %: the count is binomial, bounds hold with probability 0.998."""
    fits = [fit_regular_part(spacings) for spacings in spectra(regular, 300)]
    covered = sum(fit.low <= regular <= fit.high for fit in fits)
    assert binom.ppf(1e-3, REPEATS, 0.95) <= covered <= binom.ppf(1.0 - 1e-3, REPEATS, 0.95)
    # Negative control: the same intervals do not cover a part three of their half-widths away.
    shift = 1.5 * np.mean([fit.high - fit.low for fit in fits])
    assert sum(fit.low <= regular + shift <= fit.high for fit in fits) < 0.5 * REPEATS


@pytest.mark.parametrize("regular", [0.0, 1.0])
def test_intervals_at_the_ends_cover_more_than_they_say(regular):
    """Half of what is left, 97.5 %, as the fit is held at the end half of the time (Chernoff, 1954 [memory])."""
    fits = [fit_regular_part(spacings) for spacings in spectra(regular, 200, 100)]
    assert sum(fit.low <= regular <= fit.high for fit in fits) >= binom.ppf(1e-3, 100, 0.95)
    at_the_end = [fit for fit in fits if fit.value == regular]
    assert len(at_the_end) > 30
    assert all(math.isnan(fit.stderr) for fit in at_the_end)


def test_standard_error_is_the_scatter():
    """The root mean square of 200 fits is known to 5 %; three times that is allowed."""
    fits = [fit_regular_part(spacings) for spacings in spectra(0.3, 500)]
    scatter = np.std([fit.value for fit in fits], ddof=1)
    assert np.mean([fit.stderr for fit in fits]) == pytest.approx(scatter, rel=0.15)


def test_comparison_is_a_standard_normal_when_both_parts_are_equal():
    generator = np.random.default_rng(5)
    error = 0.04
    z = [
        compare_regular_parts(spacings, float(np.clip(0.3 + error * generator.standard_normal(), 0.0, 1.0)), error)
        for spacings in spectra(0.3, 400, 150)
    ]
    # Mean known to 1 / sqrt(150) = 0.08, standard deviation to 0.06: three times each.
    assert abs(np.mean(z)) < 0.25
    assert np.std(z) == pytest.approx(1.0, abs=0.18)


def test_comparison_far_from_the_ends_is_the_difference_over_both_errors():
    """And it notices a difference, of the right sign."""
    spacings = draw_spacings(4000, 0.4, generator=np.random.default_rng(2))
    fit = fit_regular_part(spacings)
    for value in (0.3, 0.5):
        z = compare_regular_parts(spacings, value, 0.02)
        # The likelihood is a parabola to some percent over two standard errors of 4000 spacings.
        assert z == pytest.approx((fit.value - value) / math.hypot(fit.stderr, 0.02), rel=0.1)
    assert abs(compare_regular_parts(spacings, 0.3, 0.0)) > abs(compare_regular_parts(spacings, 0.3, 0.02))
    assert compare_regular_parts(spacings, fit.value, 0.0) == pytest.approx(0.0, abs=1e-3)


def test_a_degenerate_level_rules_out_pure_chaos():
    spacings = draw_spacings(200, 0.0, generator=np.random.default_rng(4))
    spacings[0] = 0.0
    fit = fit_regular_part(spacings)
    assert 0.0 < fit.low < fit.value < fit.high


def goe_levels(generator, size=200):
    """Unfolded middle half of the spectrum of a Gaussian orthogonal matrix, by the semicircle law."""
    square = generator.standard_normal((size, size))
    x = np.linalg.eigvalsh((square + square.T) / math.sqrt(2.0)) / (2.0 * math.sqrt(size))
    counted = size * (0.5 + (x * np.sqrt(np.clip(1.0 - x * x, 0.0, 1.0)) + np.arcsin(np.clip(x, -1.0, 1.0))) / math.pi)
    middle = counted[(counted > size / 4) & (counted < 3 * size / 4)]
    return middle - size / 4


def mixed_spacings(generator, regular, matrices=12):
    """Spacings of random matrices' levels mixed with levels at random, a part ``regular`` of all."""
    found = []
    for _ in range(matrices):
        span = 100.0 / (1.0 - regular)
        levels = goe_levels(generator) * span / 100.0
        strangers = generator.uniform(0.0, span, generator.poisson(regular * span))
        found.append(np.diff(np.sort(np.concatenate([levels, strangers]))))
    return np.concatenate(found)


@pytest.mark.parametrize("regular", [0.0, 0.35])
def test_random_matrices_mixed_with_random_levels(regular):
    """Wigner's surmise is off by about 1 % of the density from large matrices: 0.02 in the part is allowed for."""
    fit = fit_regular_part(mixed_spacings(np.random.default_rng(8), regular))
    assert fit.low - 0.02 <= regular <= fit.high + 0.02
    assert fit.high - fit.low < 0.15


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: fit_regular_part(np.ones(5)), "at least 20"),
        (lambda: fit_regular_part(3.0 * draw_spacings(99, 0.5, generator=np.random.default_rng(1))), "unfold"),
        (lambda: fit_regular_part(np.linspace(-1.0, 3.0, 50)), "negative"),
        (lambda: fit_regular_part(np.linspace(0.0, 2.0, 50), confidence=95.0), "confidence = 95"),
        (lambda: compare_regular_parts(np.linspace(0.0, 2.0, 50), 1.5, 0.1), r"1\.5 \+- 0\.1"),
        (lambda: compare_regular_parts(np.linspace(0.0, 2.0, 50), 0.5, math.nan), "nan"),
    ],
)
def test_bad_requests_are_refused_in_one_line(call, message):
    with pytest.raises(ScannerError, match=message) as caught:
        call()
    assert "\n" not in str(caught.value)
