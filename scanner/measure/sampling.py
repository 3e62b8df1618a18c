"""Initial conditions spread uniformly over the section ds dp, or rather over the part that its images make whole.

An orbit run backwards goes through (s, -p), and a symmetry of the table takes orbits to orbits: points that are images
of each other need not be followed twice.  All images of the part have the same area, so that a fraction of the part
is that of the section.

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
"""Binary digits of a point; half a unit in the last place keeps p away from 0."""


def _generator(table: Table, seed: int, replicate: int) -> np.random.Generator:
    """Generator of one replicate's scrambling, keyed by what the table is."""
    digest = hashlib.sha256(f"{seed} {replicate} {table.identity}".encode()).digest()
    return np.random.default_rng(int.from_bytes(digest, "little"))


def section_points(
    table: Table, seed: int, replicates: int, orbits: int, start: int = 0, stop: int | None = None
) -> tuple[Floats, Floats]:
    """Scrambled Sobol points of the fundamental part of the section, replicate after replicate.

    Parameters
    ----------
    table
        The table; its identity and its symmetry matter.
    seed, replicates, orbits
        ``orbits`` points in all, as many for each of the ``replicates`` independent scramblings (random linear
        ones with a digital shift: Matousek, J. Complexity 14:527, 1998, as scipy implements it).
    start, stop
        Which of the points to return; all by default.

    Returns
    -------
    s, p
        Arrays of shape (stop - start,): arc length over the perimeter in [0, 1), from ``table.symmetry.start`` over
        ``table.symmetry.width``, and p in (0, 1).

    Raises
    ------
    StudyError
        If ``orbits`` is not a multiple of ``replicates``.
    """
    share = check_shares(replicates, orbits)
    stop = orbits if stop is None else stop
    pieces = []
    for replicate in range(start // share, math.ceil(stop / share)):
        first = replicate * share
        pieces.append(_unit_points(table, seed, replicate, max(start - first, 0), min(stop - first, share)))
    return _spread(table, np.concatenate(pieces))


def replicate_points(table: Table, seed: int, replicates: int, start: int, stop: int) -> tuple[Floats, Floats]:
    """Points ``start`` to ``stop`` of every replicate's sequence, replicate after replicate; see `section_points`."""
    pieces = [_unit_points(table, seed, replicate, start, stop) for replicate in range(replicates)]
    return _spread(table, np.concatenate(pieces))


def check_shares(replicates: int, orbits: int) -> int:
    """Orbits of each replicate.

    Raises
    ------
    StudyError
        If they cannot be shared equally.
    """
    if replicates < 1 or orbits < replicates or orbits % replicates:
        raise StudyError(
            f"orbits = {orbits} cannot be shared equally by replicates = {replicates}: "
            f"use a positive multiple of {max(replicates, 1)}"
        )
    return orbits // replicates


def _unit_points(table: Table, seed: int, replicate: int, start: int, stop: int) -> Floats:
    """Points ``start`` to ``stop`` of one replicate's sequence in the unit square, shape (stop - start, 2)."""
    from scipy.stats import qmc

    sampler = qmc.Sobol(d=2, scramble=True, bits=BITS, rng=_generator(table, seed, replicate))
    # A whole power of two keeps the points balanced; what is beyond is dropped.
    points: Floats = sampler.random_base2(math.ceil(math.log2(stop)))[start:stop]
    return points + 0.5 ** (BITS + 1)


def _spread(table: Table, points: Floats) -> tuple[Floats, Floats]:
    """Points of the fundamental part of the section from points of the unit square."""
    symmetry = table.symmetry
    s = (symmetry.start + symmetry.width * points[:, 0]) % 1.0
    return s, np.ascontiguousarray(points[:, 1])
