"""Numbers of the tables against one swept parameter: error bands, and the same judged after fewer bounces."""

from __future__ import annotations

import numpy as np
import xarray as xr
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from scanner.figures.colours import BLUE, CYCLE, GREY, VERMILION
from scanner.figures.labels import parameter_label, quantity_label
from scanner.figures.scale import Scale, scale_of, spans_without_numbers
from scanner.figures.style import add_legend, missing_patch, new_axes
from scanner.quantities import DONE

MOST_LINES = len(CYCLE)


def draw_fractions(root: xr.Dataset, along: str, width: str) -> Axes:
    """Draw the regular fractions of section area and of shell volume against one parameter.

    Bands are one standard error to either side; the thin lines are the same fractions as judged after fewer bounces,
    so that the distance between them shows how far the horizon matters.
    """
    axes = new_axes(width, 1.0)
    scale = scale_of(root, along)
    handles: list[Artist] = []
    for name, colour, text in (
        ("regular_area_fraction", BLUE, "section area"),
        ("regular_volume_fraction", VERMILION, r"shell volume $\rho_1$"),
    ):
        handles.append(_draw_line(axes, scale, root, name, colour, text))
        _draw_fan(axes, scale, root, name, colour)
    handles += axes.plot(
        scale.positions, root["undecided_area_fraction"], ":", color=GREY, label="undecided section area"
    )
    axes.set_ylabel("regular fraction")
    _finish(axes, scale, [*handles, *_explain(root, "regular_area_fraction")], root["table_status"].values)
    _limit_to_fractions(axes)
    return axes


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
            text = f"{parameter_label(other)} = {value:.6g}"
            handles.append(_draw_line(axes, scale, root.sel({other: value}), quantity, colour, text))
        status = status.max(other).where(~(status == DONE).any(other), DONE)
    else:
        handles.append(_draw_line(axes, scale, root, quantity, BLUE, "after all bounces"))
        _draw_fan(axes, scale, root, quantity, BLUE)
    axes.set_ylabel(quantity_label(root[quantity]))
    _finish(axes, scale, [*handles, *_explain(root, quantity, fan=not others)], status.values)
    if quantity.endswith("_fraction"):
        _limit_to_fractions(axes)
    return axes


def _draw_line(axes: Axes, scale: Scale, root: xr.Dataset, name: str, colour: str, text: str) -> Line2D:
    values = root[name].values
    (line,) = axes.plot(scale.positions, values, ".-", color=colour, markersize=3, label=text)
    if f"{name}_stderr" in root:
        error = root[f"{name}_stderr"].values
        axes.fill_between(scale.positions, values - error, values + error, color=colour, alpha=0.3, linewidth=0)
    return line


def _draw_fan(axes: Axes, scale: Scale, root: xr.Dataset, name: str, colour: str) -> None:
    if f"{name}_by_horizon" not in root:
        return
    fractions = root[f"{name}_by_horizon"].transpose(..., "horizon").values[..., :-1]
    for place, values in enumerate(np.moveaxis(fractions, -1, 0)):
        axes.plot(scale.positions, values, color=colour, linewidth=0.5, alpha=0.4 + 0.15 * place)


def _explain(root: xr.Dataset, name: str, *, fan: bool = True) -> list[Artist]:
    """Legend entries for the bands and the thin lines."""
    entries: list[Artist] = []
    if f"{name}_stderr" in root:
        entries.append(Patch(color=GREY, alpha=0.4, linewidth=0, label=r"$\pm$ one standard error"))
    if fan and f"{name}_by_horizon" in root:
        earlier = root["horizon"].values[:-1]
        text = f"after {earlier[0]} to {earlier[-1]} bounces"
        entries.append(Line2D([], [], color=GREY, linewidth=0.5, label=text))
    return entries


def _finish(axes: Axes, scale: Scale, handles: list[Artist], status: np.ndarray) -> None:
    scale.dress(axes, "x")
    marked: dict[str, Artist] = {}
    for name, start, stop in spans_without_numbers(status, scale):
        axes.add_patch(missing_patch(name, (start, 0.0), stop - start, 1.0, axes.get_xaxis_transform()))
        marked.setdefault(name, missing_patch(name))
    add_legend(axes, [*handles, *marked.values()])


def _limit_to_fractions(axes: Axes) -> None:
    """Show the whole range of a fraction, or its lower part where all values are small."""
    top = axes.dataLim.y1
    axes.set_ylim(0.0, 1.02 if not top < 0.5 else 1.1 * max(top, 1e-3))
