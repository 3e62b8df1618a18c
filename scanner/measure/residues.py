"""Greene's criterion: whether an invariant curve survives, from the residues of the periodic orbits closing in on it.

Along the convergents of an irrational rotation number the residues tend to 0 where a curve of that rotation exists
and grow without bound where it is broken; at the break they stay near 1/4 (Greene, J. Math. Phys. 20:1183, 1979).
Nothing here knows of a particular map.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from fractions import Fraction
from typing import Literal

Fate = Literal["survives", "broken", "undecided"]

CRITICAL = 0.25
"""Residue of the periodic orbits near a curve that is about to break."""
SMALL = 0.2 * CRITICAL
"""Residues of curves that exist fall below this."""
NOTHING = 1e-9
"""Residues below this are rounding: nothing is broken."""
LARGE = 10.0
"""Beyond this a curve is taken to be broken: residues so large go on growing."""
WINDOW = 3
"""Convergents looked at together: where the boundary is symmetric some of them have smaller residues than others."""


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


def judge_residues(residues: Sequence[float]) -> Fate:
    """Tell what has become of a curve.

    Parameters
    ----------
    residues
        Residues of the elliptic (minimax) orbits along the convergents, shortest first.  Those not found are NaN.
    """
    known = [abs(residue) for residue in residues if math.isfinite(residue)]
    recent, before = known[-WINDOW:], known[-2 * WINDOW : -WINDOW]
    if len(recent) < WINDOW:
        return "undecided"
    if max(recent) < NOTHING or (before and max(recent) < min(SMALL, max(before))):
        return "survives"
    if recent[-1] > LARGE or (before and min(recent) > max(CRITICAL, *before)):
        return "broken"
    return "undecided"


def critical_parameters(
    residue_at: Callable[[float, int, int], float],
    orbits: Sequence[tuple[int, int]],
    low: float,
    high: float,
    tolerance: float = 1e-13,
) -> list[float]:
    """Parameter at which the residue of each orbit passes 1/4: along convergents they tend to where the curve breaks.

    Parameters
    ----------
    residue_at
        Residue of the elliptic orbit as a function of parameter, p and q.
    orbits
        Rotations (p, q), as from ``convergents``.
    low, high
        Parameters with the residue of every orbit below 1/4 at one and above at the other.
    tolerance
        Error of each parameter.

    Raises
    ------
    ValueError
        If a residue does not pass 1/4 between them.
    """
    from scipy.optimize import brentq

    return [
        float(brentq(lambda at, p=p, q=q: residue_at(at, p, q) - CRITICAL, low, high, xtol=tolerance))
        for p, q in orbits
    ]
