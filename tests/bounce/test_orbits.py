"""Conservation laws, symmetries and closed forms of the bounce and of its tangent map."""

import math

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from scanner.bounce.trace import T_CHORD, T_FAILED, T_P, T_PP, T_PS, T_SP, T_SS, T_TURNS, T_X, T_Y, follow
from scanner.tables import Table, build_table

amplitudes = st.floats(0.0, 0.01)
shapes = st.builds(
    lambda eccentricity, amplitude, realisation: build_table(
        "random_harmonic",
        eccentricity=eccentricity,
        amplitude=amplitude,
        decay=3.0,
        harmonic_max=8,
        realisation=realisation,
    ),
    st.floats(0.0, 0.8),
    amplitudes,
    st.integers(0, 1000),
)
turns_of_start = st.floats(0.0, 1.0, exclude_max=True)
momenta = st.floats(-0.9999, 0.9999)


def tangent_maps(found: np.ndarray) -> np.ndarray:
    """Tangent maps (bounce, orbit, 2, 2) of a followed block."""
    rows = found[1:, [T_SS, T_SP, T_PS, T_PP]]
    return np.moveaxis(rows, 1, 2).reshape(rows.shape[0], rows.shape[2], 2, 2)


def test_momentum_stays_in_a_circle() -> None:
    rng = np.random.default_rng(2)
    p = 2 * rng.random(256) - 1
    found = follow(build_table("ellipse", eccentricity=0.0).harmonics, rng.random(256), p, 100_000)[::10_000]
    # 1e5 roundings of 1e-16 that all pull one way would make 1e-11.
    assert np.abs(found[:, T_P] - p).max() < 1e-11


@pytest.mark.parametrize("eccentricity", [0.6, 0.95])
def test_angular_momenta_stay_in_an_ellipse(eccentricity: float) -> None:
    """The product of the angular momenta about the foci is b^2 - lam; lam as a function of the section is textbook."""
    rng = np.random.default_rng(3)
    p = 2 * rng.random(128) - 1
    found = follow(build_table("ellipse", eccentricity=eccentricity).harmonics, rng.random(128), p, 100_000)[::10_000]
    b2 = 1 - eccentricity**2
    lam = (1 - found[:, T_P] ** 2) * (found[:, T_Y] ** 2 / b2 + b2 * found[:, T_X] ** 2)
    # The same bound as in the circle.
    assert np.abs(lam - lam[0]).max() < 1e-11


def test_tangent_map_of_a_worked_point() -> None:
    """Ellipse (1.3, 1), eccentric angle 0.4, p = 0.3; computed independently with 40 digits."""
    eccentricity = math.sqrt(1 - 1 / 1.69)
    found = follow(
        build_table("ellipse", eccentricity=eccentricity).harmonics, np.array([0.2 / math.pi]), np.array([0.3]), 1
    )
    ds, dsp, dps, dp = found[1, [T_SS, T_SP, T_PS, T_PP], 0]
    # In units of the shorter axis 1.3 times larger than the family's.
    assert ds == pytest.approx(1.89204367381, abs=1e-10)
    assert dsp * 1.3 == pytest.approx(-2.66575576581, abs=1e-10)
    assert dps / 1.3 == pytest.approx(-1.30759208754, abs=1e-10)
    assert dp == pytest.approx(2.3708338284, abs=1e-9)


def test_circle_shears_linearly() -> None:
    """n bounces in the unit circle: [[1, -2 n / cos], [0, 1]] (closed form)."""
    p = np.array([0.3, -0.9, 0.99])
    found = tangent_maps(follow(build_table("ellipse", eccentricity=0.0).harmonics, np.array([0.1, 0.5, 0.8]), p, 50))
    for orbit, momentum in enumerate(p):
        total = np.linalg.multi_dot(found[::-1, orbit])
        truth = np.array([[1.0, -100.0 / math.sqrt(1 - momentum**2)], [0.0, 1.0]])
        # A rounding of the lower left entry is multiplied by the upper right one, 700, twice, in each of 50 products.
        assert total == pytest.approx(truth, abs=50 * 1e-16 * 700**2)


@pytest.mark.parametrize(
    ("family", "parameters", "turns", "trace"),
    [
        ("ellipse", {"eccentricity": 0.6}, 0.0, None),
        ("ellipse", {"eccentricity": 0.6}, 0.25, 2 * math.cos(4 * math.asin(0.8))),
        ("radial_harmonic", {"amplitude": 0.05, "harmonic": 2}, 0.0, 5.6281179138322),
        ("radial_harmonic", {"amplitude": 0.05, "harmonic": 2}, 0.25, -0.6592797783933518),
        ("limacon", {"quadratic": 0.15}, 0.0, 2 - 64 * 0.15**2 / (1 - 4 * 0.15**2) ** 2),
    ],
)
def test_two_bounce_traces(family: str, parameters: dict[str, float], turns: float, trace: float | None) -> None:
    """Trace 4 (l/R0 - 1)(l/R1 - 1) - 2 of two-bounce orbits: closed forms for these axes."""
    found = tangent_maps(follow(build_table(family, **parameters).harmonics, np.array([turns]), np.array([0.0]), 2))
    if trace is None:  # the major axis of an ellipse: exponent ln((1 + e) / (1 - e)) a bounce
        trace = 2 * math.cosh(2 * math.log(1.6 / 0.4))
    # Two rounded matrices; the trace is at most 250.
    assert np.trace(found[1, 0] @ found[0, 0]) == pytest.approx(trace, rel=1e-13, abs=1e-13)


