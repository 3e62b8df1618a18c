"""Both Birkhoff orbits of every rotation p/q of a table, as named numbers."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from scanner.bounce.birkhoff import COSINES, FIRST_P, FIRST_TURNS, FOUND, LENGTH, TRACE, find_pairs
from scanner.errors import TableError
from scanner.tables import Table

Floats = npt.NDArray[np.float64]

LENGTH_ROUNDING = 2.0 * float(np.finfo(np.float64).eps)
"""Error of the length of a given polygon, relative to it."""


def residue(trace: Floats) -> Floats:
    """Residue of a periodic orbit from the trace of its tangent map; elliptic between 0 and 1 (Greene 1979)."""
    return 0.25 * (2.0 - trace)


def resonance_numbers(table: Table, rotations: Sequence[tuple[int, int]]) -> dict[str, Floats]:
    """Both Birkhoff orbits of given rotations: the longest polygon with q vertices and p rounds, and the minimax one.

    Parameters
    ----------
    table
        A convex table.
    rotations
        Pairs (p, q) in lowest terms, 0 < p/q <= 1/2.

    Returns
    -------
    dict
        Every variable of the group ``resonances``, shape (n,).  NaN for an orbit that was not found.

        The length of either is exact to some units of the last place, as an error of the vertices counts only in
        second order.  ``length_gap_floor`` is what the gap may be wrong by: this rounding, and what the distance of
        the stored boundary from the family's curve adds, twice the cosines of the bounces for each unit of it.

    Raises
    ------
    TableError
        If the table is not convex.
    """
    if not table.is_convex:
        raise TableError(f"{table.identity}: orbits need a convex table, but {table.convexity}")
    p, q = np.array(rotations, dtype=np.int64).reshape(-1, 2).T.copy()
    found = find_pairs(table.harmonics, p, q).reshape(-1, 2, FOUND + 1)
    found[found[:, :, FOUND] == 0.0] = np.nan
    size = float(np.abs(table.harmonics[:, 1:]).max())
    boundary = 2.0 * found[:, :, COSINES].sum(axis=1) * table.boundary_error * size
    numbers = {
        "length_gap": found[:, 0, LENGTH] - found[:, 1, LENGTH],
        "length_gap_floor": boundary + LENGTH_ROUNDING * found[:, 0, LENGTH],
    }
    for row, name in enumerate(("maximal", "minimax")):
        numbers[f"length_{name}"] = found[:, row, LENGTH]
        numbers[f"trace_{name}"] = found[:, row, TRACE]
        numbers[f"residue_{name}"] = residue(found[:, row, TRACE])
        suffix = "" if name == "maximal" else "_minimax"
        numbers[f"s_first{suffix}"] = table.arc_from_turns(found[:, row, FIRST_TURNS])
        numbers[f"p_first{suffix}"] = found[:, row, FIRST_P]
    return numbers
