"""One variable over two parameters, or over one parameter and the variable's own further dimension."""

from __future__ import annotations

import numpy as np
import xarray as xr
from matplotlib.artist import Artist
from matplotlib.axes import Axes

from scanner.figures.colours import COLOUR_MAP
from scanner.figures.labels import quantity_label
from scanner.figures.scale import scale_of
from scanner.figures.style import add_legend, missing_patch, new_axes
from scanner.quantities import DONE, TABLE_STATUS


def draw_map(root: xr.Dataset, quantity: str, dims: tuple[str, str], width: str) -> Axes:
    """Draw a variable as colours over its two dimensions; tables without numbers are hatched by their status."""
    axes = new_axes(width, 0.95)
    across, up = (scale_of(root, name) for name in dims)
    values = root[quantity].transpose(*dims[::-1])
    lowest, highest = _limits(quantity, values.values)
    mesh = axes.pcolormesh(
        across.edges, up.edges, values.values, cmap=COLOUR_MAP, vmin=lowest, vmax=highest, rasterized=values.size > 5000
    )
    across.dress(axes, "x")
    up.dress(axes, "y")
    axes.figure.colorbar(mesh, ax=axes, label=quantity_label(values), pad=0.02)
    status = root["table_status"].broadcast_like(values).transpose(*dims).values
    marked: dict[str, Artist] = {}
    for place in np.argwhere(status != DONE):
        name = TABLE_STATUS[status[tuple(place)]]
        corner = (float(across.edges[place[0]]), float(up.edges[place[1]]))
        size = (float(across.edges[place[0] + 1]) - corner[0], float(up.edges[place[1] + 1]) - corner[1])
        axes.add_patch(missing_patch(name, corner, *size))
        marked.setdefault(name, missing_patch(name))
    add_legend(axes, list(marked.values()))
    return axes


def _limits(quantity: str, values: np.ndarray) -> tuple[float | None, float | None]:
    """Limits of the colours: fractions and exponents from zero, all other numbers as they fall."""
    finite = values[np.isfinite(values)]
    if not finite.size:
        return 0.0, 1.0
    if "_fraction" in quantity:
        return 0.0, 1.0 if finite.max() > 0.5 else max(float(finite.max()), 1e-3)
    if quantity.startswith(("lyapunov", "entropy")):
        return 0.0, None
    return None, None
