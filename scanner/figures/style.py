"""The look of all figures: column widths, type sizes, legends, marks of what is missing."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from math import ceil

from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.patches import Rectangle
from matplotlib.transforms import ScaledTranslation, Transform

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

TITLE_POINTS, NOTE_POINTS = 8.0, 6.5


def new_axes(width: str, height: float) -> Axes:
    """Make a figure of one plot, `height` being a share of the width of a single column."""
    return _new_figure(width, height).subplots()


def new_panels(width: str, height: float) -> tuple[Axes, Axes]:
    """Make a figure of two plots, one over the other in a single column and side by side in two."""
    across, up = (2, 1) if width == "double" else (1, 2)
    first, second = _new_figure(width, up * height).subplots(up, across)
    return first, second


def new_stack(width: str, height: float) -> tuple[Axes, Axes]:
    """Make a figure of a plot over a lower one on the same horizontal axis."""
    figure = _new_figure(width, height)
    first, second = figure.subplots(2, 1, sharex=True, height_ratios=(3, 1))
    return first, second


def new_grid(width: str, count: int, aspect: float) -> list[Axes]:
    """Make a figure of plots without frames and ticks, two in a row in a single column and four in two.

    `aspect` is the height over the width of what they will show.
    """
    most = 2 if width == "single" else 4
    across, up = min(count, most), ceil(count / most)
    side = COLUMN_INCHES[width] / max(across, 2)
    figure = _new_figure(width, (up * (aspect * side + 0.4) + 0.8) / COLUMN_INCHES["single"])
    found = list(figure.subplots(up, across, squeeze=False).ravel())
    for axes in found:
        axes.set_xticks([])
        axes.set_yticks([])
        axes.spines[:].set_visible(False)
    for axes in found[count:]:
        axes.remove()
    return found[:count]


def _new_figure(width: str, height: float) -> Figure:
    size = (COLUMN_INCHES[width], height * COLUMN_INCHES["single"])
    figure = Figure(figsize=size, dpi=300, layout="constrained")
    FigureCanvasAgg(figure)
    return figure


def figure_of(axes: Axes) -> Figure:
    """Return the figure that holds these axes."""
    figure = axes.get_figure(root=True)
    assert isinstance(figure, Figure)
    return figure


def write_title(figure: Figure, title: str, notes: Sequence[str]) -> None:
    """Put the study's title over the plots, and below it in smaller type what was measured."""
    letters = int(15.5 * figure.get_figwidth())
    lines = textwrap.wrap(title, letters, max_lines=2, placeholder=" ...")
    # a note is broken only where it does not fit a line of its own
    unbroken = (note.replace(" ", "\u00a0") if len(note) < letters else note for note in notes)
    small = textwrap.wrap("; ".join(unbroken), letters, max_lines=5, placeholder=" ...")
    # the layout keeps room for the title alone, so that empty lines of it hold the place of the notes
    held = [*lines, *[""] * ceil(len(small) * NOTE_POINTS / TITLE_POINTS)]
    figure.suptitle("\n".join(held), x=0.01, ha="left", fontsize=TITLE_POINTS, fontweight="bold", parse_math=False)
    below = ScaledTranslation(0.0, -(3.0 + 1.2 * TITLE_POINTS * len(lines) + 2.0) / 72.0, figure.dpi_scale_trans)
    top = figure.transFigure + below
    text = "\n".join(small)
    figure.text(0.01, 1.0, text, transform=top, va="top", fontsize=NOTE_POINTS, parse_math=False, gid="notes")


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
