import mpmath as mp
import numpy as np
import pytest
import slow_tables
from scipy.special import gamma

from scanner.tables import build_table
from scanner.tables.boundary import curvature_range, evaluate


@pytest.mark.parametrize(("exponent", "aspect"), [(2.5, 0.8), (3.0, 2.0), (1.5, 0.6), (6.0, 0.5)])
def test_the_stated_error_is_the_error(exponent, aspect):
    table = build_table("lame", exponent=exponent, aspect=aspect)
    turns = np.concatenate([np.linspace(0, 0.01, 40), np.linspace(0.24, 0.26, 40)])  # near the ends of the axes
    exact = np.array([[float(v) for v in slow_tables.lame(mp.mpf(t), exponent, aspect)] for t in turns]).T
    error = np.hypot(*(evaluate(table.harmonics, turns)[:2] - exact)).max() / max(1.0, aspect)
    assert error <= 1.1 * table.boundary_error + 1e-15
    assert table.boundary_error <= 10 * error + 1e-14  # honest, not merely safe


@pytest.mark.parametrize("exponent", [1.4, 1.5, 2.0, 2.5, 3.0, 4.0, 7.5, 20.0, 32.0])
def test_area_is_that_of_closed_form(exponent):
    table = build_table("lame", exponent=exponent, aspect=0.7)
    exact = 4 * 0.7 * gamma(1 + 1 / exponent) ** 2 / gamma(1 + 2 / exponent)  # Dirichlet's integral
    assert table.area == pytest.approx(exact, rel=4 * table.boundary_error + 1e-14)
    assert table.is_convex


def test_flat_points_have_curvature_zero_and_corners_infinite():
    assert build_table("lame", exponent=2.5, aspect=0.8).curvature_min == 0.0
    assert build_table("lame", exponent=1.5, aspect=0.8).curvature_max == np.inf
    ellipse = build_table("lame", exponent=2.0, aspect=0.8)
    assert (ellipse.curvature_min, ellipse.curvature_max) == pytest.approx((0.8, 1 / 0.64), rel=1e-13)


def test_largest_curvature_is_that_of_the_stored_boundary_where_it_is_smooth():
    table = build_table("lame", exponent=4.0, aspect=0.8)
    # Harmonics left out below 1e-14 change the curvature by their order squared, about 65^2.
    assert curvature_range(table.harmonics.copy())[2] == pytest.approx(table.curvature_max, rel=1e-10)


@pytest.mark.parametrize("exponent", [1.4, 2.5, 4.5, 9.0, 32.0])
def test_the_stored_boundary_bends_inwards_by_no_more_than_what_is_left_out(exponent):
    table = build_table("lame", exponent=exponent, aspect=0.8)
    # Harmonics from 512 on are left out: 1e-12 each where there is most to lose, they bend by 512^2 times as much.
    assert curvature_range(table.harmonics.copy())[0] > -1e-6
