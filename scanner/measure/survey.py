"""The survey of one table: sample its section, measure the orbits, reduce them to the table's numbers."""

from __future__ import annotations

from typing import TYPE_CHECKING

from scanner.errors import StudyError
from scanner.indicators import horizons
from scanner.indicators.labelled import label
from scanner.measure.fractions import table_numbers
from scanner.measure.rounds import check_rounds, follow_rounds
from scanner.quantities import DIRECTIONS, DONE, LARGEST_SEED, P_BINS, PERIODS, ROOT

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
    table: Table,
    orbits: int = 1024,
    bounces: int = 8192,
    replicates: int = 8,
    seed: int = 1,
    target_error: float | None = None,
    most_orbits: int | None = None,
    exponent_bounces: int | None = None,
    adaptive: bool = True,
) -> xr.Dataset:
    """How much of one table is regular, and how chaotic the rest.

    Parameters
    ----------
    table
        A convex table.
    orbits
        Initial conditions in all, a multiple of ``replicates``; scrambled low-discrepancy points of the section.
    bounces, exponent_bounces, adaptive
        Most bounces of an orbit, and when it is left, as for ``measure_orbits``.
    replicates
        Independent scramblings, at least 2 for error bars.
    seed
        Seed of the scramblings.
    target_error, most_orbits
        Standard error of ``regular_area_fraction`` to go on for: after ``orbits`` twice as many in all, and so on up to
        ``most_orbits``, a multiple of ``replicates``.

    Returns
    -------
    xarray.Dataset
        The root variables of a store, for this table; the same numbers as a sweep with this seed stores.

    Raises
    ------
    TableError, StudyError
        If the table is not convex or the numbers do not fit together.
    """
    if not 0 <= seed <= LARGEST_SEED:
        raise StudyError(f"seed = {seed} must be from 0 to 2^63 - 1; give another")
    check_rounds(replicates, orbits, target_error, most_orbits)
    limits = (target_error, most_orbits, exponent_bounces, adaptive)
    followed = follow_rounds(table, seed, replicates, orbits, bounces, *limits)
    numbers = table_numbers(table, followed, replicates)
    survey = label(ROOT, {**numbers, "table_status": DONE}, root_coordinates(bounces, replicates))
    survey.attrs.update(
        family=table.family, **table.parameters, orbits=orbits, bounces=bounces, replicates=replicates, seed=seed
    )
    if target_error is not None:
        survey.attrs.update(target_error=target_error, most_orbits=most_orbits)
    return survey
