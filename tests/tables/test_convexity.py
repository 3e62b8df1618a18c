import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from scanner.tables import build_table
from scanner.tables.boundary import evaluate

BEYOND = 1e-9

LIMITS = [
    ("radial_harmonic", "amplitude", 0.5, {"harmonic": 1}),
    *(("radial_harmonic", "amplitude", 1 / (1 + k * k), {"harmonic": k}) for k in (2, 3, 5, 30, 200)),
    ("radial_harmonic", "amplitude", -1 / 5, {"harmonic": 2}),
    ("limacon", "quadratic", 0.25, {}),
    ("limacon", "quadratic", -0.25, {}),
    ("curvature_harmonic", "amplitude", 1.0, {"harmonic": 2}),
    ("curvature_harmonic", "amplitude", -1.0, {"harmonic": 7}),
    # A wave of the support function changes the radius of curvature 1 by amplitude (1 - k^2).
    ("support_harmonic", "amplitude", 1 / 8, {"eccentricity": 0.0, "harmonic": 3, "phase": 0.4}),
    ("support_harmonic", "amplitude", -1 / 35, {"eccentricity": 0.0, "harmonic": 6, "phase": 0.4}),
]


@pytest.mark.parametrize(("family", "name", "limit", "rest"), LIMITS)
def test_the_limit_of_closed_form_is_convex_and_beyond_it_nothing_is(family, name, limit, rest):
    at_limit = build_table(family, **{name: limit}, **rest)
    assert at_limit.is_convex
    assert at_limit.convexity == ""
    beyond = build_table(family, **{name: limit + np.copysign(BEYOND, limit)}, **rest)
    assert not beyond.is_convex
    assert "curvature" in beyond.convexity
    assert "\n" not in beyond.convexity


def test_isolated_points_of_zero_curvature_are_reported_as_zero():
    table = build_table("radial_harmonic", amplitude=0.2, harmonic=2)
    assert table.curvature_min == 0.0
    assert table.curvature_max == pytest.approx(2 / 1.2**2 / (1 + 0 / 1.2), rel=1e-12)  # (r - r'') / r^2 at r = 1.2


def test_the_reason_names_the_smallest_curvature_and_its_place():
    table = build_table("radial_harmonic", amplitude=0.3, harmonic=2)
    # (r - r'') / r^2 at phi = pi / 2, where r = 0.7 and r'' = 1.2
    assert table.curvature_min == pytest.approx(-0.5 / 0.49, rel=1e-13)
    assert table.convexity == "curvature -1.02041 at t = 0.25 turns, point (0, 0.7)"


def test_a_curve_that_bends_one_way_twice_round_is_not_convex():
    table = build_table("limacon", quadratic=1.0)
    assert not table.is_convex
    assert table.convexity == "crosses itself: the tangent turns 2 times in one round"


@pytest.mark.parametrize(
    ("family", "parameters"),
    [
        ("limacon", {"quadratic": 0.5}),  # a cusp
        ("radial_harmonic", {"amplitude": 1.0, "harmonic": 2}),  # through the origin
        ("radial_harmonic", {"amplitude": 3.0, "harmonic": 4}),
        ("curvature_harmonic", {"amplitude": 2.5, "harmonic": 3}),
        ("normal_harmonic", {"eccentricity": 0.6, "amplitude": -10.0, "harmonic": 30, "phase": 0.0}),
        ("confocal_harmonic", {"eccentricity": 0.6, "amplitude": 10.0, "harmonic": 30, "phase": 0.0}),
        ("support_harmonic", {"eccentricity": 0.99, "amplitude": 0.01, "harmonic": 3, "phase": 0.0}),
        ("normal_harmonic", {"eccentricity": 0.9999, "amplitude": 0.01, "harmonic": 30, "phase": 0.0}),
    ],
)
def test_wild_shapes_still_make_a_table(family, parameters):
    table = build_table(family, **parameters)
    assert not table.is_convex
    assert np.isfinite(table.harmonics).all()
    assert np.isfinite([table.perimeter, table.area]).all()
    assert "not convex" in repr(table)


@given(realisation=st.integers(0, 2**63 - 1), eccentricity=st.floats(0, 0.9), scale=st.floats(0.0, 2.0))
@settings(max_examples=25, deadline=None)
def test_random_tables_turn_once_and_agree_with_their_polygon(realisation, eccentricity, scale):
    parameters = {"decay": 3.0, "harmonic_max": 8, "realisation": realisation}
    table = build_table("random_harmonic", eccentricity=eccentricity, amplitude=0.02 * scale, **parameters)
    _, _, dx, dy, ddx, ddy = evaluate(table.harmonics, np.arange(20_000) / 20_000)
    curvature = (dx * ddy - dy * ddx) / np.hypot(dx, dy) ** 3
    # Between points of the fine grid an extreme is missed by a part in 1e-5 at most.
    assert table.curvature_min <= curvature.min() + 1e-12
    assert table.curvature_max >= curvature.max() * (1 - 1e-12)
    assert table.curvature_min == pytest.approx(curvature.min(), abs=1e-4 * table.curvature_max)
    assert table.is_convex == (curvature.min() >= -1e-12)
    if table.is_convex:  # total curvature of a simple closed curve
        assert (curvature * np.hypot(dx, dy)).mean() == pytest.approx(1, rel=1e-12)
