"""Extrapolation to infinite horizon on invented power laws, orbit by orbit."""

import math

import numpy as np
import pytest
from scipy.stats import binom

from scanner.errors import ScannerError
from scanner.statistics import EXPONENT_RANGE, extrapolate_fraction

HORIZONS = np.array([1024, 2048, 4096, 8192])
REPLICATES = 8


def law(limit, amplitude, exponent):
    """Fraction by horizon; the amplitude is what is still missing at the last one."""
    return limit + amplitude * (HORIZONS / HORIZONS[-1]) ** -(exponent - 1.0)


def sample(generator, fractions, orbits=2048, replicates=REPLICATES):
    """Each orbit is found out between two horizons or never: a multinomial count in each replicate."""
    chances = np.array([1.0 - fractions[0], *(fractions[:-1] - fractions[1:]), fractions[-1]])
    found = generator.multinomial(orbits, chances, size=replicates)
    return 1.0 - np.cumsum(found, axis=1)[:, :-1] / orbits


def test_a_law_without_noise_is_found():
    """At the only exponent of a narrow range the limit comes out to rounding; the replicates differ by a constant."""
    exact = law(0.2, 0.05, 1.4)
    shifts = np.linspace(-0.01, 0.01, REPLICATES)[:, None]
    # The steps need some scatter of their own to be weighted: a thousandth of what they are, of zero mean.
    wobble = np.outer(np.tile([1.0, -1.0], REPLICATES // 2), 1e-3 * (exact - 0.2))
    found = extrapolate_fraction(HORIZONS, exact + shifts + wobble, exponents=(1.4 - 1e-9, 1.4 + 1e-9))
    assert found.decided
    assert found.value == pytest.approx(0.2, abs=1e-8)
    assert found.exponent == pytest.approx(1.4, abs=1e-8)
    # The error of a common shift is the standard error of the shifts.
    assert found.stderr == pytest.approx(shifts.std(ddof=1) / math.sqrt(REPLICATES), rel=0.01)


def test_intervals_cover_as_often_as_they_say():
    """With exponents drawn from the stated range 95 %, binomial bounds of 0.998; the last horizon's own do not."""
    generator = np.random.default_rng(6)
    covered = naive = decided = 0
    for _ in range(200):
        exact = law(0.2, 0.05, generator.uniform(*EXPONENT_RANGE))
        found = extrapolate_fraction(HORIZONS, sample(generator, exact))
        if found.decided:
            decided += 1
            covered += found.low <= 0.2 <= found.high
            naive += abs(found.last - 0.2) <= 2.0 * found.last_stderr
    assert decided >= 190  # one in a hundred is taken for a misfit
    assert binom.ppf(1e-3, decided, 0.95) <= covered <= binom.ppf(1.0 - 1e-3, decided, 0.95)
    assert naive < 0.1 * decided


def test_true_laws_are_rarely_taken_for_a_misfit():
    """As often as 1 in 100 says, even where two replicates tell the variance; binomial bound of 0.999."""
    generator = np.random.default_rng(7)
    misfits = 0
    for _ in range(400):
        exact = law(0.2, 0.08, generator.uniform(*EXPONENT_RANGE))
        found = extrapolate_fraction(HORIZONS, sample(generator, exact, 512, replicates=2))
        misfits += "such a power" in found.reason
    assert misfits <= binom.ppf(0.999, 400, 0.01)


def test_replicates_that_all_fall_alike_leave_no_error():
    found = extrapolate_fraction(HORIZONS, np.tile(law(0.2, 0.05, 1.4), (2, 1)))
    assert not found.decided
    assert "fall alike" in found.reason


def test_the_error_holds_the_spread_over_the_exponent():
    """Sampling at a fixed exponent, and f(n) - fall / (8^(g - 1) - 1) one standard deviation of g to either side."""
    table = sample(np.random.default_rng(1), law(0.2, 0.02, 1.45), 20_000)
    wide = extrapolate_fraction(HORIZONS, table)
    fixed = extrapolate_fraction(HORIZONS, table, exponents=(wide.exponent - 1e-6, wide.exponent + 1e-6))
    fall = (table[:, 0] - table[:, -1]).mean()
    below, above = (fall / (8.0 ** (wide.exponent + sign * wide.exponent_stderr - 1.0) - 1.0) for sign in (-1, 1))
    # The limit is not quite a straight line in g over the range: ten percent.
    assert wide.stderr == pytest.approx(math.hypot(fixed.stderr, 0.5 * (below - above)), rel=0.1)
    assert wide.stderr > 1.5 * fixed.stderr
    assert abs(wide.value - 0.2) < 2.5 * wide.stderr


@pytest.mark.parametrize(
    ("fractions", "reason"),
    [
        (np.full((REPLICATES, 4), 1.0), "no clear fall"),
        (np.full((REPLICATES, 4), math.nan), "missing"),
        (sample(np.random.default_rng(2), law(0.2, 0.01, 2.5), 8192), "does not fall like such a power"),
        (sample(np.random.default_rng(2), law(-0.2, 0.25, 1.45), 8192), "clearly negative"),
        (sample(np.random.default_rng(2), law(0.2, 0.05, 1.45), 8192)[:, ::-1], "no clear fall"),
    ],
    ids=["constant", "missing", "too steep", "negative", "rising"],
)
def test_what_the_data_do_not_allow_stays_undecided(fractions, reason):
    found = extrapolate_fraction(HORIZONS, fractions)
    assert not found.decided
    assert reason in found.reason
    assert all(math.isnan(number) for number in (found.value, found.stderr, found.low, found.high))
    np.testing.assert_equal(found.last, float(fractions[:, -1].mean()))


def test_limits_stay_fractions():
    """A small limit: the interval ends at 0."""
    found = extrapolate_fraction(HORIZONS, sample(np.random.default_rng(3), law(0.002, 0.05, 1.45), 256))
    assert found.low == 0.0
    assert 0.0 <= found.value <= found.high < 0.1


@pytest.mark.parametrize(
    ("arguments", "options", "message"),
    [
        (([1, 2], np.ones((2, 2))), {}, "at least three"),
        (([1, 4, 2], np.ones((2, 3))), {}, "increasing"),
        ((HORIZONS, np.ones(4)), {}, r"shape \(4,\)"),
        ((HORIZONS, np.ones((1, 4))), {}, "at least 2"),
        ((HORIZONS, np.ones((2, 4))), {"exponents": (0.9, 1.6)}, "range above 1"),
        ((HORIZONS, np.ones((2, 4))), {"confidence": 0.0}, "confidence = 0"),
    ],
)
def test_bad_requests_are_refused_in_one_line(arguments, options, message):
    with pytest.raises(ScannerError, match=message) as caught:
        extrapolate_fraction(*arguments, **options)
    assert "\n" not in str(caught.value)
