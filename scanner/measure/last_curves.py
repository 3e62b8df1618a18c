"""The rotational invariant curves of a table that are left: how far they reach, and which of them survive."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from scanner.bounce.resonances import resonance_numbers
from scanner.errors import TableError
from scanner.measure.residues import Fate, convergents, judge_residues
from scanner.quantities import CURVE_FATES, CURVES, DIRECTIONS, REGULAR_ROTATIONAL, UNDECIDED
from scanner.tables import Table

Floats = npt.NDArray[np.float64]
Codes = npt.NDArray[np.int8]

LONGEST_ORBIT = 55
"""Bounces of the longest orbits that are sought by default; time grows as the cube."""
LARGE = 10.0
"""Residue beyond which no longer orbits are sought for a curve that is broken: they would tell the same."""


def last_curves(p: Floats, rotation: Floats, verdict: Codes) -> dict[str, float | Floats]:
    """Reach of the rotational curves from the sampled orbits of a table.

    Parameters
    ----------
    p, rotation, verdict
        Shape (orbits,): ``p0``, ``rotation_number`` and ``verdict`` of the group ``orbits``.

    Returns
    -------
    dict
        ``rotational_band_p`` and ``_error``, shape (2,): ``find_band`` for p > 0 and for p < 0, which are alike, as
        every orbit also runs backwards.
        ``rotation_range_min`` and ``_max``: of all rotational curves, rotation numbers beyond 1/2 taken from 1; NaN
        if there are none.
    """
    band, error = find_band(np.abs(p), verdict)
    rotational = verdict == REGULAR_ROTATIONAL
    folded = np.minimum(rotation, 1.0 - rotation)[rotational]
    return {
        "rotational_band_p": np.full(len(DIRECTIONS), band),
        "rotational_band_p_error": np.full(len(DIRECTIONS), error),
        "rotation_range_min": float(folded.min()) if folded.size else math.nan,
        "rotation_range_max": float(folded.max()) if folded.size else math.nan,
    }


def find_band(height: Floats, verdict: Codes) -> tuple[float, float]:
    """Smallest |p| beyond which all sampled orbits are on rotational curves.

    The band cannot begin below the highest orbit that is chaotic or in an island, and begins at the next rotational
    one above that, if the undecided orbits beyond turn out rotational too.  If none of them does, it begins at the
    next rotational orbit above all others.  So doubt enlarges the error and does not move the band.

    Parameters
    ----------
    height, verdict
        Shape (orbits,): |p| and verdict of the orbits.

    Returns
    -------
    band, error
        1 if there is no band.  Where it really begins, as far as these orbits tell, is within the error.
    """
    rotational = verdict == REGULAR_ROTATIONAL
    below = _highest(height[~rotational & (verdict != UNDECIDED)])
    band = _lowest(height[rotational & (height > below)])
    doubtful = _lowest(height[rotational & (height > _highest(height[~rotational]))])
    return band, max(band - below, doubtful - band)


def _highest(height: Floats) -> float:
    return float(height.max(initial=0.0))


def _lowest(height: Floats) -> float:
    return float(height.min(initial=1.0))


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
    growth, growth_error
        They go as (1/4) exp(growth q): below 0 where the curve survives, 0 at the break; NaN where they are rounding
        or too few.
    fate
        "survives", "broken" or "undecided".
    """

    rotation: float
    orbits: tuple[tuple[int, int], ...]
    residues: tuple[float, ...]
    growth: float
    growth_error: float
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
        Most bounces of the periodic orbits; they are sought only until large residues, or such as are all rounding,
        have told.

    Raises
    ------
    TableError
        If the table is not convex or the rotation number is not between 0 and 1.
    """
    if not 0.0 < rotation < 1.0:
        raise TableError(
            f"rotation = {rotation} must be between 0 and 1: give the mean advance of a bounce in perimeters"
        )
    orbits = convergents(min(rotation, 1.0 - rotation), longest_orbit)
    residues: list[float] = []
    judged = judge_residues([], residues)
    for number, orbit in enumerate(orbits, 1):
        residues.append(float(resonance_numbers(table, [orbit])["residue_minimax"][0]))
        judged = judge_residues([q for _, q in orbits[:number]], residues)
        all_rounding = judged.fate == "survives" and math.isnan(judged.growth)
        if all_rounding or (judged.fate == "broken" and residues[-1] > LARGE):
            break
    used = tuple(orbits[: len(residues)])
    return CurveFate(rotation, used, tuple(residues), judged.growth, judged.error, judged.fate)


def curve_numbers(table: Table) -> dict[str, npt.NDArray[np.generic]]:
    """Fate, growth of residues and last residue of the curves that every table is asked about, shape (curves,)."""
    fates = [curve_fate(table, rotation) for rotation in CURVES]
    return {
        "curve_fate": np.array([CURVE_FATES.index(found.fate) for found in fates], dtype=np.int8),
        "curve_growth": np.array([found.growth for found in fates]),
        "curve_growth_error": np.array([found.growth_error for found in fates]),
        "curve_residue": np.array([found.residues[-1] for found in fates]),
    }
