"""One table from inside: chosen orbits as chords, and their caustics."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.lines import Line2D
from matplotlib.patches import Polygon

from scanner.bounce import trace
from scanner.errors import ScannerError
from scanner.figures.caustics import Caustic, find_caustic
from scanner.figures.colours import VERDICT_COLOURS
from scanner.figures.labels import VERDICTS
from scanner.figures.style import add_legend, new_grid
from scanner.indicators import measure_orbits
from scanner.quantities import CHAOTIC, REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL
from scanner.quantities import VERDICTS as VERDICT_NAMES
from scanner.tables import Table

MOST_ORBITS = 8
MOST_CHORDS = 20_000
FEWEST_BOUNCES = 16384
OUTLINE_POINTS = 721
PIECES = 400
"""Pieces of a caustic as long as the table: more could not be told apart in print."""
LONGEST = 4
"""Length in pieces of a straight bit of a caustic where its points lie far apart."""


def choose_starts(orbits: xr.Dataset) -> tuple[np.ndarray, np.ndarray]:
    """Choose stored orbits to show: a rotational one far in and one far out, one of the largest island, a chaotic one.

    Of each sort the orbit in the middle of its kind is taken, so that the choice is a typical one.
    """
    verdict, p = orbits["verdict"].values, orbits["p0"].values
    rotational = np.flatnonzero(verdict == REGULAR_ROTATIONAL)
    found = [_at_quantile(rotational, np.abs(p), share) for share in (0.25, 0.75)]
    inside = np.flatnonzero(verdict == REGULAR_LIBRATIONAL)
    if len(inside):
        periods, count = np.unique(orbits["island_period"].values[inside], return_counts=True)
        largest = inside[orbits["island_period"].values[inside] == periods[count.argmax()]]
        found.append(_at_quantile(largest, orbits["island_winding"].values, 0.5))
    chaotic = np.flatnonzero(verdict == CHAOTIC)
    found.append(_at_quantile(chaotic, orbits["lyapunov_per_bounce"].values, 0.5))
    chosen = list(dict.fromkeys(place for place in found if place is not None))
    if not chosen:
        raise ScannerError("no orbit of this table has a verdict: name starts with --s and --p")
    return orbits["s0"].values[chosen], p[chosen]


def _at_quantile(places: np.ndarray, values: np.ndarray, share: float) -> int | None:
    """Return the place whose value has this share of the others below it."""
    if not len(places):
        return None
    return int(places[np.argsort(values[places], kind="stable")[int(share * (len(places) - 1))]])


def draw_inside(
    table: Table, s: Sequence[float] | np.ndarray, p: Sequence[float] | np.ndarray, chords: int, judged: int, width: str
) -> Axes:
    """Draw a table once for each of some orbits, with its first chords and the caustic where the orbit has one.

    Parameters
    ----------
    table
        A convex table; the orbits are followed on it anew.
    s, p
        Starts, shape (n,).
    chords
        Chords drawn of each orbit.
    judged
        Bounces by which each orbit is judged, at least `FEWEST_BOUNCES` for the caustic to be that of a curve.
    width
        ``single`` or ``double`` column.

    Raises
    ------
    ScannerError
        There are too many orbits or chords to be told apart.
    """
    if len(p) > MOST_ORBITS:
        raise ScannerError(f"{len(p)} orbits are too many for one figure, at most {MOST_ORBITS}: leave some --p out")
    if chords > MOST_CHORDS:
        raise ScannerError(f"--bounces {chords} chords cannot be told apart, at most {MOST_CHORDS}: ask for fewer")
    measured = measure_orbits(table, s, p, judged)
    traced = trace(table, s, p, max(FEWEST_BOUNCES, chords))
    boundary = np.column_stack(table.point(np.linspace(0.0, 1.0, OUTLINE_POINTS)))
    plots = new_grid(width, len(p), float(np.divide(*np.ptp(boundary, axis=0)[::-1])))
    drawn = False
    for place, axes in enumerate(plots):
        orbit = traced.isel(orbit=place)
        x, y, around, momentum = (orbit[name].values for name in ("x", "y", "s", "p"))
        facts = measured.isel(orbit=place)
        verdict = VERDICT_NAMES[int(facts["verdict"])]
        outline = Polygon(boundary, fill=False, edgecolor="black", linewidth=0.9)
        axes.add_patch(outline)
        axes.plot(x[: chords + 1], y[: chords + 1], color=VERDICT_COLOURS[verdict], linewidth=0.4, alpha=_alpha(chords))
        if verdict.startswith("regular") and (caustic := find_caustic(x, y, around, momentum)) is not None:
            drawn = _draw_caustic(axes, caustic, outline) or drawn
        axes.set_aspect("equal")
        axes.set_xlabel(_describe(facts), fontsize=6, linespacing=1.3)
    if drawn:
        add_legend(plots[0], [Line2D([], [], color="black", label="caustic, the envelope of the chords")])
    return plots[0]


def _alpha(chords: int) -> float:
    """Paler chords where there are more of them."""
    return float(np.clip(6.0 / np.sqrt(chords), 0.1, 0.8))


def _draw_caustic(axes: Axes, caustic: Caustic, outline: Polygon) -> bool:
    """Draw a caustic as short pieces of the chords that touch it; say whether any of it lies inside the table."""
    size = float(np.ptp(outline.get_xy(), axis=0).max()) / PIECES
    _, chosen = np.unique(np.rint(caustic.points / size), axis=0, return_index=True)
    points = caustic.points[chosen]
    pieces = np.clip(caustic.steps[chosen], size, LONGEST * size)[:, None] * caustic.tangents[chosen]
    lines = np.stack([points - pieces, points + pieces, np.full_like(pieces, np.nan)], axis=1).reshape(-1, 2)
    axes.plot(*lines.T, color="black", linewidth=0.9, solid_capstyle="round", clip_path=outline)
    return bool(len(lines))


def _describe(facts: xr.Dataset) -> str:
    verdict = VERDICT_NAMES[int(facts["verdict"])]
    start = f"$s/L$ = {float(facts['s0']):.4f}, $p$ = {float(facts['p0']):.4f}"
    if verdict == "chaotic":
        number = rf"$\lambda$ = {float(facts['lyapunov_per_bounce']):.3f} per bounce"
    elif int(facts["island_period"]):
        number = f"island {int(facts['island_rotation'])}/{int(facts['island_period'])}"
    else:
        number = f"rotation number {float(facts['rotation_number']):.4f}"
    return "\n".join([VERDICTS.get(verdict, verdict), number, start])
