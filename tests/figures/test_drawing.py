"""Figures of invented numbers: what they show, that it can be read, and what is refused."""

from __future__ import annotations

import importlib.util
import subprocess
import sys
import warnings

import numpy as np
import pytest
from legibility import assert_legible, notes_of
from matplotlib.contour import ContourSet
from synthetic import IMAGES, invented_sweep

from scanner.errors import ScannerError
from scanner.figures import Request, write_figure
from scanner.figures.drawing import draw_figure

AMPLITUDES = np.linspace(0.0, 0.12, 13).tolist()
ONE = {"amplitude": AMPLITUDES}
TWO = {"amplitude": AMPLITUDES, "harmonic": [2, 3, 4]}
AWKWARD_TITLE = (
    'A "quoted" title of Größe $5, 100 % as long as titles are when people describe everything they did in it'
)


def line(axes, label):
    return next(entry for entry in axes.lines if entry.get_label() == label)


def test_fractions_show_the_stored_numbers_and_their_bands():
    tree = invented_sweep(ONE, convex_below=9.0)
    figure, taken = draw_figure(tree, Request())
    axes = figure.axes[0]
    assert taken == ""
    drawn = line(axes, "section area")
    np.testing.assert_array_equal(drawn.get_xdata(), AMPLITUDES)
    np.testing.assert_array_equal(drawn.get_ydata(), tree["regular_area_fraction"].values)
    band = axes.collections[0].get_paths()[0].vertices[:, 1]
    low = tree["regular_area_fraction"].values[3] - tree["regular_area_fraction_stderr"].values[3]
    assert np.abs(band - low).min() < 1e-12  # one vertex is that very number, up to rounding
    fan = {tuple(entry.get_ydata()) for entry in axes.lines if entry.get_linewidth() == 0.5}
    assert tuple(tree["regular_volume_fraction_by_horizon"].values[:, 0]) in fan
    assert len(fan) == 6


def test_doubts_stand_below_the_fractions_on_the_same_axis():
    tree = invented_sweep(ONE)
    above, below = draw_figure(tree, Request())[0].axes
    assert below.get_xlabel() == r"amplitude $\varepsilon$"
    assert above.get_xlim() == below.get_xlim()
    np.testing.assert_array_equal(
        line(below, "undecided section area").get_ydata(), tree["undecided_area_fraction"].values
    )
    by_horizon = tree["regular_area_fraction_by_horizon"].values
    fan = [entry.get_ydata() for entry in below.lines if entry.get_linewidth() == 0.5]
    np.testing.assert_array_equal(fan[0], by_horizon[:, 0] - tree["regular_area_fraction"].values)
    assert len(fan) == 3
    band = below.collections[0].get_paths()[0].vertices[:, 1]
    np.testing.assert_array_equal(np.unique(band), [-0.0123, 0.0123])  # the error of all invented fractions
    assert len(below.patches) == len(above.patches) == 1  # both say where tables are not convex


def test_tables_that_are_not_convex_are_marked():
    figure, _ = draw_figure(invented_sweep(ONE), Request())
    (patch,) = figure.axes[0].patches
    assert patch.get_label() == "not convex"
    # from half way between the last convex table and the first that is not, to the end of the axis
    assert patch.get_x() == pytest.approx(0.105, abs=1e-12)
    assert patch.get_x() + patch.get_width() == pytest.approx(figure.axes[0].get_xlim()[1], abs=1e-12)


def test_a_dimension_of_words_has_them_on_its_axis():
    figure, _ = draw_figure(invented_sweep(ONE), Request(quantity="rotational_band_p"))
    axes = figure.axes[0]
    assert [tick.get_text() for tick in axes.get_yticklabels()] == ["forward", "backward"]
    assert axes.collections[0].get_array().shape == (2, len(AMPLITUDES))
    assert_legible(figure)


def test_where_nothing_is_done_the_axis_is_that_of_a_fraction():
    figure, _ = draw_figure(invented_sweep(ONE, convex_below=-1.0), Request())
    assert figure.axes[0].get_ylim() == (0.0, 1.02)


def test_map_shows_the_stored_numbers():
    tree = invented_sweep(TWO)
    figure, _ = draw_figure(tree, Request(quantity="lyapunov_per_length"))
    mesh = figure.axes[0].collections[0]
    np.testing.assert_array_equal(
        np.ma.filled(mesh.get_array(), np.nan).reshape(3, 13), tree["lyapunov_per_length"].values.T
    )
    not_done = (tree["table_status"].values != 1).sum()
    assert len(figure.axes[0].patches) == not_done
    assert "(1/length)" in figure.axes[1].get_ylabel()


def test_curve_of_two_parameters_has_a_line_for_each_value():
    tree = invented_sweep(TWO)
    figure, _ = draw_figure(tree, Request(kind="curve", quantity="entropy_per_bounce"))
    drawn = line(figure.axes[0], r"harmonic $k$ = 3")
    np.testing.assert_array_equal(drawn.get_ydata(), tree["entropy_per_bounce"].values[:, 1])


