"""Every indicator of every orbit: the variables of the group ``orbits``."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from scanner.bounce.trace import check_start
from scanner.errors import StudyError
from scanner.indicators.blocks import stream_orbits
from scanner.indicators.islands import wind_orbits
from scanner.indicators.labelled import label
from scanner.indicators.readings import digits_of, read_streams
from scanner.indicators.schedule import MINIMUM_BOUNCES, horizons, make_schedule
from scanner.indicators.verdicts import judge
from scanner.quantities import ORBITS, REGULAR_LIBRATIONAL

if TYPE_CHECKING:
    import xarray as xr

    from scanner.tables import Table

Floats = npt.NDArray[np.float64]


def orbit_numbers(table: Table, s: npt.ArrayLike, p: npt.ArrayLike, bounces: int) -> dict[str, npt.NDArray[np.generic]]:
    """Indicators of orbits of one table, as plain arrays; parameters and errors as for ``measure_orbits``."""
    s, p = check_start(table, s, p)
    if bounces < MINIMUM_BOUNCES:
        raise StudyError(f"bounces = {bounces} must be at least {MINIMUM_BOUNCES}: fewer say nothing of an orbit")
    schedule = make_schedule(bounces)
    turns = table.turns_from_arc(s)
    streams = stream_orbits(table.harmonics, turns, p, schedule)
    at_horizon = [
        read_streams(streams, schedule, number, table.mean_chord_exact) for number in range(len(schedule.horizons))
    ]
    verdicts = [judge(readings, streams.failed) for readings in at_horizon]
    last, verdict = at_horizon[-1], verdicts[-1]

    inside = np.flatnonzero(verdict.code == REGULAR_LIBRATIONAL)
    island = wind_orbits(
        table.harmonics,
        turns[inside],
        p[inside],
        verdict.island_period[inside].astype(np.int64),
        verdict.island_rotation[inside].astype(np.int64),
        bounces,
    )

    verdict.take_out_of_islands(inside[island.resonant])

    def known(values: Floats) -> Floats:
        return np.where(streams.failed, np.nan, values)

    def islands_only(values: Floats) -> Floats:
        found = np.full(s.size, np.nan)
        found[inside] = values
        return found

    # An island's rotation number is p/q whatever the orbit does inside; there the winding is the leading frequency.
    diffusion = known(-digits_of(last.rotation_change))
    diffusion[inside] = -digits_of(island.change)

    return {
        "s0": s,
        "p0": p,
        "lyapunov_per_bounce": known(last.exponent),
        "rotation_number": known(last.rotation),
        "frequency_diffusion": diffusion,
        "agreement_digits": known(last.digits),
        "mean_chord": known(streams.path / bounces),
        "verdict": verdict.code,
        "verdict_by_horizon": np.stack([found.code for found in verdicts], axis=1),
        "island_period": verdict.island_period,
        "island_rotation": verdict.island_rotation,
        "island_winding": islands_only(island.winding),
        "island_centre_s": islands_only(table.arc_from_turns(island.centre_turns)),
        "island_centre_p": islands_only(island.centre_p),
    }


def measure_orbits(table: Table, s: npt.ArrayLike, p: npt.ArrayLike, bounces: int = 8192) -> xr.Dataset:
    """Indicators and verdict of each orbit.

    Parameters
    ----------
    table
        A convex table.
    s, p
        Start of each orbit, shape (n,): arc length over the perimeter, and the sine of the angle between the
        outgoing ray and the inward normal.
    bounces
        How many bounces each orbit gets, at least 64; verdicts are also given at an eighth, a quarter and half of
        them.

    Returns
    -------
    xarray.Dataset
        Dimensions ``orbit`` and ``horizon``; the variables of the group ``orbits`` of a store.

    Raises
    ------
    TableError
        If the table is not convex or an initial condition is not valid.
    StudyError
        If ``bounces`` is too small.
    """
    numbers = orbit_numbers(table, s, p, bounces)
    return label(ORBITS, numbers, {"orbit": np.arange(numbers["s0"].size), "horizon": list(horizons(bounces))})
