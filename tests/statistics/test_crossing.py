"""Critical values of known curves, with their bootstrap intervals."""

import math

import numpy as np
import pytest
from scipy.stats import binom

from scanner.errors import ScannerError
from scanner.statistics import find_crossing

PLACES = np.linspace(0.0, 0.1, 11)


def cross(values, level=0.5, *, places=PLACES, resamples=200, seed=1):
    return find_crossing(places, values, level, generator=np.random.default_rng(seed), resamples=resamples)


def repeat(curve, replicates=4):
    return np.repeat(np.asarray(curve)[:, None], replicates, axis=1)


def test_a_straight_line_without_noise():
    """Exact: the line through the points is the curve."""
    for curve in (1.0 - 9.0 * PLACES, 9.0 * PLACES):
        found = cross(repeat(curve))
        exact = 0.5 / 9.0
        assert found.value == pytest.approx(exact, abs=1e-15)
        assert (found.low, found.high) == pytest.approx((exact, exact), abs=1e-15)
        assert found.stderr == pytest.approx(0.0, abs=1e-15)
        assert found.interpolation == pytest.approx(0.0, abs=1e-12)
        assert found.unique == 1.0


def test_a_stretch_on_the_level_counts_as_above():
    """Two tables are enough, and a quantity that starts on the level leaves it at the last table that is on it."""
    assert cross(repeat([0.6, 0.2]), places=[0.0, 1.0]).value == pytest.approx(0.25, abs=1e-15)
    found = cross(repeat(1.0 - 9.0 * np.maximum(PLACES - 0.05, 0.0)), level=1.0)
    assert found.value == pytest.approx(0.05, abs=1e-15)
    assert found.interpolation == pytest.approx(0.0, abs=1e-15)


def test_intervals_cover_as_often_as_they_say():
    """At least 95 % less binomial chance of 1e-3, and not always: one-sided, as the widening errs to the wide side."""
    generator = np.random.default_rng(3)
    covered = trials = 0
    for _ in range(200):
        exact = generator.uniform(0.03, 0.07)
        curve = 0.5 - 5.0 * (PLACES - exact)
        found = cross(curve[:, None] + 0.05 * generator.standard_normal((11, 8)), seed=generator.integers(2**32))
        if len(found.crossings) == 1:
            trials += 1
            covered += found.low <= exact <= found.high
    assert trials > 190
    assert binom.ppf(1e-3, trials, 0.95) <= covered < trials


def test_intervals_do_not_cover_another_level():
    """Negative control: the crossing of a level five standard errors away."""
    generator = np.random.default_rng(4)
    curve = 0.5 - 5.0 * (PLACES - 0.05)
    found = cross(curve[:, None] + 0.05 * generator.standard_normal((11, 8)))
    assert not found.low <= 0.05 + 5.0 * 0.05 / math.sqrt(8) / 5.0 <= found.high
    # The error of a mean over 8, divided by the slope, and less where two points share it; the bootstrap knows it
    # to about a quarter.
    assert 0.3 * 0.0035 < found.stderr < 1.4 * 0.0035


def test_the_distance_to_a_smoother_line_is_told():
    """On a coarse grid the line misses sqrt(0.5) of a parabola; the distance told is of that size."""
    places = np.linspace(0.0, 1.0, 6)
    found = cross(repeat(places**2), places=places)
    miss = abs(found.value - math.sqrt(0.5))
    assert miss > 1e-3
    assert 0.3 * miss < found.interpolation < 3.0 * miss


def test_no_crossing_and_several_are_told():
    none = cross(repeat(1.0 - PLACES))
    assert none.crossings == ()
    assert math.isnan(none.value)
    assert math.isnan(none.low)
    assert none.unique == 0.0
    several = cross(repeat(np.sin(60.0 * PLACES)), level=0.1)
    # sin(60 a) = 0.1 at asin(0.1) / 60 and so on: three below a = 0.1; a chord of the sine's steps errs by 0.003.
    exact = [math.asin(0.1) / 60, (math.pi - math.asin(0.1)) / 60, (2 * math.pi + math.asin(0.1)) / 60]
    assert several.crossings == pytest.approx([place for place in exact if place < 0.1], abs=0.003)
    assert len(several.crossings) == 2
    assert math.isnan(several.value)


def test_a_crossing_near_the_end_may_lie_beyond():
    """Half of the resamples do not cross: no upper bound can be given."""
    generator = np.random.default_rng(5)
    curve = 0.5 + 5.0 * (0.0995 - PLACES)
    noise = generator.standard_normal((11, 8))
    noise -= noise.mean(axis=1, keepdims=True)
    found = cross(curve[:, None] + 0.05 * noise)
    assert found.value == pytest.approx(0.0995, abs=1e-12)
    assert found.high == math.inf
    assert 0.0 < found.low < found.value
    assert found.unique < 0.9


def test_tables_without_numbers_are_left_out():
    values = repeat(1.0 - 9.0 * PLACES)
    values[[0, 5, 10]] = math.nan
    assert cross(values).value == pytest.approx(0.5 / 9.0, abs=1e-15)


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: cross(repeat(PLACES)[:, :1]), "at least 2 replicates"),
        (lambda: cross(repeat(PLACES)[:5]), "11 rows"),
        (lambda: cross(repeat(PLACES), places=PLACES[::-1]), "increasing"),
        (lambda: cross(repeat(PLACES), math.nan), "level = nan"),
        (lambda: cross(repeat(PLACES), resamples=10), "resamples = 10"),
        (lambda: cross(repeat(PLACES * math.nan)), "0 of 11 tables"),
    ],
)
def test_bad_requests_are_refused_in_one_line(call, message):
    with pytest.raises(ScannerError, match=message) as caught:
        call()
    assert "\n" not in str(caught.value)
