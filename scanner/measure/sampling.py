"""Initial conditions spread uniformly over the section ds dp.

Point i of a table depends on the seed, the table itself and the replicate, never on where or when it is computed.
"""

from __future__ import annotations

import hashlib
import math

import numpy as np
import numpy.typing as npt

from scanner.errors import StudyError
from scanner.tables import Table

Floats = npt.NDArray[np.float64]

BITS = 30
"""Binary digits of a point; half a unit in the last place keeps p away from -1."""


def _generator(table: Table, seed: int, replicate: int) -> np.random.Generator:
    """Generator of one replicate's scrambling, keyed by what the table is."""
    digest = hashlib.sha256(f"{seed} {replicate} {table.identity}".encode()).digest()
    return np.random.default_rng(int.from_bytes(digest, "little"))


def section_points(
    table: Table, seed: int, replicates: int, orbits: int, start: int = 0, stop: int | None = None
) -> tuple[Floats, Floats]:
    """Scrambled Sobol points of the section, replicate after replicate.

    Parameters
    ----------
    table
        The table; only its identity matters.
    seed, replicates, orbits
        ``orbits`` points in all, as many for each of the ``replicates`` independent scramblings (Owen's, after
        Matousek, J. Complexity 14:527, 1998, as scipy implements it).
    start, stop
        Which of the points to return; all by default.

    Returns
    -------
    s, p
        Arrays of shape (stop - start,): arc length over the perimeter in [0, 1), and p in (-1, 1).

    Raises
    ------
    StudyError
        If ``orbits`` is not a multiple of ``replicates``.
    """
    from scipy.stats import qmc

    if replicates < 1 or orbits < replicates or orbits % replicates:
        raise StudyError(
            f"orbits = {orbits} cannot be shared equally by replicates = {replicates}: "
            f"use a positive multiple of {max(replicates, 1)}"
        )
    share = orbits // replicates
    stop = orbits if stop is None else stop
    pieces = []
    for replicate in range(start // share, math.ceil(stop / share)):
        sampler = qmc.Sobol(d=2, scramble=True, bits=BITS, rng=_generator(table, seed, replicate))
        # A whole power of two keeps the points balanced; what is beyond the replicate's share is dropped.
        points = sampler.random_base2(math.ceil(math.log2(share)))
        first = replicate * share
        pieces.append(points[max(start - first, 0) : min(stop - first, share)])
    points = np.concatenate(pieces) + 0.5 ** (BITS + 1)
    return np.ascontiguousarray(points[:, 0]), 2.0 * points[:, 1] - 1.0
