"""The baselines against closed forms, and against each other."""

import math

import baseline_c
import baselines
import numpy as np
import pytest
from scipy.special import ellipk, ellipkinc

from scanner.indicators import orbit_numbers
from scanner.indicators.schedule import horizons
from scanner.measure import section_points
from scanner.quantities import REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL
from scanner.tables import build_table
from scanner.tables.curve import bring_to_unit_size

MEASURES = [
    pytest.param(baselines.measure_scalar, id="scalar"),
    pytest.param(baselines.measure_vectorised, id="vectorised"),
    pytest.param(
        baseline_c.measure_in_c,
        id="c",
        marks=pytest.mark.skipif(not baseline_c.c_targets(), reason="no C compiler to make the baseline with"),
    ),
]
HORIZONS = (256, 512, 1024, 2048)


def ellipse(b: float) -> np.ndarray:
    """Harmonics of the ellipse with semi-axes 1 and b; t is the eccentric angle."""
    return np.array([[0.0, 1.0], [0.0, 0.0], [0.0, 0.0], [0.0, b]])


def limacon(quadratic: float) -> np.ndarray:
    """Harmonics of w = z + quadratic z^2 on the unit circle."""
    return np.array([[0.0, 1.0, quadratic], [0.0] * 3, [0.0] * 3, [0.0, 1.0, quadratic]])


def momentum_on_caustic(b: float, caustic: float, turns: float) -> float:
    """The p > 0 at eccentric angle 2 pi ``turns`` whose orbit touches the confocal conic ``caustic``."""
    angle = 2.0 * math.pi * turns
    return math.sqrt(1.0 - caustic / (math.sin(angle) ** 2 + b * b * math.cos(angle) ** 2))


@pytest.mark.parametrize("measure", MEASURES)
def test_circle(measure):
    """Rotation number arccos(p) / pi, chord 2 cos, n-step tangent map [[1, -2 n / c], [0, 1]]: exact."""
    p = np.array([-0.9, -0.3, 0.0, 0.2, 0.7, 0.99])
    c = np.sqrt(1.0 - p**2)
    found = measure(ellipse(1.0), np.linspace(0.0, 0.9, p.size), p, HORIZONS)
    # Rounding of p accumulates over 2048 bounces of about 1e-16 each.
    np.testing.assert_allclose(found["rotation_number"][-1], np.arccos(p) / math.pi, rtol=0, atol=1e-12)
    np.testing.assert_allclose(found["mean_chord"], 2.0 * c, rtol=0, atol=1e-12)

    def size(n: int) -> np.ndarray:
        return np.abs(1.0 - 2.0 * n / c) + 1.0

    exponent = np.log(size(2048) / size(256)) / (2048 - 256)
    # Rounding of 1e-16 in a shear grows like the square of the 2048 bounces, to 4e-10 of the vector.
    np.testing.assert_allclose(found["lyapunov_per_bounce"][-1], exponent, rtol=0, atol=1e-9)


@pytest.mark.parametrize("measure", MEASURES)
def test_rotation_numbers_of_the_ellipse(measure):
    """Rotational: F(phi | m) / 2 K(m); librational: the boundary coordinate advances by 1/2 (computed here)."""
    b, turns = 0.8, 0.21
    caustics = np.array([0.2, 0.5])
    p = np.array([momentum_on_caustic(b, caustic, turns) for caustic in [*caustics, 0.7]])
    found = measure(ellipse(b), np.full(3, turns), p, HORIZONS)
    m = (1.0 - b * b) / (1.0 - caustics)
    exact = ellipkinc(np.arcsin(np.sqrt(caustics) / b), m) / (2.0 * ellipk(m))
    # 2048 bounces give about ten digits by the weighted average.
    np.testing.assert_allclose(found["rotation_number"][-1, :2], exact, rtol=0, atol=1e-10)
    np.testing.assert_allclose(found["rotation_number"][-1, 2], 0.5, rtol=0, atol=1e-10)
    assert (found["agreement_digits"][-1] > 6.0).all()


@pytest.mark.parametrize("measure", MEASURES)
def test_exponent_of_the_major_axis(measure):
    """The two-bounce orbit along the major axis of an ellipse: ln((1 + e) / (1 - e)) per bounce, exact."""
    e = 0.4
    # Rounding, about 1e-16, grows by 2.3 a bounce: the orbit stays within 1e-4 of the axis for 32 bounces.
    found = measure(ellipse(math.sqrt(1.0 - e * e)), np.array([0.0]), np.array([0.0]), (16, 32))
    # The stable part of the tangent vector is down to (3/7)^8 after the transient of four bounces.
    np.testing.assert_allclose(found["lyapunov_per_bounce"][-1], math.log((1 + e) / (1 - e)), rtol=2e-3)
    np.testing.assert_allclose(found["mean_chord"], 2.0, rtol=1e-9)


