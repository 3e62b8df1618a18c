import mpmath as mp
import numpy as np
import pytest
import slow_tables
from scipy.special import ellipe

from scanner.tables import FAMILIES, build_table
from scanner.tables.boundary import evaluate

DEFORMED = {"amplitude": 0.008, "harmonic": 3, "phase": 0.7}

CASES = [
    ("ellipse", {"eccentricity": 0.6}),
    ("radial_harmonic", {"amplitude": 0.09, "harmonic": 3}),
    ("radial_harmonic", {"amplitude": 0.3, "harmonic": 1}),
    ("limacon", {"quadratic": 0.2}),
    *(
        (family, {"eccentricity": eccentricity, **DEFORMED})
        for family in ("normal_harmonic", "confocal_harmonic", "support_harmonic")
        for eccentricity in (0.0, 1e-9, 0.6, 0.95)
    ),
    ("curvature_harmonic", {"amplitude": 0.8, "harmonic": 2}),
    ("curvature_harmonic", {"amplitude": 0.5, "harmonic": 5}),
    ("lame", {"exponent": 4.0, "aspect": 0.7}),
    ("lame", {"exponent": 2.0, "aspect": 1.5}),
]


@pytest.mark.parametrize(("family", "parameters"), CASES)
def test_boundary_is_that_of_the_slow_twin(family, parameters):
    table = build_table(family, **parameters)
    turns = np.random.default_rng(1).uniform(-1, 2, 12)
    x, y = evaluate(table.harmonics, turns)[:2]
    twin = getattr(slow_tables, family)
    exact = np.array([[float(v) for v in twin(mp.mpf(t), **parameters)] for t in turns]).T
    # Harmonics below 1e-14 are left out, and the size is about 1.
    assert np.abs([x, y] - exact).max() < 2e-14
    assert table.boundary_error < 2e-14


@pytest.mark.parametrize(("family", "parameters"), CASES)
def test_boundary_runs_counter_clockwise_and_arc_length_is_that_of_the_speed(family, parameters):
    table = build_table(family, **parameters)
    fine = np.arange(4096) / 4096
    x, y, dx, dy, *_ = evaluate(table.harmonics, fine)
    speed = np.hypot(dx, dy)
    assert (x * dy - y * dx).mean() * np.pi == pytest.approx(table.area, rel=1e-14)  # Green's theorem
    assert speed.mean() * 2 * np.pi == pytest.approx(table.perimeter, rel=1e-14)
    # The derivative of the arc length is the speed; 1e-12 because k times the harmonics left out is.
    ahead, behind = table.arc_from_turns(fine + 1e-4), table.arc_from_turns(fine - 1e-4)
    gauss = evaluate(table.harmonics, np.concatenate([fine + 1e-4 * node for node in NODES]))
    lengths = (np.hypot(gauss[2], gauss[3]).reshape(len(NODES), -1) * WEIGHTS[:, None]).sum(axis=0) * 1e-4 * 2 * np.pi
    assert np.abs((ahead - behind) * table.perimeter - lengths).max() < 1e-14


NODES, WEIGHTS = np.polynomial.legendre.leggauss(5)


@pytest.mark.parametrize("family", FAMILIES)
def test_every_family_says_what_it_is(family):
    described = FAMILIES[family]
    assert described.name == family
    assert described.formula
    assert all(parameter.meaning for parameter in described.parameters)


@pytest.mark.parametrize("eccentricity", [0.0, 0.3, 0.9, 0.999])
def test_ellipse_has_the_perimeter_and_the_curvature_of_closed_form(eccentricity):
    table = build_table("ellipse", eccentricity=eccentricity)
    b = np.sqrt((1 - eccentricity) * (1 + eccentricity))
    assert table.harmonics.shape == (4, 2)
    assert table.perimeter == pytest.approx(4 * ellipe(eccentricity**2), rel=4e-16)
    assert table.area == pytest.approx(np.pi * b, rel=4e-16)
    assert table.curvature_min == pytest.approx(b, rel=1e-13)  # the refined place is exact to 1e-9, squared
    assert table.curvature_max == pytest.approx(1 / b**2, rel=1e-13)
    assert table.mean_chord_exact == pytest.approx(np.pi * table.area / table.perimeter, rel=1e-15)  # Santalo 1976


