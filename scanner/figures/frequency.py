"""The frequencies of one table: rotation number along a line of the section, and its diffusion over all of it."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import xarray as xr
from matplotlib.axes import Axes

from scanner.errors import ScannerError
from scanner.figures.colours import COLOUR_MAP, GREY, VERDICT_COLOURS
from scanner.figures.labels import ARC_LENGTH, MOMENTUM, ROTATION, VERDICTS, quantity_label
from scanner.figures.portrait import legend_dot
from scanner.figures.style import add_legend, new_panels
from scanner.indicators import measure_orbits
from scanner.quantities import VERDICTS as VERDICT_NAMES
from scanner.tables import Table

GRID = (96, 64)
"""Cells along s and along p of the image of the diffusion."""
MOST_BOUNCES = 1_000_000_000
"""Bounces in all that a figure may take: a minute for a simple table."""
WIDTH_TO_NAME = 3
"""Neighbouring orbits of one island that make a plateau worth its name."""
ROOM_OF_NAME = 0.05
"""Least distance of two names at the margin, as a share of the height."""


def draw_frequency(table: Table, s: float, orbits: int, bounces: int, width: str) -> Axes:
    """Draw the rotation number against p along a line of constant s, and the frequency diffusion over the section.

    Parameters
    ----------
    table
        A convex table; everything is measured on it anew.
    s
        Arc length of the line as a fraction of the perimeter.
    orbits
        Orbits along the line.
    bounces
        Bounces of each orbit, on the line and over the section.
    width
        ``single`` or ``double`` column.

    Raises
    ------
    ScannerError
        The orbits would take too long.
    """
    started = orbits + GRID[0] * GRID[1]
    if started * bounces > MOST_BOUNCES:
        raise ScannerError(
            f"{started} orbits of {bounces} bounces take too long for a figure, at most {MOST_BOUNCES} bounces in all: "
            f"ask for {MOST_BOUNCES // started} bounces or fewer, or for fewer orbits"
        )
    line, image = new_panels(width, 0.85)
    _draw_line(line, measure_orbits(table, np.full(orbits, s), cell_centres(-1.0, 1.0, orbits), bounces))
    _draw_image(image, table, bounces)
    image.axvline(s % 1.0, color="white", linestyle="--", linewidth=0.8)
    return line


def cell_centres(start: float, stop: float, count: int) -> np.ndarray:
    """Centres of equal cells between two bounds, shape (count,)."""
    return start + (stop - start) * (np.arange(count) + 0.5) / count


def _draw_line(axes: Axes, orbits: xr.Dataset) -> None:
    p, rotation, verdict = (orbits[name].values for name in ("p0", "rotation_number", "verdict"))
    size = float(np.clip(2000.0 / len(p), 1.0, 6.0))
    handles = []
    for code, name in enumerate(VERDICT_NAMES):
        chosen = verdict == code
        if name in VERDICT_COLOURS and chosen.any():
            axes.scatter(p[chosen], rotation[chosen], s=size, linewidths=0, color=VERDICT_COLOURS[name])
            handles.append(legend_dot(VERDICT_COLOURS[name], VERDICTS[name]))
    axes.set_xlim(-1.0, 1.0)
    axes.set_xticks(np.linspace(-1.0, 1.0, 5))
    axes.set_ylim(0.0, 1.0)
    axes.set_xlabel(MOMENTUM)
    axes.set_ylabel(ROTATION)
    for height, text in _plateaus(orbits):
        axes.axhline(height, color=GREY, linewidth=0.4, zorder=0.5)
        axes.text(1.01, height, text, transform=axes.get_yaxis_transform(), va="center", fontsize=6)
    add_legend(axes, handles)


def _plateaus(orbits: xr.Dataset) -> Iterator[tuple[float, str]]:
    """Rotation number and name of the islands on the line, the widest first, as many as there is room for."""
    inside = orbits["island_period"].values > 0
    islands = np.stack([orbits["island_rotation"].values[inside], orbits["island_period"].values[inside]])
    found, count = np.unique(islands, axis=1, return_counts=True)
    taken: list[float] = []
    for place in np.argsort(-count, kind="stable"):
        p, q = found[:, place]
        height = float(p / q)
        if count[place] >= WIDTH_TO_NAME and all(abs(height - other) > ROOM_OF_NAME for other in taken):
            taken.append(height)
            yield height, f"{p}/{q}"


def _draw_image(axes: Axes, table: Table, bounces: int) -> None:
    across, up = np.meshgrid(cell_centres(0.0, 1.0, GRID[0]), cell_centres(-1.0, 1.0, GRID[1]))
    diffusion = measure_orbits(table, across.ravel(), up.ravel(), bounces)["frequency_diffusion"]
    axes.set_facecolor(GREY)  # seen where no frequency was found, as for an island of unknown winding
    mesh = axes.imshow(
        diffusion.values.reshape(across.shape),
        origin="lower",
        extent=(0.0, 1.0, -1.0, 1.0),
        aspect="auto",
        interpolation="nearest",
        cmap=COLOUR_MAP,
    )
    axes.figure.colorbar(mesh, ax=axes, label=quantity_label(diffusion), pad=0.02)
    axes.set_xlabel(ARC_LENGTH)
    axes.set_ylabel(MOMENTUM)
