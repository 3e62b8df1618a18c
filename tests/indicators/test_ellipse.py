"""Rotation numbers, measures and verdicts on ellipses, all in closed form."""

import math

import numpy as np
import pytest
from scipy.special import ellipe, ellipk, ellipkinc

from scanner import build_table, measure_orbits
from scanner.measure import section_points
from scanner.quantities import REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL


def rotation_number(b: float, lam: np.ndarray) -> np.ndarray:
    """F(phi | m) / (2 K(m)) of rotational motion in the ellipse of semi-axes 1 and b (closed form)."""
    m = (1 - b * b) / (1 - lam)
    return ellipkinc(np.arcsin(np.sqrt(lam) / b), m) / (2 * ellipk(m))


@pytest.mark.parametrize(
    ("a", "b", "lam", "rho"),
    [
        (1.0, 0.8, 0.2, 0.16782257534759835),
        (1.0, 0.8, 0.5, 0.29867213540027684),
        (1.5, 1.0, 0.9, 0.31329695380973673),
    ],
)
def test_rotation_numbers_of_rotational_orbits(a: float, b: float, lam: float, rho: float) -> None:
    """Values computed independently with 40 digits; the ellipse is scaled to semi-major axis 1."""
    b, lam = b / a, lam / a**2
    assert rotation_number(b, np.array(lam)) == pytest.approx(rho, abs=1e-14)
    table = build_table("ellipse", eccentricity=math.sqrt(1 - b * b))
    p = math.sqrt(1 - lam / b**2)  # at the end of the major axis lam = (1 - p^2) b^2
    found = measure_orbits(table, [0.0, 0.0], [p, -p], bounces=8192)
    # The bound that is promised; weighted averages over 8192 bounces reach 1e-13.
    assert found.rotation_number.values == pytest.approx([rho, 1 - rho], abs=1e-10)
    assert np.all(found.verdict == REGULAR_ROTATIONAL)
    assert np.all(found.island_period == 0)


@pytest.mark.parametrize(("a", "b", "lam"), [(1.0, 0.8, 0.7), (1.5, 1.0, 1.5), (2.0, 1.0, 3.5)])
def test_librational_orbits_are_in_the_island_of_period_two(a: float, b: float, lam: float) -> None:
    b, lam = b / a, lam / a**2
    table = build_table("ellipse", eccentricity=math.sqrt(1 - b * b))
    p = math.sqrt(1 - lam)  # at the end of the minor axis lam = 1 - p^2
    found = measure_orbits(table, [0.25], [p], bounces=8192)
    # Each orbit goes from side to side: its advance averages 1/2 up to the window's own error.
    assert found.rotation_number.item() == pytest.approx(0.5, abs=1e-10)
    assert found.verdict.item() == REGULAR_LIBRATIONAL
    assert (found.island_rotation.item(), found.island_period.item()) == (1, 2)


@pytest.mark.parametrize("eccentricity", [0.1, 0.436, 0.6, 0.8, 0.95])
def test_ellipses_come_out_regular(eccentricity: float) -> None:
    """An ellipse has no chaos; its librational part is e / E(e) of the section (closed form)."""
    table = build_table("ellipse", eccentricity=eccentricity)
    s, p = section_points(table, seed=11, replicates=2, orbits=4096)
    found = measure_orbits(table, s, p, bounces=8192)
    librational = found.verdict == REGULAR_LIBRATIONAL
    regular = librational | (found.verdict == REGULAR_ROTATIONAL)
    assert regular.mean() >= 0.995
    x, y = table.point(s)
    b2 = 1 - eccentricity**2
    lam = (1 - p**2) * (y**2 / b2 + b2 * x**2)
    # Each orbit that has a verdict has the right one.
    assert np.all(librational.values[regular.values] == (lam > b2)[regular.values])
    truth = eccentricity / ellipe(eccentricity**2)
    # Sobol' points: 4096 of them resolve the area of a smooth region to about 1e-3, as common practice has it.
    assert librational.mean() == pytest.approx(truth, abs=4e-3 + 0.005)
    rotational = regular.values & ~librational.values & (found.agreement_digits.values > 12)
    rho = rotation_number(math.sqrt(b2), lam[rotational])
    rho = np.where(p[rotational] > 0, rho, 1 - rho)
    # Averages that agree to 12 digits between halves of the window.
    assert found.rotation_number.values[rotational] == pytest.approx(rho, abs=1e-11)


def test_circle_rotation_number_and_chord() -> None:
    """rho = arccos(p) / pi and chord 2 sqrt(1 - p^2) in the unit circle (closed form)."""
    p = np.array([-0.999, -0.3, 0.0, 0.5, 0.9999])
    found = measure_orbits(build_table("ellipse", eccentricity=0.0), np.zeros(5), p, bounces=1000)
    assert found.rotation_number.values == pytest.approx(np.arccos(p) / math.pi, abs=1e-13)
    # p = 0 and p = 1/2 make a diameter and a triangle, but a circle has no islands about them.
    assert np.all(found.verdict == REGULAR_ROTATIONAL)
    assert np.all(found.island_period == 0)
    assert np.all(found.verdict_by_horizon == REGULAR_ROTATIONAL)
    # Their frequency is known all the same: that of any other invariant curve, to 12 digits and more.
    assert np.all(found.frequency_diffusion < -12)
    assert found.mean_chord.values == pytest.approx(2 * np.sqrt(1 - p**2), abs=1e-13)
    # The vector (1, 1) / 2 grows to (1 - 2 n / cos, 1) / 2: ln of its size over the bounces after the transient.
    growth = [np.log(2 * n / np.sqrt(1 - p**2)) for n in (125, 1000)]
    assert found.lyapunov_per_bounce.values == pytest.approx((growth[1] - growth[0]) / 875, rel=1e-2)
