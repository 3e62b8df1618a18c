"""The section of one table: its orbits, coloured by what they are."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.lines import Line2D

from scanner.figures.colours import COLOUR_MAP, GREY, VERDICT_COLOURS
from scanner.figures.labels import ARC_LENGTH, MOMENTUM, VERDICTS, quantity_label
from scanner.figures.style import COLUMN_INCHES, add_legend, new_axes
from scanner.quantities import VERDICTS as VERDICT_NAMES

COLOURINGS = {
    "verdict": "verdict",
    "exponent": "lyapunov_per_bounce",
    "diffusion": "frequency_diffusion",
    "rotation": "rotation_number",
}
"""Variable of the group ``orbits`` behind each colouring."""


def draw_portrait(s: np.ndarray, p: np.ndarray, orbits: xr.Dataset, colouring: str, width: str) -> Axes:
    """Draw one table's orbits, p against s.

    Parameters
    ----------
    s, p
        Points of each orbit, shape (orbits, points).
    orbits
        Variables of the group ``orbits`` over the dimension ``orbit`` alone.
    colouring
        One of `COLOURINGS`.
    width
        ``single`` or ``double`` column.
    """
    axes = new_axes(width, 1.0)
    values = orbits[COLOURINGS[colouring]]
    # dots that would fill half the plot if none hid another
    room = 0.5 * (72 * COLUMN_INCHES[width]) * (72 * 0.6 * COLUMN_INCHES["single"])
    size = float(np.clip(room / max(s.size, 1), 0.05, 14.0))
    dots: dict[str, Any] = {"s": size, "linewidths": 0, "rasterized": s.size > 2000}
    if colouring == "verdict":
        handles: list[Artist] = []
        for code, name in enumerate(VERDICT_NAMES):
            chosen = values.values == code
            if name in VERDICT_COLOURS and chosen.any():
                axes.scatter(s[chosen], p[chosen], color=VERDICT_COLOURS[name], **dots)
                handles.append(legend_dot(VERDICT_COLOURS[name], VERDICTS[name]))
        add_legend(axes, handles)
    else:
        known = np.isfinite(values.values)
        axes.scatter(s[~known], p[~known], color=GREY, **dots)
        lowest = 0.0 if colouring == "exponent" else None
        each = np.repeat(values.values[known], s.shape[1])
        points = axes.scatter(s[known], p[known], c=each, cmap=COLOUR_MAP, vmin=lowest, **dots)
        axes.figure.colorbar(points, ax=axes, label=quantity_label(values), pad=0.02)
        if not known.all():
            add_legend(axes, [legend_dot(GREY, "no value")])
    axes.set_xlim(0.0, 1.0)
    axes.set_ylim(-1.0, 1.0)
    axes.set_xlabel(ARC_LENGTH)
    axes.set_ylabel(MOMENTUM)
    return axes


def legend_dot(colour: str, text: str) -> Line2D:
    """Make a legend entry of one dot."""
    return Line2D([], [], marker="o", linestyle="none", markersize=4, markeredgewidth=0, color=colour, label=text)