def test_curve_runs_along_the_parameter_asked_for():
    figure, _ = draw_figure(invented_sweep({"a": [1, 2], "b": [1, 2, 3]}), Request(kind="curve", along="a"))
    assert len(figure.axes[0].lines) == 3


def without_numbers(tree, name, where, value):
    """The same sweep with a value in place of those at ``where``."""
    root = tree.to_dataset()
    root[name] = root[name].where(~where(root), value)
    tree.dataset = root
    return tree


@pytest.mark.parametrize(
    ("swept", "name", "value", "words"),
    [
        (TWO, "lyapunov_per_length", np.nan, ["no value"]),
        (TWO, "lyapunov_per_length", 0.0, []),  # has a colour
        (ONE, "island_area_fraction", 0.0, ["zero"]),  # has none on a logarithmic scale
        (ONE, "island_area_fraction", np.nan, ["no value"]),
        (ONE, "island_area_fraction", 0.5, []),
    ],
)
def test_cells_without_a_colour_are_explained(swept, name, value, words):
    tree = invented_sweep(swept, convex_below=9.0)
    tree = without_numbers(tree, name, lambda root: (root.amplitude < 0.02) | (root[name] == 0.0), value)
    figure, _ = draw_figure(tree, Request(kind="map", quantity=name))
    assert [text.get_text() for legend in figure.legends for text in legend.get_texts()] == words


def test_lines_without_values_say_so():
    tree = without_numbers(invented_sweep(TWO), "lyapunov_per_bounce", lambda root: root.harmonic == 3, np.nan)
    figure, _ = draw_figure(tree, Request(kind="curve", quantity="lyapunov_per_bounce"))
    said = [text.get_text() for text in figure.legends[0].get_texts()]
    assert [text.endswith(": no values") for text in said[:3]] == [False, True, False]


def test_average_over_one_parameter_leaves_the_other():
    tree = invented_sweep({"realisation": list(range(6)), "amplitude": AMPLITUDES}, convex_below=9.0)
    figure, _ = draw_figure(tree, Request(average=("realisation",)))
    drawn = line(figure.axes[0], "section area")
    # the same mean by numpy: equal but for the order of summation
    np.testing.assert_allclose(drawn.get_ydata(), tree["regular_area_fraction"].values.mean(axis=0), rtol=1e-13)
    assert "mean over realisation" in notes_of(figure)