@pytest.mark.parametrize(
    ("harmonic", "angle"), [(4, 1.1502619915109315), (5, 0.91173829096848764), (7, 0.64647152925271333)]
)
def test_constant_angle_curves(harmonic: int, angle: float) -> None:
    """Gutkin, arXiv:1012.2448: a ray at this angle to the tangent keeps it for ever; rotation number angle / pi."""
    table = build_table("curvature_harmonic", amplitude=0.9, harmonic=harmonic)
    s = np.linspace(0.0, 1.0, 64, endpoint=False)
    found = follow(table.harmonics, table.turns_from_arc(s), np.full(64, math.cos(angle)), 200)
    # The curve may be unstable: rounding grows with the bounces.
    assert np.abs(found[:20, T_P] - math.cos(angle)).max() < 1e-12
    # psi, the direction of the tangent, is the parameter: it advances by twice the angle.
    advance = np.mod(found[1:20, T_TURNS] - found[:19, T_TURNS], 1.0)
    assert np.abs(advance - angle / math.pi).max() < 1e-12


@pytest.mark.parametrize("harmonic", [3, 4])
def test_a_turned_table_has_the_same_orbits(harmonic: int) -> None:
    """Where x has cosines alone and y sines the sums leave the others out; turned by some angle they cannot."""
    harmonics = build_table("radial_harmonic", amplitude=0.02, harmonic=harmonic).harmonics
    assert not harmonics[1:3].any()
    c, s = math.cos(0.3), math.sin(0.3)
    turned = np.concatenate([c * harmonics[:2] - s * harmonics[2:], s * harmonics[:2] + c * harmonics[2:]])
    rng = np.random.default_rng(6)
    turns, p = rng.random(64), 2 * rng.random(64) - 1
    plain, other = follow(harmonics, turns, p, 10), follow(turned, turns, p, 10)
    # Two points of rounding 1e-16 drift apart by less than a factor of 2 a bounce.
    for row in (T_TURNS, T_P, T_CHORD):
        assert np.abs(plain[:, row] - other[:, row])[1:].max() < 1e-12
    assert np.abs(c * plain[:, T_X] - s * plain[:, T_Y] - other[:, T_X]).max() < 1e-12


def test_radial_cosine_is_the_limacon() -> None:
    """r = 1 + 2 lam cos(phi) and w = z + lam z^2 are one curve (identity, computed here)."""
    one = build_table("radial_harmonic", amplitude=0.3, harmonic=1)
    two = build_table("limacon", quadratic=0.15)
    start_one, start_two = np.array([0.0]), np.array([0.0])
    p = np.array([0.4])
    chords = [
        follow(table.harmonics, start, p, 30)[1:, T_CHORD, 0] for table, start in ((one, start_one), (two, start_two))
    ]
    # A chaotic orbit loses a digit in about every 15 bounces from 1e-15.
    assert chords[0] == pytest.approx(chords[1], abs=1e-11)


@settings(max_examples=60, deadline=None)
@given(shapes, turns_of_start, momenta)
def test_map_preserves_area(table: Table, turns: float, p: float) -> None:
    assume(table.is_convex)
    found = follow(table.harmonics, np.array([turns]), np.array([p]), 5)
    maps = tangent_maps(found)
    size = np.abs(maps).max(axis=(2, 3)) ** 2
    # The determinant is a difference of products as large as the entries squared.
    assert np.all(np.abs(np.linalg.det(maps) - 1.0) <= 1e-14 * size + 1e-12)


@settings(max_examples=60, deadline=None)
@given(shapes, turns_of_start, momenta)
def test_time_reversal_returns(table: Table, turns: float, p: float) -> None:
    assume(table.is_convex)
    there = follow(table.harmonics, np.array([turns]), np.array([p]), 1)[1, :, 0]
    back = follow(table.harmonics, np.array([there[T_TURNS]]), np.array([-there[T_P]]), 1)[1, :, 0]
    # One bounce amplifies a rounding by at most about 1 / cos <= 71.
    assert back[T_P] == pytest.approx(-p, abs=1e-12)
    assert math.remainder(back[T_TURNS] - turns, 1.0) == pytest.approx(0.0, abs=1e-12)


@settings(max_examples=40, deadline=None)
@given(st.floats(0.0, 0.19), turns_of_start, momenta)
def test_mirror_images_bounce_alike(amplitude: float, turns: float, p: float) -> None:
    """Radial tables with one even harmonic are symmetric about both axes."""
    harmonics = build_table("radial_harmonic", amplitude=amplitude, harmonic=2).harmonics
    found = follow(harmonics, np.array([turns, -turns, 0.5 - turns, turns + 0.5]), np.array([p, -p, -p, p]), 2)[2]
    assert found[T_FAILED].sum() == 0
    # Two bounces amplify a rounding by at most about the square of 1 / cos.
    assert found[T_P] == pytest.approx(found[T_P, 0] * np.array([1, -1, -1, 1]), abs=1e-11)
    assert found[T_CHORD] == pytest.approx(found[T_CHORD, 0], abs=1e-11)
