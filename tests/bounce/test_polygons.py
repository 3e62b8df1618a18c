import itertools
import math
from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import minimize, root

from scanner.bounce.resonances import resonance_numbers
from scanner.bounce.return_map import return_map
from scanner.errors import TableError
from scanner.quantities import rotations_up_to
from scanner.tables import build_table

ROTATIONS = rotations_up_to(8)


def numbers_at(table, p, q):
    return {name: float(values[0]) for name, values in resonance_numbers(table, [(p, q)]).items()}


def test_rotations_are_those_in_lowest_terms_up_to_one_half():
    assert ROTATIONS == [(1, 2), (1, 3), (1, 4), (1, 5), (2, 5), (1, 6), (1, 7), (2, 7), (3, 7), (1, 8), (3, 8)]


@pytest.mark.parametrize("eccentricity", [0.3, 0.8, 0.97])
def test_resonant_lengths_of_an_ellipse(eccentricity):
    """Closed forms; all polygons of one rotation have one length (Poncelet)."""
    table = build_table("ellipse", eccentricity=eccentricity)
    square = (1.0 - eccentricity) * (1.0 + eccentricity)
    d = math.sqrt(1.0 - square + square * square)
    exact = {
        (1, 3): 2.0 * (d + 1.0 + square) * math.sqrt(2.0 * d - 1.0 - square) / eccentricity**2,
        (1, 4): 4.0 * math.sqrt(1.0 + square),
        (1, 6): 4.0 * (1.0 + math.sqrt(square) + square) / (1.0 + math.sqrt(square)),
    }
    found = resonance_numbers(table, ROTATIONS)
    for rotation, length in exact.items():
        # 1e-14 for the rounding of the lengths; the closed form of 1/3 cancels as the square of the eccentricity.
        assert found["length_maximal"][ROTATIONS.index(rotation)] == pytest.approx(length, rel=2e-14)
    gaps = np.abs(found["length_gap"][1:])
    assert gaps.max() < 1e-12 * table.perimeter
    assert (gaps <= found["length_gap_floor"][1:]).all()
    assert found["length_gap_floor"].max() < 1e-14 * table.perimeter
    # Every orbit of a resonant curve is parabolic; at a curvature of 17 the product of the maps loses ten digits.
    np.testing.assert_allclose(found["trace_minimax"][1:], 2.0, atol=1e-9 if eccentricity < 0.9 else 5e-3)


def test_polygons_of_a_circle():
    found = resonance_numbers(build_table("ellipse", eccentricity=0.0), ROTATIONS)
    p, q = np.array(ROTATIONS).T
    np.testing.assert_allclose(found["length_maximal"], 2.0 * q * np.sin(np.pi * p / q), rtol=1e-15)
    np.testing.assert_allclose(found["p_first"], np.cos(np.pi * p / q), atol=1e-14)
    assert (np.abs(found["length_gap"]) <= found["length_gap_floor"]).all()


@pytest.mark.parametrize(("p", "q", "harmonic"), [(1, 2, 4), (1, 3, 3), (1, 4, 4), (2, 5, 5), (1, 6, 6), (3, 8, 8)])
@pytest.mark.parametrize("amplitude", [1e-3, 1e-9])
def test_gap_of_a_resonance_that_opens_at_once(p, q, harmonic, amplitude):
    """Exact for r = 1 + amplitude cos(harmonic phi), q dividing the harmonic (Ramirez-Ros 2006, from memory)."""
    found = numbers_at(build_table("radial_harmonic", amplitude=amplitude, harmonic=harmonic), p, q)
    exact = 4.0 * amplitude * q * math.sin(math.pi * p / q)
    assert abs(found["length_gap"] - exact) <= found["length_gap_floor"] < 2e-14
    assert found["trace_maximal"] > 2.0 > found["trace_minimax"] > -2.0
    assert found["residue_maximal"] < 0.0 < found["residue_minimax"] < 1.0


