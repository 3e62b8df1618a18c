"""How far the numbers of this store can be trusted: what the store itself says about it."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
import xarray as xr

from scanner.analysis import study_of, swept_parameters
from scanner.analysis.summary import horizon_drift
from scanner.indicators.verdicts import CHAOTIC_GROWTH
from scanner.quantities import DONE
from scanner.report.answer import place_of

THIN = 0.01
"""Share of the section below which the chaotic part is a handful of orbits."""


@dataclass(frozen=True)
class Doubt:
    """One thing that was looked at: what, what was found, and whether a reader should mind."""

    subject: str
    finding: str
    minded: bool


def list_doubts(root: xr.Dataset) -> list[Doubt]:
    """Look at everything that can make the numbers of the tables doubtful.

    Parameters
    ----------
    root
        Root variables of the tables, as stored, not averaged.
    """
    done = root["table_status"].values == DONE
    if not done.any():
        return []
    return [check for look in _LOOKS for check in look(_Tables(root, done))]


class _Tables:
    """The tables that are done, as plain arrays, with NaN in place of the others."""

    def __init__(self, root: xr.Dataset, done: np.ndarray) -> None:
        self.root, self.done, self.count = root, done, int(done.sum())

    def __getitem__(self, name: str) -> np.ndarray:
        return np.where(self.done, self.root[name].values, np.nan)

    def where_largest(self, values: np.ndarray) -> tuple[tuple[np.intp, ...], str]:
        """Place of the largest value, and that place in words that can follow a number."""
        place = np.unravel_index(int(np.nanargmax(values)), values.shape)
        return place, f" at {place_of(self.root, place)}" if swept_parameters(self.root) else ""

    def some(self, count: int) -> str:
        return f"{count} of {self.count} table{'s' if self.count > 1 else ''}"


def _look_at_horizon(tables: _Tables) -> Iterator[Doubt]:
    drift = np.where(tables.done, horizon_drift(tables.root).values, np.nan)
    error = tables["regular_area_fraction_stderr"]
    beyond = np.abs(drift) > error
    place, where = tables.where_largest(np.abs(drift))
    largest = f"the largest drift is {drift[place]:+.4f}{where}, against an error of {error[place]:.4f}"
    if beyond.any():
        yield Doubt(
            "Horizon",
            f"In {tables.some(int(beyond.sum()))} the regular part of the section judged after a quarter of the "
            f"bounces differs from the final one by more than the standard error: {largest}. "
            "There more bounces would help, more orbits would not.",
            True,
        )
    else:
        yield Doubt("Horizon", f"Nowhere does the drift with the horizon exceed the error: {largest}.", False)


def _look_at_undecided(tables: _Tables) -> Iterator[Doubt]:
    undecided = tables["undecided_area_fraction"]
    smaller = np.fmin(tables["regular_area_fraction"], tables["chaotic_area_fraction"])
    deep = (undecided > smaller) & (undecided > tables["regular_area_fraction_stderr"])
    place, where = tables.where_largest(undecided)
    largest = f"At most {undecided[place]:.4f} of the section is without a verdict{where}"
    if deep.any():
        yield Doubt(
            "Undecided",
            f"{largest}. In {tables.some(int(deep.sum()))} it is more than the smaller of the regular and the chaotic "
            "part, and more than the error.",
            True,
        )
    else:
        yield Doubt("Undecided", f"{largest}.", False)


def _look_at_boundaries(tables: _Tables) -> Iterator[Doubt]:
    if "boundary_error" not in tables.root:
        return
    error = tables["boundary_error"]
    place, where = tables.where_largest(error)
    coarse = error[place] > 1e-9
    yield Doubt(
        "Boundary",
        f"The boundaries followed are within {error[place]:.1e} of the family's curve, relative to its size"
        f"{where if coarse else ''}.",
        bool(coarse),
    )


def _look_at_chords(tables: _Tables) -> Iterator[Doubt]:
    if "mean_chord" not in tables.root:
        return
    off = np.abs(tables["mean_chord"] / tables["mean_chord_exact"] - 1.0)
    place, where = tables.where_largest(off)
    yield Doubt(
        "Sampling",
        f"The mean chord of the sampled orbits agrees with the exact \u03c0A/L to {100.0 * off[place]:.2g} % or better"
        f"{f', worst{where}' if where else ''}.",
        False,
    )


def _look_at_chaos(tables: _Tables) -> Iterator[Doubt]:
    chaotic = tables["chaotic_area_fraction"]
    thin = (chaotic > 0.0) & (chaotic < THIN)
    if thin.any():
        yield Doubt(
            "Thin chaos",
            f"In {tables.some(int(thin.sum()))} less than {100 * THIN:g} % of the section is chaotic: exponents and "
            "diffusion rest on a handful of orbits there.",
            True,
        )
    bounces = study_of(tables.root).bounces
    if bounces:
        lowest = (CHAOTIC_GROWTH + math.log(bounces)) / bounces
        yield Doubt(
            "Weak chaos",
            f"Chaotic layers with exponents below about {lowest:.1g} per bounce cannot be told from regular motion "
            f"after {bounces} bounces.",
            False,
        )


def _look_at_curvature(tables: _Tables) -> Iterator[Doubt]:
    if "curvature_min" not in tables.root:
        return
    ratio = tables["curvature_min"] / tables["curvature_max"]
    flat = ratio < 0.01
    if flat.any():
        yield Doubt(
            "Flat places",
            f"In {tables.some(int(flat.sum()))} the smallest curvature is below a hundredth of the largest; where it "
            "vanishes no rotational curve survives (Mather 1982), and what seems to is sticking.",
            True,
        )


_LOOKS: tuple[Callable[[_Tables], Iterator[Doubt]], ...] = (
    _look_at_horizon,
    _look_at_undecided,
    _look_at_boundaries,
    _look_at_chords,
    _look_at_chaos,
    _look_at_curvature,
)
