"""Gaps of resonances as a figure: powers put in come out, nothing is made of what lies below the floor."""

import numpy as np
import pytest
import xarray as xr
from legibility import assert_legible
from matplotlib.colors import to_rgb
from synthetic import invented_sweep

from scanner.errors import ScannerError
from scanner.figures import Request
from scanner.figures.colours import BLUE
from scanner.figures.drawing import draw_figure
from scanner.figures.gaps import power_text
from scanner.quantities import rotations_up_to

AMPLITUDES = np.geomspace(1e-3, 0.1, 9)
FLOOR = 1e-13
GAPS = Request(kind="gaps")


def sweep_with_gaps(period_max=4, *, swept=None, powers=(1, 5, 2)):
    """Gaps of exact powers of the amplitude, rounded by half the floor; the last table is not convex."""
    tree = invented_sweep(swept or {"amplitude": [0.0, *AMPLITUDES.tolist(), 0.2]}, convex_below=0.95)
    dims, shape = tree["table_status"].dims, tree["table_status"].shape
    rotations = rotations_up_to(period_max)
    amplitude = tree[dims[0]].values.reshape(-1, *[1] * len(shape))
    exponents = np.resize(np.asarray(powers, dtype=float), len(rotations))
    gap = np.where(np.isfinite(exponents), 2.0 * amplitude ** np.nan_to_num(exponents), 0.0) + 0.5 * FLOOR
    gap = np.where(tree["table_status"].values[..., None] == 1, np.broadcast_to(gap, (*shape, len(rotations))), np.nan)
    variables = {"length_gap": gap, "length_gap_floor": np.where(np.isnan(gap), np.nan, FLOOR)}
    coords = {
        "rotation": ("resonance", [p for p, _ in rotations]),
        "resonance_period": ("resonance", [q for _, q in rotations]),
    }
    found = xr.Dataset({name: ((*dims, "resonance"), values) for name, values in variables.items()}, coords)
    tree["resonances"] = xr.DataTree(found)
    return tree


def legend_of(figure):
    return [text.get_text() for text in figure.legends[0].get_texts()]


def test_powers_put_in_come_out():
    figure, _ = draw_figure(sweep_with_gaps(), GAPS)
    names = legend_of(figure)
    assert names[0] == r"1/2: power 1.000 $\pm$ 0.000"
    assert names[2] == r"1/4: power 2.000 $\pm$ 0.000"
    assert names[3] == "floor of the gap"
    assert figure.axes[0].get_xscale() == figure.axes[0].get_yscale() == "log"


def test_points_below_the_floor_are_hollow_and_outside_the_fit():
    """2 eps^5 is above 1e-13 from 2.2e-3 on: the first two of nine amplitudes are not."""
    axes = draw_figure(sweep_with_gaps(powers=(5,)), GAPS)[0].axes[0]
    full, hollow, fit = [line for line in axes.lines if line.get_color() == BLUE]
    np.testing.assert_array_equal(full.get_xdata(), AMPLITUDES[2:])
    np.testing.assert_array_equal(hollow.get_xdata(), AMPLITUDES[:2])
    assert hollow.get_markerfacecolor() == "none"
    assert fit.get_xdata().tolist() == [AMPLITUDES[2], AMPLITUDES[-1]]
    slope = np.polyfit(np.log(AMPLITUDES[2:]), np.log(2.0 * AMPLITUDES[2:] ** 5 + 0.5 * FLOOR), 1)[0]
    assert np.diff(np.log(fit.get_ydata())) / np.diff(np.log(fit.get_xdata())) == pytest.approx(slope, abs=1e-10)
    (band,) = axes.collections
    assert to_rgb(band.get_facecolor()[0][:3]) != to_rgb(BLUE)
    assert set(band.get_paths()[0].vertices[:, 1]) == {FLOOR}


def test_resonances_that_never_open_are_told():
    names = legend_of(draw_figure(sweep_with_gaps(powers=(1, np.nan, 2)), GAPS)[0])
    assert names[-1].replace("\n", " ") == "never above the floor: 1/3"
    assert not any(name.startswith("1/3") for name in names)


def test_of_many_resonances_the_shortest_are_drawn():
    names = legend_of(draw_figure(sweep_with_gaps(12, powers=(1,)), GAPS)[0])
    rotations = len(rotations_up_to(12))
    assert sum("power" in name for name in names) == 16
    assert names[-1].replace("\n", " ") == f"{rotations - 16} of longer period not drawn"


@pytest.mark.parametrize(
    ("slope", "error", "points", "text"),
    [
        (1.98765, 0.0123, 9, r"1.988 $\pm$ 0.012"),
        (6.4444, 0.13, 9, r"6.44 $\pm$ 0.13"),
        (5.0, 2.6, 3, r"5.0 $\pm$ 2.6"),
        (2.0, 0.0, 2, "2.00 (two points)"),
    ],
)
def test_a_power_is_written_to_its_error(slope, error, points, text):
    assert power_text(slope, error, points) == text


@pytest.mark.parametrize("width", ["single", "double"])
def test_nothing_is_cut_off(width):
    assert_legible(draw_figure(sweep_with_gaps(12, powers=(1, np.nan, 5)), Request(kind="gaps", width=width))[0])


@pytest.mark.parametrize(
    ("tree", "request_", "said"),
    [
        (invented_sweep({"amplitude": [0.01, 0.02]}), GAPS, r"this store has no resonances: put \[resonances\]"),
        (sweep_with_gaps(swept={"phase": [0.1, 0.2]}), GAPS, "not a swept parameter here: what is left is phase"),
        (sweep_with_gaps(), Request(kind="gaps", select={"amplitude": 0.01}), "a single table is left"),
        (sweep_with_gaps(swept={"amplitude": [0.01, 0.02], "phase": [0.0, 1.0]}), GAPS, "value of phase with --select"),
        (sweep_with_gaps(powers=(np.nan,)), GAPS, "no resonance has a length gap above its floor"),
    ],
)  # fmt: skip
def test_what_cannot_be_drawn_is_refused_in_one_line(tree, request_, said):
    with pytest.raises(ScannerError, match=said) as caught:
        draw_figure(tree, request_)
    assert "\n" not in str(caught.value)


def test_another_parameter_can_stand_for_the_amplitude():
    tree = sweep_with_gaps(swept={"quadratic": AMPLITUDES.tolist()})
    axes = draw_figure(tree, Request(kind="gaps", along="quadratic"))[0].axes[0]
    assert axes.get_xlabel() == r"quadratic coefficient $\lambda$"
