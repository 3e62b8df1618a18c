"""The winding about the centres of islands against closed forms."""

import math

import numpy as np
import pytest
from scipy.special import ellipk, ellipkinc

from scanner import build_table, measure_orbits
from scanner.bounce.return_map import return_map
from scanner.indicators.islands import widest_gap
from scanner.measure import section_points
from scanner.quantities import CHAOTIC, REGULAR_LIBRATIONAL


@pytest.mark.parametrize(
    ("a", "b", "lam", "rho"),
    [
        (1.0, 0.8, 0.7, 0.35401329474774559),
        (1.5, 1.0, 1.5, 0.26841979447532681),
        (2.0, 1.0, 3.5, 0.17305358417163284),
    ],
)
def test_librational_winding_of_an_ellipse(a: float, b: float, lam: float, rho: float) -> None:
    """The twofold map winds about the two-bounce orbit by 2 rho, folded (values computed independently, 40 digits)."""
    b, lam = b / a, lam / a**2
    table = build_table("ellipse", eccentricity=math.sqrt(1 - b * b))
    found = measure_orbits(table, [0.25, 0.75], [math.sqrt(1 - lam), -math.sqrt(1 - lam)], bounces=8192)
    assert found.island_winding.values == pytest.approx(abs(2 * rho - round(2 * rho)), abs=1e-9)
    assert found.island_centre_s.values == pytest.approx([0.25, 0.75], abs=1e-12)
    assert found.island_centre_p.values == pytest.approx(0.0, abs=1e-12)
    # Both halves of the last bounces agree on nine digits at least.
    assert np.all(found.frequency_diffusion < -9)


def test_windings_over_a_whole_ellipse() -> None:
    table = build_table("ellipse", eccentricity=0.8)
    rng = np.random.default_rng(6)
    s, p = rng.random(1024), 2 * rng.random(1024) - 1
    found = measure_orbits(table, s, p, bounces=8192)
    x, y = table.point(s)
    lam = (1 - p**2) * (y**2 / 0.36 + 0.36 * x**2)
    island = found.verdict.values == REGULAR_LIBRATIONAL
    rho = ellipkinc(np.arcsin(0.6 / np.sqrt(lam[island])), (1 - lam[island]) / 0.64) / (
        2 * ellipk((1 - lam[island]) / 0.64)
    )
    error = np.abs(found.island_winding.values[island] - np.abs(2 * rho - np.rint(2 * rho)))
    assert np.isfinite(error).mean() > 0.99
    # Where the two halves agree on seven digits the whole is better.  Next to the separatrix they do not, nor where
    # the orbit was left after few bounces.
    settled = found.frequency_diffusion.values[island] < -7
    assert settled.mean() > 0.7
    assert error[settled].max() < 1e-7
    assert np.nanmedian(error) < 1e-9


def test_winding_tends_to_the_angle_of_the_centre() -> None:
    """Close to an elliptic point the winding is that of its tangent map: trace = 2 cos(2 pi winding)."""
    table = build_table("radial_harmonic", amplitude=0.05, harmonic=2)
    found = measure_orbits(table, [0.2501], [0.0], bounces=4096)
    turns = table.turns_from_arc(found.island_centre_s.values)
    at = return_map(table.harmonics.copy(), turns, found.island_centre_p.values, np.array([2]), np.array([1]))
    # The winding changes with the square of the distance from the centre, 1e-4.
    assert 2 * math.cos(2 * math.pi * found.island_winding.item()) == pytest.approx(at.trace.item(), abs=1e-5)
    assert at.trace.item() == pytest.approx(-0.6592797783933518, abs=1e-10)


def test_orbits_outside_islands_have_no_winding() -> None:
    found = measure_orbits(build_table("ellipse", eccentricity=0.5), [0.1], [0.9], bounces=1024)
    assert found.island_period.item() == 0
    assert np.isnan(found.island_winding.item())
    assert np.isnan(found.island_centre_s.item())


def test_widest_gap_of_steps_on_the_circle() -> None:
    assert widest_gap(np.array([0.95, 0.05, 0.1])) == pytest.approx(0.53, abs=0.01)
    assert widest_gap(np.array([0.4, 0.6])) == pytest.approx(0.0, abs=0.01)
    assert widest_gap(np.linspace(0.0, 1.0, 500, endpoint=False)) == -1.0
    assert widest_gap(np.array([0.1, np.nan])) == -1.0


def test_an_orbit_does_not_depend_on_its_neighbours() -> None:
    """Each orbit's numbers are the same to the bit, whatever shares its block; a chaotic one would show a rounding."""
    table = build_table("radial_harmonic", amplitude=0.06, harmonic=3)
    rng = np.random.default_rng(9)
    s, p = rng.random(150), 2 * rng.random(150) - 1
    together = measure_orbits(table, s, p, bounces=1024)
    assert set(np.unique(together.verdict)) >= {REGULAR_LIBRATIONAL, CHAOTIC}
    order = rng.permutation(150)[:70]
    apart = measure_orbits(table, s[order], p[order], bounces=1024)
    for name in together.data_vars:
        assert np.array_equal(together[name].values[order], apart[name].values, equal_nan=True), name


def test_orbits_about_a_parabolic_centre_are_in_an_island() -> None:
    """At its convexity limit the quadrupole has flat ends, where the two-bounce orbit has trace 2 (closed form)."""
    table = build_table("radial_harmonic", amplitude=0.2, harmonic=2)
    found = measure_orbits(table, [0.25, 0.255], [0.02, 0.01], bounces=4096)
    assert np.all(found.verdict == REGULAR_LIBRATIONAL)
    assert np.all(found.island_period == 2)
    # Its winding tends to nothing, and the tangent map does not say how: it is left open.
    assert np.isnan(found.island_winding).all()


def test_a_centre_at_the_origin_of_the_boundary_is_there_to_whichever_side_it_is_rounded():
    """The limacon's axis of symmetry meets its boundary at the origin and half-way round: islands lie on it."""
    table = build_table("limacon", quadratic=0.1)
    s, p = section_points(table, 1, 1, 256)
    centre = measure_orbits(table, s, p, 2048).island_centre_s.values
    centre = centre[np.isfinite(centre)]
    # Newton's last step is below 1e-13.
    assert (np.abs(centre - np.rint(centre)) < 1e-12).any()
    assert ((centre >= 0.0) & (centre < 1.0 - 1e-12)).all()
