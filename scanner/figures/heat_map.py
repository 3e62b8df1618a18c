"""One variable over two parameters, or over one parameter and the variable's own further dimension."""

from __future__ import annotations

import numpy as np
import xarray as xr
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.collections import QuadMesh
from matplotlib.colors import LogNorm, Normalize
from matplotlib.patches import Patch
from matplotlib.ticker import MaxNLocator

from scanner.figures.colours import COLOUR_MAP, GREY
from scanner.figures.labels import quantity_label, starts_at_zero
from scanner.figures.scale import Scale, scale_of
from scanner.figures.style import add_legend, missing_patch, new_axes
from scanner.quantities import DONE, TABLE_STATUS

LUMINANCE = np.array([0.2126, 0.7152, 0.0722])
"""Weights of red, green and blue in what the eye takes for brightness (ITU-R BT.709)."""


def draw_map(root: xr.Dataset, quantity: str, dims: tuple[str, str], width: str) -> Axes:
    """Draw a variable as colours over its two dimensions; tables without numbers are hatched by their status."""
    axes = new_axes(width, 0.95)
    across, up = (scale_of(root, name) for name in dims)
    values = root[quantity].transpose(*dims[::-1])
    colours = _colours(quantity, values.values)
    shown = np.ma.masked_less_equal(values.values, 0.0) if isinstance(colours, LogNorm) else values.values
    # cells are given edges of their own colour, as viewers of vector graphics leave white seams between them otherwise
    mesh = axes.pcolormesh(
        across.edges,
        up.edges,
        shown,
        cmap=COLOUR_MAP,
        norm=colours,
        edgecolors="face",
        linewidth=0.3,
        rasterized=values.size > 5000,
    )
    across.dress(axes, "x")
    up.dress(axes, "y")
    axes.figure.colorbar(mesh, ax=axes, label=quantity_label(values), pad=0.02)
    # between whole numbers, and between bins, there is nothing for a line to run through
    if set(dims) == set(root["table_status"].dims) and not (across.whole or up.whole):
        _draw_contours(axes, mesh, across, up, values.values)
    status = root["table_status"].broadcast_like(values).transpose(*dims).values
    marked: dict[str, Artist] = {}
    for place in np.argwhere(status != DONE):
        name = TABLE_STATUS[status[tuple(place)]]
        corner = (float(across.edges[place[0]]), float(up.edges[place[1]]))
        size = (float(across.edges[place[0] + 1]) - corner[0], float(up.edges[place[1] + 1]) - corner[1])
        axes.add_patch(missing_patch(name, corner, *size))
        marked.setdefault(name, missing_patch(name))
    add_legend(axes, [*marked.values(), *_explain_blanks(values.values, shown, status.T == DONE)])
    return axes


def _explain_blanks(values: np.ndarray, shown: np.ndarray, done: np.ndarray) -> list[Artist]:
    """Make a legend entry for the cells of finished tables that have no colour, if there are any."""
    blank = np.ma.getmaskarray(np.ma.masked_invalid(shown)) & done
    zero, unknown = bool((blank & (values == 0.0)).any()), bool((blank & np.isnan(values)).any())
    words = " or ".join(word for word, there in (("zero", zero), ("no value", unknown)) if there)
    return [Patch(facecolor="white", edgecolor=GREY, linewidth=0.5, label=words)] if words else []


def _draw_contours(axes: Axes, mesh: QuadMesh, across: Scale, up: Scale, values: np.ndarray) -> None:
    """Draw lines of equal value, white on dark colours and black on bright ones."""
    finite = values[np.isfinite(values)]
    if min(values.shape) < 3 or not finite.size or not np.ptp(finite):
        return
    lowest, highest = mesh.get_clim()
    levels = MaxNLocator(5).tick_values(lowest, highest)
    levels = levels[(levels > finite.min()) & (levels < finite.max())]
    if not levels.size:
        return
    luminance = mesh.to_rgba(levels)[:, :3] @ LUMINANCE
    lines = axes.contour(
        across.positions,
        up.positions,
        values,
        levels=levels,
        colors=["black" if bright > 0.5 else "white" for bright in luminance],
        linewidths=0.7,
    )
    axes.clabel(lines, fontsize=5.5)


def _colours(quantity: str, values: np.ndarray) -> Normalize:
    """Scale of the colours: fractions and exponents from zero, islands by powers of ten, other numbers as they fall."""
    finite = values[np.isfinite(values)]
    lowest, highest = (float(finite.min()), float(finite.max())) if finite.size else (0.0, 1.0)
    if quantity.startswith("island") and highest > 0.0:
        return LogNorm(float(finite[finite > 0.0].min()), highest)
    if "_fraction" in quantity:
        return Normalize(0.0, 1.0 if highest > 0.5 else max(highest, 1e-3))
    return Normalize(0.0 if starts_at_zero(quantity) else lowest, highest)
