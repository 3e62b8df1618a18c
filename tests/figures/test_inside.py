"""Orbits in their table as a figure, and caustics against those of the circle and of the ellipse."""

import numpy as np
import pytest
from legibility import assert_legible
from matplotlib.colors import to_hex
from synthetic import invented_sweep

from scanner import build_table, trace
from scanner.errors import ScannerError
from scanner.figures import Request
from scanner.figures.caustics import find_caustic
from scanner.figures.colours import VERDICT_COLOURS
from scanner.figures.drawing import draw_figure
from scanner.figures.inside import choose_starts, draw_inside
from scanner.quantities import VERDICTS

BOUNCES = 4096


def caustic_of(table, s, p, bounces=BOUNCES):
    orbit = trace(table, s, p, bounces).isel(orbit=0)
    return find_caustic(*(orbit[name].values for name in ("x", "y", "s", "p")))


def test_caustic_of_a_circle_is_a_circle_of_radius_p():
    """All chords of an orbit of the unit circle lie at the distance |p| from its centre (elementary)."""
    caustic = caustic_of(build_table("ellipse", eccentricity=0.0), 0.1, -0.37)
    assert len(caustic.points) > 1000
    # returns within 1e-2 and an error of their second power, far less where the curve is a straight line p = const
    np.testing.assert_allclose(np.hypot(*caustic.points.T), 0.37, atol=1e-6)


@pytest.mark.parametrize(("s", "p", "hyperbola"), [(0.2, 0.6, False), (0.27, 0.1, True)])
def test_caustic_of_an_ellipse_is_a_confocal_conic(s, p, hyperbola):
    """x^2/(1 - m) + y^2/(b^2 - m) = 1 with m = b^2 - b^2 (a conserved product); Tabachnikov, Geometry and Billiards."""
    eccentricity = 0.6
    caustic = caustic_of(build_table("ellipse", eccentricity=eccentricity), s, p)
    x, y = caustic.points.T
    square, focus = 1.0 - eccentricity**2, eccentricity**2
    # solve x^2/(1 - m) + y^2/(b^2 - m) = 1 for m point by point: the smaller root is the ellipse, the larger the other
    half = 0.5 * (1.0 + square - x**2 - y**2)
    product = square - x**2 * square - y**2
    root = np.sqrt(half**2 - product)
    m = half + root if hyperbola else half - root
    assert (m > square).all() == hyperbola
    assert (1.0 - m < focus).all() == hyperbola
    assert np.ptp(m) < 1e-4  # second power of returns within 1e-2
    # and the chords touch it
    normal = np.column_stack([x / (1.0 - m), y / (square - m)])
    normal /= np.hypot(*normal.T)[:, None]
    assert np.abs((normal * caustic.tangents).sum(axis=1)).max() < 1e-2


def test_chaotic_and_periodic_orbits_have_no_caustic():
    assert caustic_of(build_table("limacon", quadratic=0.24), 0.21, 0.3) is None
    circle = build_table("ellipse", eccentricity=0.0)
    assert caustic_of(circle, 0.0, 0.5) is None  # a triangle or hexagon: p = cos(pi k/q)


@pytest.fixture(scope="module")
def tree():
    found = invented_sweep({"amplitude": [0.0, 0.05]}, title="Quadrupoles", convex_below=9.0)
    study = found.attrs["study"].replace("invented", "radial_harmonic").replace("decay = 2.5", "harmonic = 2")
    found.attrs["study"] = study
    return found


def test_chords_are_those_of_the_orbits_named(tree):
    request = Request(kind="table", select={"amplitude": 0.05}, s=0.25, p=(0.05, 0.95), bounces=30)
    axes = draw_figure(tree, request)[0].axes
    table = build_table("radial_harmonic", amplitude=0.05, harmonic=2)
    orbits = trace(table, [0.25, 0.25], [0.05, 0.95], 30)
    assert len(axes) == 2
    for place, plot in enumerate(axes):
        np.testing.assert_array_equal(plot.lines[0].get_xdata(), orbits["x"].values[place])
        np.testing.assert_array_equal(plot.lines[0].get_ydata(), orbits["y"].values[place])
        boundary = plot.patches[0].get_xy()
        np.testing.assert_allclose(boundary[0], boundary[-1], atol=1e-12)  # closed, to rounding
    assert "island 1/2" in axes[0].get_xlabel()  # about the short diameter
    assert to_hex(axes[1].lines[0].get_color()) == VERDICT_COLOURS["regular_rotational"].lower()


def test_stored_orbits_of_each_sort_are_chosen(tree):
    orbits = tree["orbits"].to_dataset().isel(amplitude=1)
    s, p = choose_starts(orbits)
    chosen = [int(np.flatnonzero(orbits["s0"].values == value)[0]) for value in s]
    np.testing.assert_array_equal(orbits["p0"].values[chosen], p)
    sorts = {VERDICTS[orbits["verdict"].values[place]] for place in chosen}
    assert sorts == {VERDICTS[code] for code in np.unique(orbits["verdict"].values)}
    undecided = orbits.assign(verdict=orbits["verdict"] * 0 + 4)
    with pytest.raises(ScannerError, match="name starts with --s and --p"):
        choose_starts(undecided)


@pytest.mark.parametrize(("width", "count"), [("single", 3), ("double", 2)])
def test_nothing_is_cut_off(tree, width, count):
    p = tuple(np.linspace(0.05, 0.95, count))
    assert_legible(draw_figure(tree, Request(kind="table", select={"amplitude": 0.05}, p=p, width=width))[0])


def test_what_cannot_be_drawn_is_refused_in_one_line(tree):
    table = build_table("ellipse", eccentricity=0.0)
    with pytest.raises(ScannerError, match="9 orbits are too many for one figure, at most 8"):
        draw_inside(table, [0.0] * 9, [0.1] * 9, 10, 64, "single")
    with pytest.raises(ScannerError, match="chords cannot be told apart, at most 20000"):
        draw_inside(table, [0.0], [0.1], 10**6, 64, "single")
    with pytest.raises(ScannerError, match="a table shows one table"):
        draw_figure(tree, Request(kind="table"))


def test_code_of_the_users_own_runs_only_when_allowed(tmp_path, monkeypatch):
    (tmp_path / "round_tables.py").write_text("def circle(size):\n    return [[0, size], [0, 0], [0, 0], [0, size]]\n")
    monkeypatch.syspath_prepend(tmp_path)
    own = invented_sweep({"size": [1.0]})
    study = own.attrs["study"].replace("invented", "round_tables:circle").replace("decay = 2.5\n", "")
    own.attrs["study"] = study
    one = {"size": 1.0}
    for kind, starts in (("table", (0.3,)), ("frequency", ())):
        with pytest.raises(ScannerError, match="allow it with --allow-code"):
            draw_figure(own, Request(kind=kind, select=one, p=starts))
    axes = draw_figure(own, Request(kind="table", select=one, p=(0.3,), allow_code=True))[0].axes[0]
    np.testing.assert_allclose(np.hypot(*axes.patches[0].get_xy().T), 1.0, rtol=1e-12)  # rounding
