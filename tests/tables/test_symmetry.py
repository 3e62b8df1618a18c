"""Symmetry found from the boundary: none assumed, none overlooked, and the one found really maps points to points."""

import numpy as np
import pytest

from scanner.tables import build_table
from scanner.tables.curve import Curve
from scanner.tables.symmetry import TOLERANCE
from scanner.tables.table import make_table


def table_of(coefficients, shift=0.0, turn=0.0):
    """Table with z(t) = sum_k c_k exp(2 pi i k t), its parameter shifted and itself turned, in turns."""
    highest = max(abs(k) for k in coefficients)
    harmonics = np.zeros((4, highest + 1))
    for k, value in coefficients.items():
        c = complex(value) * np.exp(2j * np.pi * (k * shift + turn))
        # c exp(i k a) = (c cos a + i c sin a) for k > 0, with the sign of the sine turned for k < 0
        side = 1.0 if k > 0 else -1.0
        harmonics[:, abs(k)] += [c.real, -side * c.imag, c.imag, side * c.real]
    return make_table("invented", {}, Curve(harmonics))


@pytest.mark.parametrize(
    ("family", "parameters", "order", "mirrors"),
    [
        ("ellipse", {"eccentricity": 0.6}, 2, True),
        ("ellipse", {"eccentricity": 0.999}, 2, True),
        ("radial_harmonic", {"amplitude": 0.1, "harmonic": 1}, 1, True),
        ("radial_harmonic", {"amplitude": 0.01, "harmonic": 5}, 5, True),
        ("limacon", {"quadratic": 0.1}, 1, True),
        ("curvature_harmonic", {"amplitude": 0.5, "harmonic": 3}, 3, True),
        ("normal_harmonic", {"eccentricity": 0.0, "amplitude": 0.01, "harmonic": 4, "phase": 0.5}, 4, True),
        ("normal_harmonic", {"eccentricity": 0.8, "amplitude": 0.01, "harmonic": 4, "phase": 0.0}, 2, True),
        ("normal_harmonic", {"eccentricity": 0.8, "amplitude": 0.01, "harmonic": 4, "phase": 0.5}, 2, False),
        ("support_harmonic", {"eccentricity": 0.8, "amplitude": 0.01, "harmonic": 5, "phase": 0.0}, 1, True),
        ("support_harmonic", {"eccentricity": 0.8, "amplitude": 0.01, "harmonic": 5, "phase": 0.5}, 1, False),
        ("lame", {"exponent": 2.5, "aspect": 1.0}, 4, True),
        ("lame", {"exponent": 8.0, "aspect": 0.7}, 2, True),
        (
            "random_harmonic",
            {"eccentricity": 0.4, "amplitude": 0.01, "decay": 3.0, "harmonic_max": 12, "realisation": 1},
            1,
            False,
        ),
    ],
)
def test_families_have_the_symmetry_of_their_formula(family, parameters, order, mirrors):
    found = build_table(family, **parameters).symmetry
    assert found.order == order
    assert (found.mirror_s is not None) == mirrors


@pytest.mark.parametrize("family", ["normal_harmonic", "confocal_harmonic", "support_harmonic"])
@pytest.mark.parametrize("harmonic", [2, 3, 4, 7])
def test_symmetry_maps_the_boundary_onto_itself(family, harmonic):
    """A circle with a wave of any phase: points at s + 1/n and at 2 m - s are turned and mirrored points."""
    table = build_table(family, eccentricity=0.0, amplitude=0.3 / harmonic**2, harmonic=harmonic, phase=0.7)
    symmetry = table.symmetry
    assert symmetry.order == harmonic
    s = np.linspace(0.0, 1.0, 50)
    x, y = table.point(s)
    turned = np.exp(2j * np.pi / symmetry.order) * (x + 1j * y)
    # Lengths near 1, arc lengths good to a few 1e-15.
    np.testing.assert_allclose(complex_point(table, s + 1.0 / symmetry.order), turned, atol=1e-13)
    on_line = complex_point(table, symmetry.mirror_s)
    axis = on_line / abs(on_line)
    mirrored = axis * np.conj((x + 1j * y) / axis)
    np.testing.assert_allclose(complex_point(table, 2.0 * symmetry.mirror_s - s), mirrored, atol=1e-13)
    assert 0.0 <= symmetry.mirror_s <= 1.0 / symmetry.order
    assert symmetry.width == 0.5 / symmetry.order


def complex_point(table, s):
    x, y = table.point(s)
    return x + 1j * y


@pytest.mark.parametrize("shift", [0.0, 0.123, 0.77])
@pytest.mark.parametrize("turn", [0.0, 0.31])
@pytest.mark.parametrize(
    ("coefficients", "order", "mirrors"),
    [
        ({1: 1.0, -1: 0.2}, 2, True),
        ({1: 1.0, -1: 0.2, 3: 0.01}, 2, True),
        ({1: 1.0, -1: 0.2, 3: 0.01j}, 2, False),
        ({1: 1.0, -2: 0.03, 4: 0.01}, 3, True),
        ({1: 1.0, -2: 0.03, 4: 0.01 + 0.003j}, 3, False),
        ({1: 1.0, -2: 0.03, 3: 0.01}, 1, True),
        ({1: 1.0, -5: 0.002, 7: 0.002}, 6, True),
        # Ten candidates for the mirror from the sharpest coefficient, one of which the other one takes.
        ({1: 1.0, 11: 0.001, 2: 0.001}, 1, True),
    ],
)
def test_wherever_the_curve_begins_and_points(coefficients, shift, turn, order, mirrors):
    found = table_of(coefficients, shift, turn).symmetry
    assert found.order == order
    assert (found.mirror_s is not None) == mirrors


@pytest.mark.parametrize("amplitude", [1e-3, 1e-6, 1e-9])
def test_the_least_asymmetry_counts(amplitude):
    """Each breaks one symmetry of an ellipse: the turn by half, the mirrors, or both."""
    ellipse = {1: 1.0, -1: 0.2}
    assert (table_of({**ellipse, 2: amplitude}).symmetry.order) == 1
    assert table_of({**ellipse, 2: amplitude}).symmetry.mirror_s is not None
    skew = table_of({**ellipse, 3: amplitude * 1j}).symmetry
    assert (skew.order, skew.mirror_s) == (2, None)
    neither = table_of({**ellipse, 2: amplitude * np.exp(0.4j), 4: amplitude}).symmetry
    assert (neither.order, neither.mirror_s) == (1, None)


def test_many_small_asymmetries_count_together():
    noise = {k: 0.1 * TOLERANCE * np.exp(1j * k * k) for k in range(2, 100)}
    assert table_of({1: 1.0, -1: 0.2, **noise}).symmetry.order == 1


def test_rounding_does_not_count():
    noise = {k: 1e-17 * np.exp(1j * k * k) for k in range(2, 100)}
    found = table_of({1: 1.0, -1: 0.2, **noise}).symmetry
    assert found.order == 2
    assert found.mirror_s == pytest.approx(0.0, abs=1e-15)


def test_a_circle_is_taken_for_an_ellipse():
    for table in (build_table("ellipse", eccentricity=0.0), table_of({1: 2.0}, shift=0.2)):
        assert (table.symmetry.order, table.symmetry.mirror_s) == (2, 0.0)
