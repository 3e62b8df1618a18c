"""The rotational invariant curves of a table that are left: how far they reach, and which of them survive."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from scanner.bounce.resonances import resonance_numbers
from scanner.errors import TableError
from scanner.measure.residues import LARGE, Fate, convergents, judge_residues
from scanner.quantities import CURVE_FATES, CURVES, REGULAR_ROTATIONAL
from scanner.tables import Table

Floats = npt.NDArray[np.float64]

LONGEST_ORBIT = 55
"""Bounces of the longest orbits that are sought by default; time grows as the cube."""


def last_curves(p: Floats, rotation: Floats, verdict: npt.NDArray[np.int8]) -> dict[str, float]:
    """Reach of the rotational curves from the sampled orbits of a table.

    Parameters
    ----------
    p, rotation, verdict
        Shape (orbits,): ``p0``, ``rotation_number`` and ``verdict`` of the group ``orbits``.

    Returns
    -------
    dict
        ``rotational_band_p_forward`` and ``_backward``: smallest |p| of the orbits of one direction with nothing but
        rotational curves beyond them, 1 if there are none; ``_error`` is how far below the next orbit lies, so that
        the band ends in between.  ``rotation_range_min`` and ``_max``: of all rotational curves, rotation numbers
        beyond 1/2 taken from 1; NaN if there are none.
    """
    rotational = verdict == REGULAR_ROTATIONAL
    found = {}
    for name, side in (("forward", p > 0.0), ("backward", p < 0.0)):
        height, curve = np.abs(p[side]), rotational[side]
        others = float(height[~curve].max(initial=0.0))
        band = float(height[height > others].min(initial=1.0))
        found[f"rotational_band_p_{name}"] = band
        found[f"rotational_band_p_{name}_error"] = band - others
    folded = np.minimum(rotation, 1.0 - rotation)[rotational]
    found["rotation_range_min"] = float(folded.min()) if folded.size else math.nan
    found["rotation_range_max"] = float(folded.max()) if folded.size else math.nan
    return found


@dataclass(frozen=True)
class CurveFate:
    """What has become of the invariant curve of one rotation number.

    Attributes
    ----------
    rotation
        Its rotation number.
    orbits
        Rotations (p, q) of the periodic orbits that were used, shortest first.
    residues
        Residue of the minimax orbit of each; NaN where it was not found.
    fate
        "survives", "broken" or "undecided".
    """

    rotation: float
    orbits: tuple[tuple[int, int], ...]
    residues: tuple[float, ...]
    fate: Fate


def curve_fate(table: Table, rotation: float = CURVES[0], longest_orbit: int = LONGEST_ORBIT) -> CurveFate:
    """Judge by Greene's residues whether the curve of a rotation number survives.

    Parameters
    ----------
    table
        A convex table.
    rotation
        An irrational number in (0, 1), best a noble one as in ``quantities.CURVES``; the curve of 1 - rotation is the
        same one run backwards.
    longest_orbit
        Most bounces of the periodic orbits; longer ones are not sought once the curve is known to be broken.

    Raises
    ------
    TableError
        If the table is not convex or the rotation number is not between 0 and 1.
    """
    try:
        orbits = convergents(min(rotation, 1.0 - rotation), longest_orbit)
    except ValueError as problem:
        raise TableError(f"{problem}: give the mean advance of a bounce in perimeters") from None
    residues: list[float] = []
    for p, q in orbits:
        residues.append(float(resonance_numbers(table, [(p, q)])["residue_minimax"][0]))
        if residues[-1] > LARGE and judge_residues(residues) == "broken":
            break
    return CurveFate(rotation, tuple(orbits[: len(residues)]), tuple(residues), judge_residues(residues))


def curve_numbers(table: Table) -> dict[str, npt.NDArray[np.generic]]:
    """Fate and last residue of the curves that every table is asked about, each of shape (curves,)."""
    fates = [curve_fate(table, rotation) for rotation in CURVES]
    return {
        "curve_fate": np.array([CURVE_FATES.index(found.fate) for found in fates], dtype=np.int8),
        "curve_residue": np.array([found.residues[-1] for found in fates]),
    }
