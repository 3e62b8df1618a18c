import math

import numpy as np
import pytest

from scanner import build_table
from scanner.bounce.return_map import find_fixed_points, return_map


def test_the_short_axis_of_an_ellipse_is_found() -> None:
    """Two-bounce orbit along the minor axis: trace 2 cos(2 alpha), alpha = 2 asin(b / a) (closed form)."""
    harmonics = build_table("ellipse", eccentricity=0.6).harmonics.copy()
    start = np.array([0.22, 0.27, 0.77])
    turns, p, at = find_fixed_points(harmonics, start, np.array([0.05, -0.1, 0.02]), np.full(3, 2), np.full(3, 1))
    # Newton's last step is below 1e-13.
    assert turns == pytest.approx([0.25, 0.25, 0.75], abs=1e-12)
    assert p == pytest.approx(0.0, abs=1e-12)
    assert at.trace == pytest.approx(2 * math.cos(4 * math.asin(0.8)), abs=1e-11)


def test_polygons_of_the_circle_have_trace_two() -> None:
    """n bounces shear by -2 n R / cos (closed form), for each point its own number of bounces."""
    periods, rotations = np.array([3, 4, 20, 5]), np.array([1, 1, 7, 2])
    p = np.cos(math.pi * rotations / periods)
    at = return_map(
        build_table("ellipse", eccentricity=0.0).harmonics.copy(), np.linspace(0, 1, 4), p, periods, rotations
    )
    assert at.shift == pytest.approx(0.0, abs=1e-14)
    assert at.p == pytest.approx(p, abs=1e-14)
    assert at.trace == pytest.approx(2.0, abs=1e-11)
    assert at.matrix[0, 1] == pytest.approx(-2 * periods / np.sqrt(1 - p**2), rel=1e-12)
    assert at.speed == pytest.approx(2 * math.pi, rel=1e-15)


def test_no_fixed_point_is_not_a_number() -> None:
    """The invariant curves of a circle leave no isolated polygon for Newton to settle on away from p/q."""
    harmonics = build_table("limacon", quadratic=0.05).harmonics.copy()
    turns, _, _ = find_fixed_points(harmonics, np.array([0.1]), np.array([0.95]), np.array([2]), np.array([1]))
    assert np.isnan(turns).all() or abs(math.remainder(turns[0], 0.5)) < 1e-10