@pytest.mark.parametrize(
    ("p", "q", "harmonic", "order"),
    [(1, 3, 2, 3), (1, 4, 2, 2), (2, 5, 2, 5), (1, 6, 2, 3), (1, 2, 3, 2), (1, 4, 3, 4), (1, 6, 4, 3), (1, 8, 3, 8)],
)
def test_power_of_the_amplitude_at_which_a_gap_opens(p, q, harmonic, order):
    """The lowest m for which q divides m times the harmonic: lower orders have no harmonic that could break it."""
    amplitudes = np.geomspace(0.003, 0.03, 5) * (5.0 if harmonic == 2 else 2.0 if order > 4 else 1.0) / harmonic
    gaps = [numbers_at(build_table("radial_harmonic", amplitude=a, harmonic=harmonic), p, q) for a in amplitudes]
    above = [n["length_gap"] > 10.0 * n["length_gap_floor"] for n in gaps]
    slopes = np.diff(np.log([n["length_gap"] for n in gaps])) / np.diff(np.log(amplitudes))
    resolved = slopes[np.array(above)[:-1]]
    # The next order bends the line by up to a tenth over the decade; at its lower end that is a hundredth.
    assert resolved[0] == pytest.approx(order, abs=0.1)
    assert len(resolved) >= 3


def test_limit_of_many_vertices():
    """L - L_1/q tends to C^3 / (24 q^2), C the integral of kappa^(2/3) (Marvizi and Melrose 1982, from memory)."""
    table = build_table("ellipse", eccentricity=math.sqrt(1.0 - 1.0 / 1.69))
    found = resonance_numbers(table, [(1, 16), (1, 32)])
    coarse, fine = (q * q * (table.perimeter - found["length_maximal"][row]) for row, q in enumerate((16, 32)))
    # The value for semi-axes 1.3 and 1 was computed here with 40 digits; the series goes on with q^-2, then q^-4.
    assert fine + (fine - coarse) / 3.0 == pytest.approx(11.6333501194 / 1.3, rel=2e-5)


def test_traces_of_two_bounce_orbits():
    """Closed forms of 4 (l/R0 - 1)(l/R1 - 1) - 2."""
    e = 0.8
    ellipse = numbers_at(build_table("ellipse", eccentricity=e), 1, 2)
    growth = ((1.0 + e) / (1.0 - e)) ** 2
    assert ellipse["trace_maximal"] == pytest.approx(growth + 1.0 / growth, rel=1e-13)
    assert ellipse["trace_minimax"] == pytest.approx(2.0 * math.cos(4.0 * math.asin(0.6)), abs=1e-12)
    assert (ellipse["p_first"], ellipse["s_first_minimax"]) == pytest.approx((0.0, 0.25), abs=1e-14)
    radial = numbers_at(build_table("radial_harmonic", amplitude=0.05, harmonic=2), 1, 2)
    assert radial["trace_maximal"] == pytest.approx(5.6281179138322, rel=1e-13)
    assert radial["trace_minimax"] == pytest.approx(-0.6592797783933518, rel=1e-12)
    limacon = numbers_at(build_table("limacon", quadratic=0.1), 1, 2)
    assert 2.0 - 64.0 * 0.01 / 0.96**2 == pytest.approx(limacon["trace_minimax"], rel=1e-12)


UNEVEN = {
    "family": "normal_harmonic", "eccentricity": 0.5, "amplitude": 0.01, "harmonic": 3, "phase": 0.7
}  # fmt: skip
RANDOM = {
    "family": "random_harmonic", "eccentricity": 0.4, "amplitude": 0.004, "decay": 3.0, "harmonic_max": 6,
    "realisation": 2,
}  # fmt: skip


