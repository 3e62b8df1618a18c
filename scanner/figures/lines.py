"""What curves against one swept parameter are made of: lines with error bands, fans of earlier horizons, gaps."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import xarray as xr
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from scanner.figures.colours import GREY
from scanner.figures.scale import Scale, spans_without_numbers
from scanner.figures.style import missing_patch


def draw_line(axes: Axes, scale: Scale, root: xr.Dataset, name: str, colour: str, text: str) -> Line2D:
    """Draw a variable with a band of one standard error to either side, where it has one."""
    values = root[name].values
    (line,) = axes.plot(scale.positions, values, ".-", color=colour, markersize=3, label=text)
    if f"{name}_stderr" in root:
        error = root[f"{name}_stderr"].values
        axes.fill_between(scale.positions, values - error, values + error, color=colour, alpha=0.3, linewidth=0)
    return line


def draw_fan(
    axes: Axes, scale: Scale, root: xr.Dataset, name: str, colour: str, *, less: np.ndarray | float = 0.0
) -> None:
    """Draw thin lines for a variable as judged after fewer bounces, where it is stored, less something."""
    if f"{name}_by_horizon" not in root:
        return
    earlier = root[f"{name}_by_horizon"].transpose("horizon", ...).values[:-1]
    for place, values in enumerate(earlier):
        axes.plot(scale.positions, values - less, color=colour, linewidth=0.5, alpha=0.4 + 0.15 * place)


def explain_marks(root: xr.Dataset, name: str, *, fan: bool = True) -> list[Artist]:
    """Make legend entries for the bands and the thin lines."""
    entries: list[Artist] = []
    if f"{name}_stderr" in root:
        entries.append(Patch(color=GREY, alpha=0.4, linewidth=0, label=r"$\pm$ one standard error"))
    if fan and f"{name}_by_horizon" in root:
        earlier = root["horizon"].values[:-1]
        text = f"after {earlier[0]} to {earlier[-1]} bounces"
        entries.append(Line2D([], [], color=GREY, linewidth=0.5, label=text))
    return entries


def mark_missing(plots: Sequence[Axes], scale: Scale, status: np.ndarray) -> list[Artist]:
    """Hatch the stretches of the axis whose tables are not done; return an entry of the legend for each status."""
    marked: dict[str, Artist] = {}
    for name, start, stop in spans_without_numbers(status, scale):
        for axes in plots:
            axes.add_patch(missing_patch(name, (start, 0.0), stop - start, 1.0, axes.get_xaxis_transform()))
        marked.setdefault(name, missing_patch(name))
    return list(marked.values())


def limit_to_fractions(axes: Axes) -> None:
    """Show the whole range of a fraction, or its lower part where all values are small."""
    top = axes.dataLim.y1
    axes.set_ylim(0.0, 1.1 * max(top, 1e-3) if np.isfinite(top) and top < 0.5 else 1.02)
