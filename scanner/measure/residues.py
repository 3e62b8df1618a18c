"""Greene's criterion: whether an invariant curve survives, from the residues of the periodic orbits closing in on it.

Along the convergents p/q of an irrational rotation number the residues go as (1/4) f^q: to 0 where a curve of that
rotation exists, without bound where it is broken, with f = 1 at the break (Greene, J. Math. Phys. 20:1183, 1979).
That they fall at least exponentially in q where the curve exists is proven (Falcolini and de la Llave, J. Stat. Phys.
67:609, 1992; MacKay, Nonlinearity 5:161, 1992).  Nothing here knows of a particular map.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Literal

import numpy as np
import numpy.typing as npt

from scanner.elementary import log_array

Floats = npt.NDArray[np.float64]
Fate = Literal["survives", "broken", "undecided"]

CRITICAL = 0.25
"""Residue of the periodic orbits near a curve that is about to break."""
NOTHING = 1e-9
"""Residues below this are rounding: how small they are is not known."""
WINDOW = 4
"""Convergents looked at together: where the boundary is symmetric, those of some periods have smaller residues."""
FEWEST = 3
"""Convergents that a growth with an error needs."""
DOUBT = 3.0
"""Errors that a growth must be away from 0."""
MARGIN = 0.25
"""Least distance of the logarithm of the last residue from that of 1/4, by the fit: at the break of the standard map
the residues of orbits up to period 55 scatter by up to 0.06 about it."""


@dataclass(frozen=True)
class Growth:
    """How residues go with the period: (1/4) exp(growth q).

    Attributes
    ----------
    growth
        Logarithm of Greene's f; NaN where it is not known, as where all residues are rounding.
    error
        Standard error of the fit.
    fate
        What it says of the curve.
    """

    growth: float
    error: float
    fate: Fate


def convergents(rotation: float, largest_period: int) -> list[tuple[int, int]]:
    """Best rational approximations (p, q) of a rotation number in (0, 1), 2 <= q <= ``largest_period``.

    Raises
    ------
    ValueError
        If the rotation number is not between 0 and 1.
    """
    if not 0.0 < rotation < 1.0:
        raise ValueError(f"rotation = {rotation} must be between 0 and 1")
    found = []
    rest = Fraction(rotation)
    last, this = (1, 0), (0, 1)
    while rest.numerator:
        rest = 1 / rest
        whole = math.floor(rest)
        rest -= whole
        last, this = this, (whole * this[0] + last[0], whole * this[1] + last[1])
        if this[1] > largest_period:
            break
        if this[1] > 1:
            found.append(this)
    return found


def judge_residues(periods: Sequence[int], residues: Sequence[float]) -> Growth:
    """Tell what has become of a curve, by a fit through residue 1/4 at period 0 to the last convergents.

    The curve survives or is broken where the growth is known to be negative or positive, the last residue would be
    told from 1/4 by the fit, and the residues themselves go the same way from one convergent to the next.

    Parameters
    ----------
    periods
        Periods q along the convergents, shortest first.
    residues
        Residues of their elliptic (minimax) orbits.  Those not found are NaN.
    """
    size = np.abs(np.asarray(residues, dtype=np.float64))
    found = np.isfinite(size)
    q, size = np.asarray(periods, dtype=np.float64)[found][-WINDOW:], size[found][-WINDOW:]
    told = size >= NOTHING
    if q.size < FEWEST or not told.any():
        return Growth(math.nan, math.nan, "undecided" if q.size < FEWEST else "survives")
    height = log_array(np.maximum(size, NOTHING) / CRITICAL)
    # What is below rounding is taken to lie on the line of the others, unless that line is not so low.
    height = np.where(told, height, np.minimum(height, _slope(q[told], height[told]) * q))
    growth = _slope(q, height)
    error = math.sqrt(math.fsum((height - growth * q) ** 2) / (q.size - 1) / math.fsum(q * q))
    trend = math.fsum((q - math.fsum(q) / q.size) * height)
    if abs(growth) <= DOUBT * error or abs(growth) * q[-1] <= MARGIN or growth * trend <= 0.0:
        return Growth(growth, error, "undecided")
    return Growth(growth, error, "survives" if growth < 0.0 else "broken")


def _slope(q: Floats, height: Floats) -> float:
    """Slope of the line through the origin that fits best, by least squares."""
    return math.fsum(q * height) / math.fsum(q * q)