@pytest.mark.parametrize("shape", [UNEVEN, RANDOM])
@pytest.mark.parametrize(("p", "q"), [(1, 2), (1, 3), (2, 5)])
def test_tables_without_symmetry_against_a_slow_search(shape, p, q):
    """All critical polygons from many starts by scipy: one is a maximum, the others have one direction upwards."""
    table = build_table(**shape)

    def points(turns):
        angles = 2.0 * np.pi * np.outer(np.arange(table.harmonics.shape[1]), turns)
        return table.harmonics[[0, 2]] @ np.cos(angles) + table.harmonics[[1, 3]] @ np.sin(angles)

    def length(turns):
        return np.hypot(*(np.roll(points(turns), -1, axis=1) - points(turns))).sum()

    def slopes(turns):
        angles = 2.0 * np.pi * np.outer(order := np.arange(table.harmonics.shape[1]), turns)
        tangent = (table.harmonics[[1, 3]] * order) @ np.cos(angles) - (table.harmonics[[0, 2]] * order) @ np.sin(
            angles
        )
        chords = np.roll(points(turns), -1, axis=1) - points(turns)
        units = chords / np.hypot(*chords)
        return (tangent * (np.roll(units, 1, axis=1) - units)).sum(axis=0)

    critical = set()
    for phase in np.arange(24) / (24 * q):
        start = phase + np.arange(q) * p / q
        best = minimize(lambda t: -length(t), start, jac=lambda t: -2.0 * np.pi * slopes(t), tol=1e-9)
        for turns in (best.x, start):
            solved = root(slopes, turns, tol=1e-14)
            if np.abs(slopes(solved.x)).max() < 1e-12 and np.all(np.diff(solved.x) > 0.0):
                if abs(np.diff(solved.x).sum() - (q - 1) * p / q) < 0.3 / q:
                    critical.add(round(length(solved.x), 11))
    found = numbers_at(table, p, q)
    assert len(critical) >= 2
    assert found["length_maximal"] == pytest.approx(max(critical), abs=2e-11)
    assert found["length_minimax"] == pytest.approx(min(critical), abs=2e-11)


def test_strongly_deformed_tables_still_have_both_orbits():
    """Birkhoff's theorem: the map, followed from the first vertex, closes after q bounces and p rounds."""
    shapes = [{"amplitude": 0.99 / (1 + k * k), "harmonic": k, "family": "radial_harmonic"} for k in (2, 3, 5)]
    for shape in [*shapes, {"family": "lame", "exponent": 4.0, "aspect": 0.8}]:
        table = build_table(**shape)
        found = resonance_numbers(table, ROTATIONS)
        assert (found["length_gap"] > 0.0).all()
        p, q = np.array(ROTATIONS).T.copy()
        for kind, suffix in (("maximal", ""), ("minimax", "_minimax")):
            turns = table.turns_from_arc(found[f"s_first{suffix}"])
            back = return_map(table.harmonics.copy(), turns, found[f"p_first{suffix}"], q, p)
            # The start is rounded to 1e-16 and the map stretches that by its trace, up to 3e6.
            room = 1e-14 * (1.0 + np.abs(found[f"trace_{kind}"]))
            assert (np.abs(back.shift) < room).all()
            assert (np.abs(back.p - found[f"p_first{suffix}"]) < room).all()


def test_results_scale_with_the_unit_of_length():
    """A user's table in other units: the same orbits, the lengths in proportion."""
    one = build_table("radial_harmonic", amplitude=0.02, harmonic=3)
    found = resonance_numbers(one, ROTATIONS)
    harmonics = 1024.0 * one.harmonics
    harmonics.setflags(write=False)  # as of any table, or the kernels are compiled once more
    scaled = replace(one, harmonics=harmonics, perimeter=1024.0 * one.perimeter)
    for name, values in resonance_numbers(scaled, ROTATIONS).items():
        unit = 1024.0 if name.startswith("length") else 1.0
        np.testing.assert_allclose(values / unit, found[name], rtol=1e-11, atol=1e-13)


def test_a_table_that_is_not_convex_is_refused():
    with pytest.raises(TableError, match="orbits need a convex table"):
        resonance_numbers(
            build_table("radial_harmonic", amplitude=0.3, harmonic=2), list(itertools.islice(ROTATIONS, 1))
        )
