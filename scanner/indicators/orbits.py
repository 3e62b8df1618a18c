"""Every indicator of every orbit: the variables of the group ``orbits``."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from scanner.bounce.trace import check_start
from scanner.errors import StudyError
from scanner.indicators.following import follow_orbits
from scanner.indicators.labelled import label
from scanner.indicators.schedule import MINIMUM_BOUNCES, horizons, make_schedule
from scanner.quantities import ORBITS
from scanner.tables.curve import bring_to_unit_size

if TYPE_CHECKING:
    import xarray as xr

    from scanner.tables import Table

Floats = npt.NDArray[np.float64]


def orbit_numbers(
    table: Table,
    s: npt.ArrayLike,
    p: npt.ArrayLike,
    bounces: int,
    exponent_bounces: int | None = None,
    adaptive: bool = True,
) -> dict[str, npt.NDArray[np.generic]]:
    """Indicators of orbits of one table, as plain arrays; parameters and errors as for ``measure_orbits``."""
    s, p = check_start(table, s, p)
    if not isinstance(bounces, int | np.integer):
        raise StudyError(f"bounces = {bounces!r} is not a whole number; write it like 8192")
    if bounces < MINIMUM_BOUNCES:
        raise StudyError(f"bounces = {bounces} must be at least {MINIMUM_BOUNCES}: fewer say nothing of an orbit")
    schedule = make_schedule(bounces, exponent_bounces, adaptive)
    # The thresholds of the verdicts are for tables of about this size, as is the growth of the tangent vector.
    harmonics, unit = bring_to_unit_size(table.harmonics)
    course = follow_orbits(harmonics, table.turns_from_arc(s), p, schedule, table.mean_chord_exact / unit)

    def known(values: Floats) -> Floats:
        return np.where(course.failed, np.nan, values)

    return {
        "s0": s,
        "p0": p,
        "bounces_used": course.bounces,
        "lyapunov_per_bounce": known(course.exponent),
        "rotation_number": known(course.rotation),
        "frequency_diffusion": known(-course.frequency_digits),
        "agreement_digits": known(course.agreement_digits),
        "mean_chord": known(course.chord * unit),
        "verdict": course.verdict_by_horizon[:, -1].copy(),
        "verdict_by_horizon": course.verdict_by_horizon,
        "island_period": course.island_period,
        "island_rotation": course.island_rotation,
        "island_winding": course.winding,
        "island_centre_s": table.arc_from_turns(course.centre_turns),
        "island_centre_p": course.centre_p,
    }


def measure_orbits(
    table: Table,
    s: npt.ArrayLike,
    p: npt.ArrayLike,
    bounces: int = 8192,
    exponent_bounces: int | None = None,
    adaptive: bool = True,
) -> xr.Dataset:
    """Indicators and verdict of each orbit.

    Parameters
    ----------
    table
        A convex table.
    s, p
        Start of each orbit, shape (n,): arc length over the perimeter, and the sine of the angle between the
        outgoing ray and the inward normal.
    bounces
        Most bounces that an orbit gets, at least 64; verdicts are also given at half of them, a quarter and so on.
    exponent_bounces
        Least bounces over which the exponents of chaotic orbits are measured; an eighth of ``bounces`` but at least
        1024 by default.
    adaptive
        Whether an orbit is left as soon as it is clear what it is; all get all the bounces otherwise.

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
    numbers = orbit_numbers(table, s, p, bounces, exponent_bounces, adaptive)
    return label(ORBITS, numbers, {"orbit": np.arange(numbers["s0"].size), "horizon": list(horizons(bounces))})
