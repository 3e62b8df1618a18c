"""The look of all figures: column widths, type sizes, legends, marks of what is missing."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence

from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.patches import Rectangle
from matplotlib.transforms import Transform

from scanner.figures.colours import MISSING

COLUMN_INCHES = {"single": 3.4, "double": 7.0}
"""Inches of one and of two columns of the usual journals."""

STYLE = {
    "font.family": "DejaVu Sans",
    "font.size": 8,
    "axes.titlesize": 8,
    "axes.labelsize": 8,
    "legend.fontsize": 7,
    "xtick.labelsize": 7,
    "ytick.labelsize": 7,
    "axes.linewidth": 0.6,
    "xtick.major.width": 0.6,
    "ytick.major.width": 0.6,
    "lines.linewidth": 1.2,
    "hatch.linewidth": 0.4,
    "legend.frameon": False,
    "legend.handlelength": 1.6,
    "legend.columnspacing": 1.2,
    "pdf.fonttype": 42,
    "svg.hashsalt": "scanner",
}


def new_axes(width: str, height: float) -> Axes:
    """Make a figure of one plot, `height` being a share of the width of a single column."""
    figure = Figure(figsize=(COLUMN_INCHES[width], height * COLUMN_INCHES["single"]), dpi=300, layout="constrained")
    FigureCanvasAgg(figure)
    return figure.subplots()


def new_panels(width: str, height: float) -> tuple[Axes, Axes]:
    """Make a figure of two plots, one over the other in a single column and side by side in two."""
    across, up = (2, 1) if width == "double" else (1, 2)
    figure = Figure(
        figsize=(COLUMN_INCHES[width], up * height * COLUMN_INCHES["single"]), dpi=300, layout="constrained"
    )
    FigureCanvasAgg(figure)
    first, second = figure.subplots(up, across)
    return first, second


def figure_of(axes: Axes) -> Figure:
    """Return the figure that holds these axes."""
    figure = axes.get_figure(root=True)
    assert isinstance(figure, Figure)
    return figure


def write_title(axes: Axes, title: str, notes: Sequence[str]) -> None:
    """Put the study's title over the plot, and below it in smaller type what was measured."""
    figure = figure_of(axes)
    letters = int(15.5 * figure.get_figwidth())
    lines = textwrap.wrap(title, letters, max_lines=2, placeholder=" ...")
    unbroken = (note.replace(" ", "\u00a0") for note in notes)
    small = textwrap.wrap("; ".join(unbroken), letters, max_lines=4, placeholder=" ...")
    figure.suptitle("\n".join(lines), x=0.01, ha="left", fontsize=8, fontweight="bold", parse_math=False)
    axes.set_title("\n".join(small), loc="left", fontsize=6.5, parse_math=False)


def add_legend(axes: Axes, handles: Sequence[Artist]) -> None:
    """Put a legend below the plot, where it hides nothing; no entries, no legend."""
    if handles:
        figure = figure_of(axes)
        columns = 2 if figure.get_figwidth() < 5 else 4
        figure.legend(handles=list(handles), loc="outside lower center", ncols=min(columns, len(handles)))


def missing_patch(
    status: str,
    corner: tuple[float, float] = (0.0, 0.0),
    width: float = 1.0,
    height: float = 1.0,
    transform: Transform | None = None,
) -> Rectangle:
    """Make the hatched rectangle of tables without numbers; without a place, an entry for the legend."""
    face, edge, hatch = MISSING[status]
    patch = Rectangle(corner, width, height, facecolor=face, edgecolor=edge, hatch=hatch, linewidth=0, zorder=0.5)
    patch.set_label(status.replace("_", " "))
    if transform is not None:
        patch.set_transform(transform)
    return patch