def test_portrait_shows_the_table_nearest_to_the_selected():
    tree = invented_sweep(TWO, orbits=256)
    figure, taken = draw_figure(tree, Request(kind="portrait", select={"amplitude": 0.0512, "harmonic": "3"}))
    assert taken == "amplitude = 0.05, harmonic = 3"
    place = {"amplitude": 5, "harmonic": 1}
    chaotic = tree["orbits/verdict"].isel(place).values == 3
    points = np.vstack([entry.get_offsets() for entry in figure.axes[0].collections])
    assert len(points) == IMAGES * 256
    # Images fill the section evenly: as many in each quarter of s, and of either sign of p.
    assert np.histogram(points[:, 0], 4, (0.0, 1.0))[0].tolist() == [IMAGES * 64] * 4
    assert (points[:, 1] > 0.0).mean() == 0.5
    drawn = np.sort(figure.axes[0].collections[-1].get_offsets()[:, 1])
    p = tree["orbits/p0"].isel(place).values[chaotic]
    np.testing.assert_array_equal(drawn, np.sort(np.tile(np.concatenate([p, -p]), IMAGES // 2)))
    assert (figure.axes[0].get_xlim(), figure.axes[0].get_ylim()) == ((0.0, 1.0), (-1.0, 1.0))


def test_contours_run_along_equal_values():
    swept = {"amplitude": AMPLITUDES, "eccentricity": np.linspace(0.0, 0.8, 9).tolist()}
    tree = invented_sweep(swept, convex_below=9.0)
    contours = next(
        entry for entry in draw_figure(tree, Request())[0].axes[0].collections if isinstance(entry, ContourSet)
    )
    assert contours.levels.tolist() == pytest.approx([0.2, 0.4, 0.6, 0.8])
    # the invented fraction falls in proportion to the first parameter where the second is at its lowest value
    (crossing,) = (point for point in contours.get_paths()[1].vertices if point[1] == 0.0)
    assert crossing[0] == pytest.approx(0.12 * (1.0 - 0.4), abs=1e-12)


def test_whole_numbers_have_no_contours_between_them():
    axes = draw_figure(invented_sweep(TWO, convex_below=9.0), Request())[0].axes[0]
    assert not any(isinstance(entry, ContourSet) for entry in axes.collections)


@pytest.mark.parametrize(
    ("colour", "variable"), [("exponent", "lyapunov_per_bounce"), ("diffusion", "frequency_diffusion")]
)
def test_portrait_is_coloured_by_a_number(colour, variable):
    tree = invented_sweep({}, orbits=256)
    tree["orbits"][variable].values[7] = np.nan
    figure, _ = draw_figure(tree, Request(colour=colour))
    unknown, known = figure.axes[0].collections
    assert len(unknown.get_offsets()) == IMAGES
    np.testing.assert_array_equal(known.get_array(), np.tile(np.delete(tree["orbits"][variable].values, 7), IMAGES))


CASES = [
    (ONE, Request()),
    (ONE, Request(width="double")),
    (ONE, Request(kind="portrait", select={"amplitude": 0.03})),
    (ONE, Request(kind="portrait", select={"amplitude": 0.03}, colour="diffusion", width="double")),
    (ONE, Request(quantity="regular_area_fraction_by_p")),
    (ONE, Request(quantity="lyapunov_per_length_stderr")),
    (TWO, Request()),
    (TWO, Request(kind="curve", quantity="diffusion_median")),
    ({"amplitude": np.geomspace(1e-4, 0.1, 7).tolist()}, Request()),
    ({"eccentricity": [0.1, 0.2, 0.5], "amplitude": [0.0, 0.5, 1.0]}, Request()),
    ({"amplitude": [0.03]}, Request()),
    ({"eccentricity": np.linspace(0.0, 0.9, 9).tolist(), "amplitude": AMPLITUDES}, Request(width="double")),
    (ONE, Request(quantity="island_area_fraction")),
    (ONE, Request(kind="exponents")),
    (ONE, Request(kind="exponents", select={"amplitude": 0.03})),
    ({**ONE, "realisation": [1, 2]}, Request(average=("realisation",))),
]


@pytest.mark.parametrize(("swept", "request_"), CASES)
def test_nothing_written_is_cut_off_or_overlaps(swept, request_):
    figure, _ = draw_figure(invented_sweep(swept, title=AWKWARD_TITLE), request_)
    assert_legible(figure)


@pytest.mark.parametrize(("suffix", "start"), [(".png", b"\x89PNG"), (".pdf", b"%PDF"), (".svg", b"<?xml")])
def test_files_are_of_their_kind_and_the_same_each_time(tmp_path, suffix, start):
    tree = invented_sweep(ONE, title=AWKWARD_TITLE)
    target = tmp_path / f'a "figure" of Größe{suffix}'
    write_figure(tree, target)
    first = target.read_bytes()
    assert first.startswith(start)
    write_figure(tree, target, force=True)
    assert target.read_bytes() == first
    assert list(tmp_path.iterdir()) == [target]


def test_letters_that_the_typeface_lacks_do_not_warn(tmp_path):
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        write_figure(invented_sweep(ONE, title="\u5f62"), tmp_path / "figure.png")


@pytest.mark.parametrize(
    ("swept", "request_", "said"),
    [
        ({**TWO, "phase": [0.0, 1.0]}, Request(), "too many dimensions.*--select NAME=VALUE.*--average NAME"),
        (TWO, Request(kind="fractions"), "amplitude, harmonic are too many dimensions for this figure, at most 1"),
        (ONE, Request(kind="map"), "kind map needs 2 dimensions and this is amplitude"),
        (ONE, Request(kind="portrait"), "a portrait shows one table: give a value of amplitude with --select"),
        (ONE, Request(kind="portrait", select={"amplitude": 0.12}), "its status is not_convex"),
        (ONE, Request(kind="curve", quantity="chaos"), "no variable 'chaos' of tables: choose from regular_area"),
        (ONE, Request(kind="curve", quantity="island_area_fraction"), "also runs over period: draw it with --kind map"),
        (ONE, Request(kind="curve", along="phase"), "--along phase: not one of amplitude"),
        (ONE, Request(select={"phase": 1.0}), "'phase' is not a swept parameter"),
        ({}, Request(kind="fractions"), "needs 1 dimensions and this is a single table"),
        (
            {"amplitude": AMPLITUDES, "harmonic": list(range(2, 13))},
            Request(kind="curve"),
            "11 lines cannot be told apart, the most is 8",
        ),
    ],
)
def test_what_cannot_be_drawn_is_refused_in_one_line(tmp_path, swept, request_, said):
    with pytest.raises(ScannerError, match=said) as caught:
        write_figure(invented_sweep(swept), tmp_path / "figure.png", request_)
    assert "\n" not in str(caught.value)
    assert list(tmp_path.iterdir()) == []


def test_figures_without_their_library_say_what_to_install(tmp_path, monkeypatch):
    monkeypatch.setattr(importlib.util, "find_spec", lambda name: None)
    with pytest.raises(ScannerError, match=r"pip install 'scanner\[figures\]'"):
        write_figure(invented_sweep(ONE), tmp_path / "figure.png")


def test_figures_are_drawn_without_windows_or_global_state():
    code = "import sys, scanner.figures.drawing; sys.exit('matplotlib.pyplot' in sys.modules)"
    subprocess.run([sys.executable, "-c", code], check=True)
