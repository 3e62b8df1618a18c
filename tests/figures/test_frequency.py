"""The frequencies of a table as a figure: the measured numbers, the plateaus, and what is refused."""

import numpy as np
import pytest
from legibility import assert_legible, notes_of
from matplotlib.colors import to_hex
from synthetic import invented_sweep

from scanner import build_table, measure_orbits
from scanner.errors import ScannerError
from scanner.figures import Request
from scanner.figures.colours import GREY, VERDICT_COLOURS
from scanner.figures.drawing import draw_figure
from scanner.figures.frequency import GRID
from scanner.quantities import VERDICTS

BOUNCES = 128
ONE = {"amplitude": 0.05}


@pytest.fixture(scope="module")
def tree():
    found = invented_sweep({"amplitude": [0.0, 0.02, 0.05, 0.3]}, title="Quadrupoles")
    found.attrs["study"] = (
        found.attrs["study"].replace("invented", "radial_harmonic").replace("decay = 2.5", "harmonic = 2")
    )
    return found


@pytest.fixture(scope="module")
def figure(tree):
    request = Request(kind="frequency", select=ONE, s=0.25, orbits=60, bounces=BOUNCES)
    return draw_figure(tree, request)[0]


def test_line_shows_what_its_orbits_measure(figure):
    p = -1.0 + (np.arange(60) + 0.5) / 30.0
    table = build_table("radial_harmonic", amplitude=0.05, harmonic=2)
    measured = measure_orbits(table, np.full(60, 0.25), p, BOUNCES)
    by_colour = {to_hex(dots.get_facecolor()[0], keep_alpha=False): dots for dots in figure.axes[0].collections}
    for code, name in enumerate(VERDICTS):
        chosen = measured["verdict"].values == code
        if chosen.any():
            drawn = by_colour.pop(to_hex(VERDICT_COLOURS[name]))
            expected = np.column_stack([p[chosen], measured["rotation_number"].values[chosen]])
            np.testing.assert_allclose(drawn.get_offsets(), expected, rtol=0.0, atol=1e-12)  # rounding of the starts
    assert not by_colour


def test_the_widest_plateau_is_named_at_its_rotation_number(figure):
    """The line at s = 1/4 runs through the island of the short diameter, rotation number 1/2."""
    names = {text.get_text(): text.get_position()[1] for text in figure.axes[0].texts}
    assert names["1/2"] == 0.5
    assert all(a / b == pytest.approx(height) for (a, b), height in _as_numbers(names))


def _as_numbers(names):
    return [(tuple(int(part) for part in name.split("/")), height) for name, height in names.items()]


def test_image_is_the_diffusion_over_the_section(figure):
    (image,) = figure.axes[1].images
    shown = image.get_array()
    assert shown.shape == GRID[::-1]
    assert image.get_extent() == [0.0, 1.0, -1.0, 1.0]
    column, row = 30, 33
    table = build_table("radial_harmonic", amplitude=0.05, harmonic=2)
    s, p = (column + 0.5) / GRID[0], -1.0 + 2.0 * (row + 0.5) / GRID[1]
    alone = measure_orbits(table, s, p, BOUNCES)["frequency_diffusion"].item()
    assert shown[row, column] == pytest.approx(alone, abs=0.1)  # digits of a difference, so rounding shows
    assert shown.max() <= 0.0
    assert to_hex(figure.axes[1].get_facecolor()) == GREY.lower()
    (mark,) = figure.axes[1].lines
    assert list(mark.get_xdata()) == [0.25, 0.25]


def test_notes_say_what_was_measured_anew(figure):
    notes = notes_of(figure)
    assert "measured anew: 60 orbits at s/L = 0.25; 96 by 64 over the section; 128 bounces each" in notes
    assert "a table" not in notes  # the orbits of the store play no part


@pytest.mark.parametrize("width", ["single", "double"])
def test_nothing_is_cut_off(tree, width):
    request = Request(kind="frequency", select=ONE, orbits=400, bounces=64, width=width)
    assert_legible(draw_figure(tree, request)[0])


@pytest.mark.parametrize(
    ("request_", "said"),
    [
        (Request(kind="frequency"), "a frequency figure shows one table: give a value of amplitude with --select"),
        (Request(kind="frequency", select={"amplitude": 0.3}), "its status is not_convex"),
        (Request(kind="frequency", select=ONE, bounces=32), "must be at least 64"),
        (Request(kind="frequency", select=ONE, bounces=10**7), "ask for 139977 bounces or fewer, or for fewer orbits"),
    ],
)
def test_what_cannot_be_drawn_is_refused_in_one_line(tree, request_, said):
    with pytest.raises(ScannerError, match=said) as caught:
        draw_figure(tree, request_)
    assert "\n" not in str(caught.value)
