"""The distribution of exponents as a figure: counts add up to the stored orbits."""

import numpy as np
import pytest
from matplotlib.patches import StepPatch
from synthetic import invented_sweep

from scanner.errors import ScannerError
from scanner.figures import Request
from scanner.figures.drawing import draw_figure

ONE = {"amplitude": [0.0, 0.02, 0.05, 0.06]}


def test_histogram_holds_every_orbit_by_verdict():
    tree = invented_sweep(ONE, orbits=256, convex_below=9.0)
    axes = draw_figure(tree, Request(kind="exponents", select={"amplitude": 0.05}))[0].axes[0]
    orbits = tree["orbits"].to_dataset().isel(amplitude=2)
    outlines = [patch.get_data() for patch in axes.patches if isinstance(patch, StepPatch) and not patch.get_fill()]
    expected = [(orbits["verdict"].values == code).mean() for code in np.unique(orbits["verdict"].values)]
    assert [data.values.sum() for data in outlines] == pytest.approx(expected)
    chaotic = orbits["lyapunov_per_bounce"].values[orbits["verdict"].values == 3]
    edges, shares = outlines[-1].edges, outlines[-1].values
    assert shares[edges[1:] < chaotic.min()].sum() == 0.0
    (mean,) = axes.lines
    assert mean.get_xdata()[0] == tree["lyapunov_per_bounce"].values[2]


def test_every_column_of_the_map_is_the_histogram_of_a_table():
    tree = invented_sweep(ONE, orbits=256)
    axes = draw_figure(tree, Request(kind="exponents"))[0].axes[0]
    columns = np.ma.filled(axes.collections[0].get_array(), 0.0).T
    done = tree["table_status"].values == 1
    np.testing.assert_allclose(columns.sum(axis=1), done, rtol=1e-12)  # shares of a whole; nothing where not convex
    assert len(axes.patches) == 1


def test_orbits_that_were_not_followed_are_no_part_of_the_section():
    tree = invented_sweep(ONE, orbits=256, convex_below=9.0)
    for name, none in (("verdict", 0), ("lyapunov_per_bounce", np.nan)):
        tree["orbits"][name].values[2, 100:] = none
    one = draw_figure(tree, Request(kind="exponents", select={"amplitude": 0.05}))[0].axes[0]
    outlines = [patch.get_data() for patch in one.patches if isinstance(patch, StepPatch) and not patch.get_fill()]
    assert sum(data.values.sum() for data in outlines) == pytest.approx(1.0)
    axes = draw_figure(tree, Request(kind="exponents"))[0].axes[0]
    columns = np.ma.filled(axes.collections[0].get_array(), 0.0)
    np.testing.assert_allclose(columns.sum(axis=0), 1.0, rtol=1e-12)


@pytest.mark.parametrize(
    ("swept", "said"),
    [
        ({**ONE, "phase": [0.0, 1.0]}, "give a value of amplitude, phase with --select"),
        ({"amplitude": [0.0, 1.0]}, "no orbit here has an exponent"),
    ],
)
def test_what_cannot_be_drawn_is_refused_in_one_line(swept, said):
    with pytest.raises(ScannerError, match=said):
        draw_figure(
            invented_sweep(swept, convex_below=-1.0 if "phase" not in swept else 9.0), Request(kind="exponents")
        )
