"""Fractions by replicate, counted from verdicts."""

import numpy as np
import pytest

from scanner.errors import ScannerError
from scanner.statistics import verdict_fractions


def test_counts_by_hand():
    """Two replicates of three orbits."""
    verdicts = np.array([1, 3, 2, 3, 3, 4])
    np.testing.assert_allclose(verdict_fractions(verdicts, {1, 2}, 2), [2 / 3, 0.0])
    np.testing.assert_allclose(verdict_fractions(verdicts, {3}, 2, [1.0, 2.0, 1.0, 1.0, 1.0, 2.0]), [0.5, 0.5])
    by_horizon = np.stack([verdicts, np.full(6, 3)], axis=1)
    np.testing.assert_allclose(verdict_fractions(by_horizon, {3}, 2), [[1 / 3, 1.0], [2 / 3, 1.0]])


def test_orbits_that_were_not_followed_do_not_count():
    """As many, with room for another two a replicate, whose chords are unknown."""
    verdicts = np.array([1, 3, 2, 0, 0, 3, 3, 4, 0, 0])
    np.testing.assert_allclose(verdict_fractions(verdicts, {1, 2}, 2), [2 / 3, 0.0])
    weight = np.array([1.0, 2.0, 1.0, np.nan, np.nan, 1.0, 1.0, 2.0, np.nan, np.nan])
    np.testing.assert_allclose(verdict_fractions(verdicts, {3}, 2, weight), [0.5, 0.5])


@pytest.mark.parametrize(
    ("verdicts", "weight", "message"),
    [
        (np.ones(5), None, "shared equally by 2"),
        (np.ones(0), None, "shared"),
        (np.ones(4), np.ones(3), "weights"),
        (np.ones(4), [1.0, np.nan, 1.0, 1.0], "not finite"),
    ],
)
def test_bad_requests_are_refused(verdicts, weight, message):
    with pytest.raises(ScannerError, match=message):
        verdict_fractions(verdicts, {1}, 2, weight)