def test_radial_limacon_and_curvature_tables_have_the_sizes_of_closed_form():
    radial = build_table("radial_harmonic", amplitude=0.1, harmonic=2)
    assert radial.area == pytest.approx(np.pi * (1 + 0.1**2 / 2), rel=4e-16)
    limacon = build_table("limacon", quadratic=0.2)
    assert limacon.area == pytest.approx(np.pi * (1 + 2 * 0.2**2), rel=4e-16)  # Robnik 1983, from memory
    assert limacon.perimeter == pytest.approx(4 * 1.4 * ellipe(8 * 0.2 / 1.4**2), rel=4e-16)
    for harmonic in (2, 4, 7):
        table = build_table("curvature_harmonic", amplitude=0.6, harmonic=harmonic)
        assert table.perimeter == pytest.approx(2 * np.pi, rel=4e-16)
        assert table.area == pytest.approx(np.pi * (1 - 0.6**2 / (2 * (harmonic**2 - 1))), rel=4e-16)
        assert (table.curvature_min, table.curvature_max) == pytest.approx((1 / 1.6, 1 / 0.4), rel=1e-15)


def test_perimeter_of_a_support_function_is_its_mean_alone():
    # Cauchy's formula: the perimeter is the integral of the support function, which no wave changes.
    deformed = build_table("support_harmonic", eccentricity=0.6, **DEFORMED)
    assert deformed.perimeter == pytest.approx(4 * ellipe(0.36), rel=1e-14)


def test_radial_harmonic_of_order_one_is_the_limacon_shifted():
    radial = build_table("radial_harmonic", amplitude=0.3, harmonic=1)
    limacon = build_table("limacon", quadratic=0.15)
    s = np.linspace(0, 1, 101)
    x, y = radial.point(s)
    u, v = limacon.point(s)
    assert np.hypot(x - 0.15 - u, y - v).max() < 1e-15
    assert radial.perimeter == pytest.approx(limacon.perimeter, rel=4e-16)


@pytest.mark.parametrize("family", ["normal_harmonic", "confocal_harmonic", "support_harmonic"])
@pytest.mark.parametrize("eccentricity", [0.0, 0.8, 0.999])
def test_no_amplitude_is_the_undeformed_ellipse(family, eccentricity):
    table = build_table(family, eccentricity=eccentricity, amplitude=0.0, harmonic=300, phase=1.0)
    ellipse = build_table("ellipse", eccentricity=eccentricity)
    assert np.array_equal(table.harmonics, ellipse.harmonics)
    assert table.perimeter == ellipse.perimeter


def test_no_amplitude_is_the_circle():
    for family in ("radial_harmonic", "curvature_harmonic"):
        table = build_table(family, amplitude=0.0, harmonic=9)
        assert table.harmonics.shape == (4, 2)
        assert (table.curvature_min, table.curvature_max) == pytest.approx((1, 1), rel=1e-15)


@pytest.mark.parametrize("eccentricity", [1e-3, 1e-6, 1e-12])
def test_confocal_family_tends_to_the_deformed_circle(eccentricity):
    near = build_table("confocal_harmonic", eccentricity=eccentricity, **DEFORMED)
    limit = build_table("confocal_harmonic", eccentricity=0.0, **DEFORMED)
    s = np.linspace(0, 1, 50)
    assert np.abs(np.array(near.point(s)) - limit.point(s)).max() < eccentricity**2 + 1e-15


@pytest.mark.parametrize(("family", "parameters"), [*CASES, ("ellipse", {"eccentricity": 0.9999})])
def test_arc_length_and_parameter_are_inverse(family, parameters):
    table = build_table(family, **parameters)
    s = np.concatenate([np.random.default_rng(2).uniform(-2, 2, 200), [0.0, 1.0, -1.0]])
    assert np.abs(table.arc_from_turns(table.turns_from_arc(s)) - s).max() < 5e-16  # rounding of numbers up to 2
    assert table.turns_from_arc([[0.0, 1.0]]).tolist() == [[0.0, 1.0]]


def test_arc_length_matches_the_incomplete_elliptic_integral():
    # computed here: the arc from the end of the major axis by quadrature of the speed
    table = build_table("ellipse", eccentricity=0.8)
    for turns in (0.05, 0.3, 0.77):
        speed = lambda tau: mp.sqrt(mp.sin(tau) ** 2 + mp.mpf("0.36") * mp.cos(tau) ** 2)  # noqa: E731
        exact = mp.quad(speed, [0, 2 * mp.pi * turns]) / (4 * mp.ellipe(mp.mpf("0.64")))
        assert float(table.arc_from_turns(turns)) == pytest.approx(float(exact), abs=1e-15)
