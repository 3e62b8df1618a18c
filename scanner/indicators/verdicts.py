"""From readings to a verdict; what is not clear stays undecided.

The tangent vector of a regular orbit grows like that of a shear, in proportion to the bounces, while that of a
chaotic orbit grows exponentially; and the weighted averages of a regular orbit settle to many digits within
thousands of bounces, those of a chaotic one to about two (Sander and Meiss, Physica D 411:132569, 2020).  The
thresholds are calibrated on ellipses, where every orbit is regular, and on orbits of six mixed tables whose verdict
after 131072 bounces is clear (``scripts/studies/calibrate_verdicts.py``).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from scanner.indicators.readings import Readings
from scanner.quantities import CHAOTIC, PERIODS, REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL, UNDECIDED

Floats = npt.NDArray[np.float64]

SHEAR_GROWTH = 6.0
"""Growth beyond the logarithm of the bounces that a shear may reach: 1 in 1000 orbits of ellipses up to
eccentricity 0.99 has more, next to the separatrix."""
CHAOTIC_GROWTH = 9.0
"""Growth beyond the logarithm of the bounces that no regular orbit of the calibration reaches (largest seen: 7.2)."""
REGULAR_DIGITS = 4.0
"""Digits to which the averages of a regular orbit must have settled."""
CHANCE = 1e-3
"""Most often that a rotation number drawn at random may be taken for that of an island."""
DRIFT = 0.02
"""Most that an orbit of an island may seem to drift past the fraction over the whole horizon, in spacings 1/q of the
island's parts.  Curves close to a resonance of an ellipse drift by 0.1 and more, island orbits by 0.01 and less."""
CLOSEST = 1e-11
"""A rotation number is never held to be known better than this."""


@dataclass(frozen=True)
class Verdicts:
    """Verdict codes of the register, and p/q of the island (0 outside islands); shape (n,) each."""

    code: npt.NDArray[np.int8]
    island_period: npt.NDArray[np.int16]
    island_rotation: npt.NDArray[np.int16]

    def take_out_of_islands(self, orbits: npt.NDArray[np.int64]) -> None:
        """Call these orbits rotational: they lie on a resonant invariant curve."""
        self.code[orbits] = REGULAR_ROTATIONAL
        self.island_period[orbits] = 0
        self.island_rotation[orbits] = 0


def find_fractions(
    rotation: Floats, disagreement: Floats, bounces: int
) -> tuple[npt.NDArray[np.int16], npt.NDArray[np.int16]]:
    """Fraction p/q of smallest q that a rotation number cannot be told from; (0, 0) where there is none.

    Fractions with denominator up to q and margins of +-t cover about 0.6 q^2 t of the unit interval (there are
    0.3 q^2 of them); q is tried only while that is below CHANCE, so that a coincidence is unlikely.
    """
    top = np.zeros(rotation.shape, dtype=np.int16)
    bottom = np.zeros(rotation.shape, dtype=np.int16)
    known = np.maximum(disagreement, CLOSEST)
    for q in PERIODS:
        p = np.rint(rotation * q)
        tolerance = np.minimum(known, DRIFT / (q * bounces))
        near = (np.abs(rotation - p / q) <= tolerance) & (0.6 * q * q * tolerance <= CHANCE)
        fits = near & (bottom == 0) & (p > 0) & (p < q)
        top[fits] = p[fits].astype(np.int16)
        bottom[fits] = q
    return top, bottom


def judge(readings: Readings, failed: npt.NDArray[np.bool_]) -> Verdicts:
    """Give every orbit a verdict; one whose chords could not be followed is undecided."""
    excess = readings.growth - math.log(readings.bounces)
    regular = (excess <= SHEAR_GROWTH) & (readings.digits >= REGULAR_DIGITS) & ~failed
    chaotic = (excess > CHAOTIC_GROWTH) & ~failed
    top, bottom = find_fractions(np.where(regular, readings.rotation, 0.0), readings.disagreement, readings.bounces)
    code = np.full(failed.shape, UNDECIDED, dtype=np.int8)
    code[chaotic] = CHAOTIC
    code[regular] = REGULAR_ROTATIONAL
    code[bottom > 0] = REGULAR_LIBRATIONAL
    return Verdicts(code, bottom, top)
