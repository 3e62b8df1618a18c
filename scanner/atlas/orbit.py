"""One orbit traced live, and the table it runs in, built again from the study."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import xarray as xr

from scanner.analysis import study_of
from scanner.atlas.words import name_of, with_units, write_number
from scanner.bounce import trace
from scanner.errors import ScannerError
from scanner.figures.labels import VERDICTS
from scanner.figures.one_table import rebuild_table
from scanner.indicators import measure_orbits
from scanner.quantities import ORBITS, in_group
from scanner.quantities import VERDICTS as VERDICT_NAMES
from scanner.tables import Table, build_table

DEFAULT_BOUNCES = 8192
MOST_BOUNCES = 131072
"""Of an orbit that is measured live: less than a second of work on any table."""


@dataclass(frozen=True)
class TracedOrbit:
    """An orbit bounce by bounce, and its numbers after many more bounces."""

    points: xr.Dataset
    numbers: xr.Dataset
    bounces: int

    @property
    def verdict(self) -> str:
        """What the orbit is, in words."""
        return VERDICTS.get(VERDICT_NAMES[int(self.numbers["verdict"].item())], "unknown")

    def facts(self) -> list[tuple[str, str, str]]:
        """Name, meaning and value of its numbers, those that it has."""
        found = [("verdict", name_of(self.numbers["verdict"]), self.verdict)]
        for quantity in in_group(ORBITS):
            if quantity.flags or quantity.name not in self.numbers:
                continue
            variable = self.numbers[quantity.name]
            if variable.ndim or not np.isfinite(variable.item()):
                continue
            if quantity.name.startswith("island_") and not self.numbers["island_period"].item():
                continue
            found.append((with_units(variable), name_of(variable), write_number(float(variable.item()))))
        return found


def find_table(picked: xr.DataTree, allow_code: bool) -> Table | str:
    """Build the one table that is left in a sweep, or say in a sentence why there is none to show."""
    if ":" in study_of(picked).family and not allow_code:
        return (
            "The outline comes from a function of the study's author. To see it and to trace orbits, start the atlas "
            "with --allow-code, if you trust that function."
        )
    try:
        return rebuild_table(picked, allow_code=allow_code)
    except (ScannerError, SystemExit) as error:  # the latter from a function of the study's author
        return f"The table cannot be built here: {error}."


def trace_orbit(table: Table, start: tuple[float, float], drawn: int, measured: int | None) -> TracedOrbit:
    """Follow an orbit and measure it for as many bounces as the study asked for, within reason."""
    s, p = start
    bounces = min(measured or DEFAULT_BOUNCES, MOST_BOUNCES)
    points = trace(table, s, p, drawn).isel(orbit=0)
    return TracedOrbit(points, measure_orbits(table, s, p, bounces).isel(orbit=0), bounces)


def warm_up() -> None:
    """Load or compile the kernels, so that the first click need not wait for them."""
    trace_orbit(build_table("ellipse", eccentricity=0.5), (0.1, 0.3), 1, DEFAULT_BOUNCES)