@pytest.mark.parametrize("measure", MEASURES[1:])
def test_they_agree_on_a_table_with_chaos(measure):
    """Same work: over a few bounces rounding has no time to grow, and all numbers agree."""
    rng = np.random.default_rng(1)
    turns, p = rng.random(200), rng.uniform(-0.999, 0.999, 200)
    first = baselines.measure_scalar(limacon(0.2), turns, p, (8, 16))
    second = measure(limacon(0.2), turns, p, (8, 16))
    assert first.keys() == second.keys()
    # Rounding grows by at most e a bounce here: 1e-16 e^16 = 1e-9.
    for name in ("rotation_number", "lyapunov_per_bounce", "mean_chord"):
        np.testing.assert_allclose(first[name], second[name], rtol=0, atol=1e-8, err_msg=name)


def test_mean_chord_of_a_section():
    """Pi A / L over the section for an ellipse (Santalo, 1976): here a grid uniform in ds dp."""
    from scipy.special import ellipe

    b, n = 0.6, 64
    # Midpoints in the eccentric angle, each standing for as many orbits as its arc is long, by weighting.
    turns, p = np.meshgrid((np.arange(n) + 0.5) / n, (np.arange(n) + 0.5) / n * 2.0 - 1.0, indexing="ij")
    angle = 2.0 * math.pi * turns.ravel()
    arc = np.sqrt(np.sin(angle) ** 2 + b * b * np.cos(angle) ** 2)
    chords = baselines.measure_vectorised(ellipse(b), turns.ravel(), p.ravel(), (8,))["mean_chord"]
    exact = math.pi * math.pi * b / (4.0 * ellipe(1.0 - b * b))
    # Midpoint rule: exact in the angle, n^-1.5 = 0.002 in p at the square-root ends.
    assert np.average(chords, weights=arc) == pytest.approx(exact, rel=2e-3)


@pytest.mark.skipif(len(baseline_c.c_targets()) < 2, reason="no C compiler, or a processor without AVX2")
def test_both_builds_in_c_agree():
    """They differ in the width of their vectors alone."""
    rng = np.random.default_rng(2)
    turns, p = rng.random(100), rng.uniform(-0.999, 0.999, 100)
    first, second = (baseline_c.measure_in_c(limacon(0.2), turns, p, (8, 16), target) for target in baseline_c.TARGETS)
    # As above: 1e-16 e^16 = 1e-9.
    np.testing.assert_allclose(first["rotation_number"], second["rotation_number"], rtol=0, atol=1e-8)


@pytest.mark.parametrize(
    ("family", "parameters"),
    [
        ("ellipse", {"eccentricity": 0.6}),
        ("radial_harmonic", {"amplitude": 0.005, "harmonic": 3}),
        ("limacon", {"quadratic": 0.08}),
        ("normal_harmonic", {"eccentricity": 0.6, "amplitude": 0.003, "harmonic": 4, "phase": 0.5}),
    ],
)
@pytest.mark.parametrize("measure", [MEASURES[0], MEASURES[2]])
def test_package_agrees_with_the_baselines(measure, family, parameters):
    """The package's lanes, polynomials and closed forms against libm, Newton and one orbit at a time, and against C."""
    table = build_table(family, **parameters)
    bounces = 64
    s, p = section_points(table, seed=3, replicates=1, orbits=128)
    mine = orbit_numbers(table, s, p, bounces)
    harmonics, unit = bring_to_unit_size(table.harmonics)  # in which the package lets a tangent vector grow
    plain = measure(harmonics, table.turns_from_arc(s), p, horizons(bounces))
    # Rounding, about 1e-15 a bounce, grows by about e^0.1 a bounce at most on these: to 1e-12 after 64, with a
    # thousandfold margin for passages near unstable orbits.
    calm = plain["lyapunov_per_bounce"][-1] < 0.1
    assert calm.mean() > 0.3
    for name in ("rotation_number", "lyapunov_per_bounce"):
        np.testing.assert_allclose(mine[name][calm], plain[name][-1][calm], rtol=0, atol=1e-9, err_msg=name)
    # The chord of a regular orbit is a weighted mean, that of any other a plain one.
    regular = np.isin(mine["verdict"], (REGULAR_ROTATIONAL, REGULAR_LIBRATIONAL))
    chord = np.where(regular, plain["weighted_chord"][-1], plain["mean_chord"])
    np.testing.assert_allclose(mine["mean_chord"][calm], unit * chord[calm], rtol=1e-9)
    # A change of the averages of 1e-7 or more is then the same to a percent in both; inside islands the package
    # follows another frequency, the winding about their centre.
    large = calm & (mine["frequency_diffusion"] > -7.0) & (mine["island_period"] == 0)
    assert large.any()
    np.testing.assert_allclose(
        mine["frequency_diffusion"][large], plain["frequency_diffusion"][-1][large], rtol=0, atol=0.01
    )
