"""Numbers of the tables against one swept parameter, and how far they can be doubted."""

from __future__ import annotations

import xarray as xr
from matplotlib.artist import Artist
from matplotlib.axes import Axes

from scanner.figures.colours import BLUE, CYCLE, GREY, VERMILION
from scanner.figures.labels import parameter_label, quantity_label, starts_at_zero
from scanner.figures.lines import draw_fan, draw_line, explain_marks, limit_to_fractions, mark_missing
from scanner.figures.scale import Scale, scale_of
from scanner.figures.style import add_legend, new_axes, new_stack
from scanner.quantities import DONE

MOST_LINES = len(CYCLE)


def draw_fractions(root: xr.Dataset, along: str, width: str) -> Axes:
    """Draw the regular fractions of section area and of shell volume against one parameter.

    Bands are one standard error to either side; the thin lines are the same fractions as judged after fewer bounces.
    The lower plot shows on a scale of its own how far the one of the section area can be doubted: what it lost since
    those earlier horizons, its error, and the undecided part.
    """
    axes, below = new_stack(width, 1.2)
    scale = scale_of(root, along)
    handles: list[Artist] = []
    for name, colour, text in (
        ("regular_area_fraction", BLUE, "section area"),
        ("regular_volume_fraction", VERMILION, r"shell volume $\rho_1$"),
    ):
        handles.append(draw_line(axes, scale, root, name, colour, text))
        draw_fan(axes, scale, root, name, colour)
    handles.append(_draw_doubts(below, scale, root))
    scale.dress(below, "x")
    axes.set_ylabel("regular fraction")
    limit_to_fractions(axes)
    missing = mark_missing((axes, below), scale, root["table_status"].values)
    add_legend(axes, [*handles, *explain_marks(root, "regular_area_fraction"), *missing])
    return axes


def _draw_doubts(axes: Axes, scale: Scale, root: xr.Dataset) -> Artist:
    final, error = root["regular_area_fraction"].values, root["regular_area_fraction_stderr"].values
    axes.axhline(0.0, color=GREY, linewidth=0.4, zorder=0.5)
    axes.fill_between(scale.positions, -error, error, color=BLUE, alpha=0.3, linewidth=0)
    draw_fan(axes, scale, root, "regular_area_fraction", BLUE, less=final)
    undecided = root["undecided_area_fraction"].values
    (line,) = axes.plot(scale.positions, undecided, ":.", color="black", markersize=2, label="undecided section area")
    axes.set_ylabel("doubt")
    return line


def draw_curve(root: xr.Dataset, quantity: str, along: str, width: str) -> Axes:
    """Draw one variable against one parameter, a line for each value of a second parameter if there is one."""
    axes = new_axes(width, 1.0)
    scale = scale_of(root, along)
    others = [str(name) for name in root["table_status"].dims if name != along]
    handles: list[Artist] = []
    status = root["table_status"]
    if others:
        (other,) = others
        for value, colour in zip(root[other].values, CYCLE, strict=False):
            part = root.sel({other: value})
            text = f"{parameter_label(other)} = {value:.6g}" + ("" if part[quantity].notnull().any() else ": no values")
            handles.append(draw_line(axes, scale, part, quantity, colour, text))
        status = status.max(other).where(~(status == DONE).any(other), DONE)
    else:
        handles.append(draw_line(axes, scale, root, quantity, BLUE, "after all bounces"))
        draw_fan(axes, scale, root, quantity, BLUE)
    axes.set_ylabel(quantity_label(root[quantity]))
    scale.dress(axes, "x")
    if quantity.endswith("_fraction"):
        limit_to_fractions(axes)
    elif starts_at_zero(quantity):
        axes.set_ylim(bottom=0.0)
    missing = mark_missing((axes,), scale, status.values)
    add_legend(axes, [*handles, *explain_marks(root, quantity, fan=not others), *missing])
    return axes
