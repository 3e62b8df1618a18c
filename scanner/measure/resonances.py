"""The periodic orbits of a table and the curves between them, labelled."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from scanner.bounce.resonances import resonance_numbers
from scanner.errors import StudyError
from scanner.indicators.labelled import label
from scanner.measure.last_curves import curve_numbers
from scanner.quantities import CURVES, RESONANCES, rotations_up_to

if TYPE_CHECKING:
    import xarray as xr

    from scanner.tables import Table


def survey_resonances(table: Table, period_max: int = 8) -> xr.Dataset:
    """Both Birkhoff orbits of every rotation p/q of a table, and which rotational curves survive between them.

    Parameters
    ----------
    table
        A convex table.
    period_max
        Largest q, at least 2; the time of each orbit grows as the cube of q.

    Returns
    -------
    xarray.Dataset
        The variables of the group ``resonances`` of a store, for this table.

    Raises
    ------
    TableError
        If the table is not convex.
    StudyError
        If ``period_max`` is not a whole number from 2 on.
    """
    if not isinstance(period_max, int | np.integer) or period_max < 2:
        raise StudyError(f"period_max = {period_max!r} must be a whole number from 2 on; give one like 8")
    rotations = rotations_up_to(period_max)
    found = label(
        RESONANCES,
        {**resonance_numbers(table, rotations), **curve_numbers(table)},
        {
            "rotation": ("resonance", [p for p, _ in rotations]),
            "resonance_period": ("resonance", [q for _, q in rotations]),
            "curve": list(CURVES),
        },
    )
    found.attrs.update(family=table.family, **table.parameters)
    return found
