"""How many orbits have which Lyapunov exponent: of one table by verdict, or of all tables along one parameter."""

from __future__ import annotations

import numpy as np
import xarray as xr
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.colors import LogNorm
from matplotlib.patches import Patch

from scanner.analysis import swept_parameters
from scanner.errors import ScannerError
from scanner.figures.colours import COLOUR_MAP, VERDICT_COLOURS
from scanner.figures.labels import VERDICTS, quantity_label
from scanner.figures.lines import mark_missing
from scanner.figures.one_table import orbits_of, require_one_table
from scanner.figures.request import Request
from scanner.figures.scale import scale_of
from scanner.figures.style import add_legend, new_axes
from scanner.quantities import PENDING
from scanner.quantities import VERDICTS as VERDICT_NAMES

BINS = 60
LEAST_RANGE = 0.01
"""Exponents per bounce shown at least, so that those of regular orbits alone are seen to be small."""
EXPONENT = "lyapunov_per_bounce"


def draw_exponents(picked: xr.DataTree, request: Request) -> Axes:
    """Draw the distribution of the finite-time exponents over the section.

    One table gives a histogram for each verdict; tables along one parameter give a map, each column a histogram.

    Raises
    ------
    ScannerError
        More than one parameter is left, or no orbit has an exponent.
    """
    names = swept_parameters(picked)
    if len(names) == 1 and not request.average:
        return _draw_along(picked, names[0], request.width)
    require_one_table(picked, "histogram of exponents", request)
    return _draw_one(picked, request.width)


def _bins(exponents: np.ndarray) -> np.ndarray:
    finite = exponents[np.isfinite(exponents)]
    if not finite.size:
        raise ScannerError("no orbit here has an exponent: select tables that are done")
    return np.linspace(min(finite.min(), 0.0), max(1.02 * finite.max(), LEAST_RANGE), BINS + 1)


def _draw_one(picked: xr.DataTree, width: str) -> Axes:
    orbits = orbits_of(picked)
    orbits = orbits.isel(orbit=np.flatnonzero(orbits["verdict"].values != PENDING))
    exponents, verdict = orbits[EXPONENT].values, orbits["verdict"].values
    edges = _bins(exponents)
    axes = new_axes(width, 0.95)
    handles: list[Artist] = []
    for code, name in enumerate(VERDICT_NAMES):
        chosen = verdict == code
        if name in VERDICT_COLOURS and chosen.any():
            share = np.histogram(exponents[chosen], edges)[0] / len(exponents)
            axes.stairs(share, edges, color=VERDICT_COLOURS[name], linewidth=0.9)
            axes.stairs(share, edges, color=VERDICT_COLOURS[name], alpha=0.25, fill=True)
            handles.append(Patch(color=VERDICT_COLOURS[name], alpha=0.6, linewidth=0, label=VERDICTS[name]))
    mean = float(picked.to_dataset()[EXPONENT])
    if np.isfinite(mean):
        handles.append(
            axes.axvline(mean, color="black", linestyle="--", linewidth=0.8, label="mean of the chaotic orbits")
        )
    axes.set_yscale("log")
    axes.set_ylim(0.5 / len(exponents), 1.0)
    axes.set_xlim(edges[0], edges[-1])
    axes.set_xlabel(quantity_label(orbits[EXPONENT]))
    axes.set_ylabel("share of the section area")
    add_legend(axes, handles)
    return axes


def _draw_along(picked: xr.DataTree, along: str, width: str) -> Axes:
    orbits = orbits_of(picked)
    exponents = orbits[EXPONENT].transpose(along, "orbit")
    edges = _bins(exponents.values)
    scale = scale_of(exponents, along)
    followed = (orbits["verdict"].transpose(along, "orbit").values != PENDING).sum(axis=1)
    counts = np.array([np.histogram(row, edges)[0] for row in exponents.values])
    shares = counts / np.maximum(followed, 1)[:, None]
    axes = new_axes(width, 0.95)
    mesh = axes.pcolormesh(
        scale.edges,
        edges,
        np.ma.masked_equal(shares.T, 0.0),
        cmap=COLOUR_MAP,
        norm=LogNorm(1.0 / exponents.sizes["orbit"], 1.0),
        edgecolors="face",
        linewidth=0.3,
        rasterized=shares.size > 5000,
    )
    axes.figure.colorbar(mesh, ax=axes, label="share of the section area", pad=0.02)
    scale.dress(axes, "x")
    axes.set_ylabel(quantity_label(exponents))
    add_legend(axes, mark_missing((axes,), scale, picked.to_dataset()["table_status"].values))
    return axes
