"""Length gaps of resonances against the amplitude, and the powers by which they open."""

from __future__ import annotations

import textwrap
from typing import Any

import numpy as np
import xarray as xr
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.ticker import LogLocator
from scipy.stats import linregress

from scanner.analysis import require_resonances, swept_parameters
from scanner.errors import ScannerError
from scanner.figures.colours import CYCLE, GREY
from scanner.figures.labels import parameter_label
from scanner.figures.request import Request
from scanner.figures.style import add_legend, new_axes
from scanner.quantities import RESONANCES

AMPLITUDE = "amplitude"
MARKERS = "osDv^<>P"
MOST_RESONANCES = 16
"""Lines that a legend can still name."""


def draw_gaps(picked: xr.DataTree, request: Request) -> Axes:
    """Draw the length gap of each resonance against the amplitude, on logarithmic axes.

    Colours go by the period q and markers by the rounds p.  The straight lines are fits of a power through the points
    above `length_gap_floor`; hollow points are not above it.  Of many resonances those of the lowest period are drawn.

    Raises
    ------
    ScannerError
        The sweep has no resonances, several parameters are left, or none of the amplitudes has a gap to draw.
    """
    resonances, along = _resonances_along(picked, request)
    data = resonances.sel({along: resonances[along] > 0}).transpose("resonance", along)
    opened = (data["length_gap"] > data["length_gap_floor"]).any(along).values
    if not opened.any():
        raise ScannerError(
            f"no resonance has a length gap above its floor at {along} > 0: logarithmic axes have nothing to show"
        )
    drawn = data.isel(resonance=np.flatnonzero(opened)[:MOST_RESONANCES])
    axes = new_axes(request.width, 0.9 + 0.02 * drawn.sizes["resonance"])
    handles: list[Artist] = [
        _draw_resonance(axes, drawn.isel(resonance=place), along) for place in range(drawn.sizes["resonance"])
    ]
    handles.append(_draw_floor(axes, drawn, along))
    axes.set_xscale("log")
    axes.set_yscale("log")
    axes.yaxis.set_major_locator(LogLocator(numticks=9))
    axes.set_ylim(bottom=0.2 * float(drawn["length_gap_floor"].min()))
    axes.set_xlabel(parameter_label(along))
    axes.set_ylabel("length gap (length)")
    closed = [_name(data.isel(resonance=place)) for place in np.flatnonzero(~opened)]
    left = int(opened.sum()) - drawn.sizes["resonance"]
    if closed:
        handles.append(Line2D([], [], linestyle="none", label=_wrap(f"never above the floor: {_listing(closed)}")))
    if left:
        handles.append(Line2D([], [], linestyle="none", label=_wrap(f"{left} of longer period not drawn")))
    add_legend(axes, handles)
    return axes


def _resonances_along(picked: xr.DataTree, request: Request) -> tuple[xr.Dataset, str]:
    """Stored resonances over the one parameter that is left, and its name."""
    require_resonances(picked)
    names = swept_parameters(picked)
    along = request.along or AMPLITUDE
    if along not in names:
        known = f"what is left is {', '.join(names)}" if names else "a single table is left"
        raise ScannerError(
            f"gaps are drawn against {along}, which is not a swept parameter here: {known}; name one with --along"
        )
    others = [name for name in names if name != along]
    if others or request.average:
        raise ScannerError(
            f"gaps are drawn against {along} alone: give a value of "
            f"{', '.join([*others, *request.average])} with --select"
        )
    return picked[RESONANCES].to_dataset()[["length_gap", "length_gap_floor"]].load(), along


def _draw_resonance(axes: Axes, data: xr.Dataset, along: str) -> Line2D:
    amplitude, gap = data[along].values.astype(float), data["length_gap"].values
    # where the colours start over, other markers tell the periods apart
    lap, place = divmod(int(data["resonance_period"]) - 2, len(CYCLE))
    colour, marker = CYCLE[place], MARKERS[(int(data["rotation"]) - 1 + 4 * lap) % len(MARKERS)]
    certain = gap > data["length_gap_floor"].values
    look: dict[str, Any] = {
        "color": colour,
        "marker": marker,
        "markersize": 3,
        "linestyle": "none",
        "markeredgewidth": 0.6,
    }
    axes.plot(amplitude[certain], gap[certain], **look)
    doubtful = ~certain & (gap > 0)
    axes.plot(amplitude[doubtful], gap[doubtful], markerfacecolor="none", alpha=0.5, **look)
    text = _name(data)
    if certain.sum() > 1:
        fit = linregress(np.log10(amplitude[certain]), np.log10(gap[certain]))
        ends = amplitude[certain][[0, -1]]
        axes.plot(ends, 10.0 ** (fit.intercept + fit.slope * np.log10(ends)), color=colour, linewidth=0.7)
        text += f": power {power_text(fit.slope, fit.stderr, int(certain.sum()))}"
    return Line2D([], [], **(look | {"linestyle": "-"}), linewidth=0.7, label=text)


def power_text(slope: float, error: float, points: int) -> str:
    """Write a fitted power and its standard error, which two points do not have."""
    if points < 3:
        return f"{slope:.2f} (two points)"
    decimals = int(np.clip(1 - np.floor(np.log10(max(error, 1e-4))), 1, 3))
    return f"{slope:.{decimals}f} $\\pm$ {error:.{decimals}f}"


def _draw_floor(axes: Axes, data: xr.Dataset, along: str) -> Patch:
    """Fill between the lowest and the highest floor of the resonances drawn."""
    floor = data["length_gap_floor"]
    axes.fill_between(
        data[along].values.astype(float), floor.min("resonance"), floor.max("resonance"), color=GREY, alpha=0.4
    )
    return Patch(color=GREY, alpha=0.4, label="floor of the gap")


def _name(data: xr.Dataset) -> str:
    return f"{int(data['rotation'])}/{int(data['resonance_period'])}"


def _wrap(text: str) -> str:
    """Break a text so that it is no wider than the entries with a power."""
    return textwrap.fill(text, 24)


def _listing(names: list[str], most: int = 6) -> str:
    return ", ".join(names[:most]) + (f" and {len(names) - most} more" if len(names) > most else "")
