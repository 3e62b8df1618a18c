"""What notebooks show: cards of tables and studies, and axes that say what they are."""

from __future__ import annotations

from xml.etree import ElementTree

import numpy as np
import pytest
from sweeps import grid

import scanner
from scanner.cards import MARGIN, SIDE
from scanner.study import parse_study

SVG = "{http://www.w3.org/2000/svg}"


def drawn(card: str) -> tuple[list[np.ndarray], list[ElementTree.Element], dict[str, str]]:
    """Points of the outlines of a card, their elements, and its facts."""
    tree = ElementTree.fromstring(card)
    paths = tree.findall(f".//{SVG}path")
    points = [np.array([step.split(",") for step in path.get("d")[1:-2].split(" L")], dtype=float) for path in paths]
    facts = {row.find("th").text: row.find("td").text for row in tree.iter("tr")}
    return points, paths, facts


def test_a_table_is_drawn_to_scale_with_its_numbers():
    table = scanner.build_table("ellipse", eccentricity=0.8)
    (points,), _, facts = drawn(table._repr_html_())
    x, y = (points - MARGIN).T / SIDE * 2 - [[1.0], [0.6]]
    # two decimals of a pixel in a hundred
    np.testing.assert_allclose(x**2 + (y / 0.6) ** 2, 1.0, atol=3e-4)
    assert facts["area"] == f"{np.pi * 0.6:.6g} length²"
    assert facts["curvature"] == "0.6 to 2.77778 per length"  # b / a^2 and a / b^2
    assert facts["eccentricity"] == "0.8"
    assert facts["shape"] == "convex"


def test_the_outline_goes_counter_clockwise_on_the_page():
    (points,), _, _ = drawn(scanner.build_table("limacon", quadratic=0.2)._repr_html_())
    x, y = points.T
    assert (x * np.roll(y, -1) - np.roll(x, -1) * y).sum() < 0.0  # y goes down on a page


def test_a_table_that_is_not_convex_is_dashed_and_says_why():
    _, (path,), facts = drawn(scanner.build_table("radial_harmonic", amplitude=0.3, harmonic=2)._repr_html_())
    assert path.get("stroke-dasharray")
    assert facts["shape"].startswith("not convex: curvature -1.02")


def test_a_study_shows_its_first_and_last_table():
    study = grid()
    points, (first, last), facts = drawn(study._repr_html_())
    assert float(first.get("opacity")) < float(last.get("opacity"))
    assert points[0].shape == points[1].shape
    assert last.get("stroke-dasharray")  # amplitude 0.24 of harmonic 3 is not convex
    assert facts["amplitude"] == "0, 0.06, 0.12, 0.18, 0.24"
    assert facts["orbits"] == "256 a table, of 32768 bounces, in 4 replicates"


def test_what_others_wrote_is_escaped():
    study = grid(title='"<script>alert(1)</script>"')
    assert "<script>" not in study._repr_html_()
    assert "&lt;script&gt;" in study._repr_html_()


def test_a_study_whose_tables_cannot_be_built_still_shows_its_facts():
    text = (
        '[study]\ntitle = "Flat"\nseed = 1\n[table]\nfamily = "ellipse"\neccentricity = 0.99999999\n'
        "[orbits]\nper_table = 64\nbounces = 256\n"
    )
    points, _, facts = drawn(parse_study(text)._repr_html_())
    assert points == []
    assert facts["eccentricity"] == "0.99999999"


def test_a_study_is_one_line():
    assert repr(grid()) == (
        "<Study 'Grid': radial_harmonic, amplitude: 0, 0.06, 0.12, 0.18, 0.24, harmonic: 2, 3; "
        "256 orbits of 32768 bounces, 4 replicates, seed 5>"
    )


@pytest.mark.parametrize("kind", ["survey", "orbits", "resonances", "trace"])
def test_every_axis_has_a_label(kind):
    table = scanner.build_table("limacon", quadratic=0.1)
    found = {
        "survey": lambda: scanner.survey_table(table, orbits=16, bounces=64, replicates=2),
        "orbits": lambda: scanner.measure_orbits(table, [0.1, 0.2], [0.3, 0.4], bounces=64),
        "resonances": lambda: scanner.survey_resonances(table, period_max=3),
        "trace": lambda: scanner.trace(table, [0.1], [0.3], bounces=8),
    }[kind]()
    for name, variable in found.variables.items():
        assert variable.attrs.get("long_name"), name
        assert variable.dtype.kind in "UT" or variable.attrs.get("units"), name


def test_plots_of_xarray_have_labels_with_units():
    plt = pytest.importorskip("matplotlib.pyplot")
    trace = scanner.trace(scanner.build_table("limacon", quadratic=0.1), [0.1], [0.3], bounces=8)
    _, axes = plt.subplots()
    trace["chord"].isel(orbit=0).plot(ax=axes)
    assert axes.get_ylabel().replace("\n", " ") == "length of the chord that ends at the bounce [length]"
    assert axes.get_xlabel().replace("\n", " ") == "number of the bounce, 0 the start [1]"
    plt.close("all")
