"""The survey of one table: sample its section, measure the orbits, reduce them to the table's numbers."""

from __future__ import annotations

from typing import TYPE_CHECKING

from scanner.indicators import horizons, orbit_numbers
from scanner.indicators.labelled import label
from scanner.measure.fractions import table_numbers
from scanner.measure.sampling import section_points
from scanner.quantities import DIRECTIONS, DONE, P_BINS, PERIODS, ROOT

if TYPE_CHECKING:
    import xarray as xr

    from scanner.tables import Table


def root_coordinates(bounces: int, replicates: int) -> dict[str, list[int] | list[float] | list[str]]:
    """Values along the dimensions of the root variables: bins of p are named by their centres."""
    return {
        "replicate": list(range(replicates)),
        "p_bin": [(2 * number + 1) / P_BINS - 1.0 for number in range(P_BINS)],
        "horizon": list(horizons(bounces)),
        "period": list(PERIODS),
        "direction": list(DIRECTIONS),
    }


def survey_table(
    table: Table, orbits: int = 1024, bounces: int = 8192, replicates: int = 8, seed: int = 1
) -> xr.Dataset:
    """How much of one table is regular, and how chaotic the rest.

    Parameters
    ----------
    table
        A convex table.
    orbits
        Initial conditions in all, a multiple of ``replicates``; scrambled low-discrepancy points of the section.
    bounces
        Bounces of each orbit, at least 64.
    replicates
        Independent scramblings, at least 2 for error bars.
    seed
        Seed of the scramblings.

    Returns
    -------
    xarray.Dataset
        The root variables of a store, for this table; the same numbers as a sweep with this seed stores.

    Raises
    ------
    TableError, StudyError
        If the table is not convex or the numbers do not fit together.
    """
    s, p = section_points(table, seed, replicates, orbits)
    numbers = table_numbers(table, orbit_numbers(table, s, p, bounces), replicates)
    survey = label(ROOT, {**numbers, "table_status": DONE}, root_coordinates(bounces, replicates))
    survey.attrs.update(
        family=table.family, **table.parameters, orbits=orbits, bounces=bounces, replicates=replicates, seed=seed
    )
    return survey
