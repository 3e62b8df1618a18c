"""Rounds of orbits on one table: twice as many in all after each, until the regular fraction is known well enough.

Every round continues the sequence of each replicate, so that what comes out is the sample of a table that was given as
many orbits at once.
"""

from __future__ import annotations

import math
from collections.abc import Mapping

import numpy as np
import numpy.typing as npt

from scanner.errors import StudyError
from scanner.indicators import orbit_numbers
from scanner.measure.fractions import regular_error
from scanner.measure.sampling import check_shares, replicate_points
from scanner.tables import Table

Array = npt.NDArray[np.generic]
Floats = npt.NDArray[np.float64]

ORBITS_AT_ONCE = 2**16
"""Orbits of one table in one call: an orbit takes some 600 bytes until the call returns."""


def follow_rounds(
    table: Table,
    seed: int,
    replicates: int,
    orbits: int,
    bounces: int,
    target_error: float | None = None,
    most_orbits: int | None = None,
    exponent_bounces: int | None = None,
    adaptive: bool = True,
) -> dict[str, Array]:
    """Sample the section of a table and follow its orbits.

    Parameters
    ----------
    table
        A convex table.
    seed, replicates, orbits
        As for ``section_points``; ``orbits`` is the first round, and the only one without a target.
    bounces, exponent_bounces, adaptive
        As for ``measure_orbits``.
    target_error
        Standard error of the regular fraction of the section to go on for.
    most_orbits
        Where to stop in any case; goes with the target.

    Returns
    -------
    dict
        Variables of the group ``orbits``, replicate after replicate.

    Raises
    ------
    StudyError, TableError
        If the numbers do not fit together or the table is not convex.
    """
    room = check_shares(replicates, orbits if most_orbits is None else most_orbits)
    done, share = 0, check_shares(replicates, orbits)
    found: dict[str, Array] = {}

    def follow(s: Floats, p: Floats) -> dict[str, Array]:
        parts = [
            orbit_numbers(
                table,
                s[start : start + ORBITS_AT_ONCE],
                p[start : start + ORBITS_AT_ONCE],
                bounces,
                exponent_bounces,
                adaptive,
            )
            for start in range(0, s.size, ORBITS_AT_ONCE)
        ]
        return {name: np.concatenate([part[name] for part in parts]) for name in parts[0]}

    while True:
        s, p = replicate_points(table, seed, replicates, done, share)
        found = _append(found, follow(s, p), replicates)
        verdict = np.asarray(found["verdict"], dtype=np.int8)
        if share == room or (target_error is not None and meets_target(verdict, replicates, target_error)):
            return found
        done, share = share, min(2 * share, room)


def check_rounds(replicates: int, orbits: int, target_error: float | None, most_orbits: int | None) -> None:
    """See that a target and the most orbits for it go together.

    Raises
    ------
    StudyError
        One line.
    """
    if (target_error is None) != (most_orbits is None):
        raise StudyError(
            f"target_error = {target_error} and most_orbits = {most_orbits} must be given together, "
            "as the target may be out of reach: give both or none"
        )
    if target_error is None or most_orbits is None:
        return
    if not 0.0 < target_error < 1.0:
        raise StudyError(f"target_error = {target_error} must be between 0 and 1: give a standard error like 0.002")
    if replicates < 2:
        raise StudyError(f"replicates = {replicates} must be at least 2 for a target_error: errors come from them")
    if most_orbits < orbits:
        raise StudyError(f"most_orbits = {most_orbits} must be at least orbits = {orbits}, the first round: raise it")


def meets_target(verdict: npt.NDArray[np.int8], replicates: int, target: float) -> bool:
    """Whether the regular fraction of the section is known to a standard error.

    To stop at the first error that happens to come out small makes errors too small.  So the error of the first half
    of each replicate's orbits has a say as well: divided by sqrt(2), the least that twice the orbits gain, it must meet
    the target too.

    Parameters
    ----------
    verdict
        Of the orbits, replicate after replicate.
    replicates, target
        Independent replicates of equal size, and the error to meet.
    """
    half = verdict.size // replicates // 2
    if not half:
        return False
    first = np.ascontiguousarray(verdict.reshape(replicates, -1)[:, :half]).reshape(-1)
    errors = regular_error(verdict, replicates), math.sqrt(0.5) * regular_error(first, replicates)
    return max(errors) <= target


def _append(before: Mapping[str, Array], after: Mapping[str, Array], replicates: int) -> dict[str, Array]:
    """Put the orbits of a round behind those of earlier ones, replicate by replicate."""
    if not before:
        return dict(after)

    def join(old: Array, new: Array) -> Array:
        shares = [part.reshape(replicates, -1, *part.shape[1:]) for part in (old, new)]
        return np.concatenate(shares, axis=1).reshape(-1, *old.shape[1:])

    return {name: join(before[name], values) for name, values in after.items()}
