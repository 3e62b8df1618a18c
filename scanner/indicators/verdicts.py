"""From readings to a verdict; what is not clear stays undecided.

The tangent vector of a regular orbit grows like that of a shear, in proportion to the bounces, while that of a
chaotic orbit grows exponentially; and the weighted averages of a regular orbit settle to many digits within
thousands of bounces, those of a chaotic one to about two (Sander and Meiss, Physica D 411:132569, 2020).  The
thresholds are calibrated on ellipses, where every orbit is regular, and on orbits of eight mixed tables whose verdict
after 131072 bounces is clear (``scripts/studies/calibrate_verdicts.py``).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from scanner.compiled import kernel
from scanner.indicators.readings import Readings, digits_of
from scanner.indicators.schedule import FIRST_HORIZON
from scanner.quantities import CHAOTIC, PERIODS, REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL, UNDECIDED

Floats = npt.NDArray[np.float64]
Periods = npt.NDArray[np.int16]

SHEAR_GROWTH = 6.0
"""Growth beyond the logarithm of the bounces that a shear may reach: 1 in 1000 orbits of ellipses up to
eccentricity 0.99 has more, next to the separatrix."""
CHAOTIC_GROWTH = 9.0
"""Growth beyond the logarithm of the bounces that none of 1e5 orbits of ellipses reaches: the largest has 8.8, next to
the separatrix at eccentricity 0.95."""
REGULAR_DIGITS = 4.0
"""Digits to which the averages of a regular orbit must have settled."""
SETTLED_DIGITS = 8.5
"""Digits to which the first and the last three quarters must agree after FIRST_HORIZON bounces for an orbit to be
left as regular.  Of 155648 orbits, most of them of mixed tables, those that passed for shears but were chaotic by
131072 bounces reached 7.8 digits at most after 512 bounces, and 8.8 after 1024."""
DIGITS_PER_DOUBLING = 0.5
"""How much more is asked for at each later horizon: those orbits reached 9.2 after 2048 bounces and 9.7 after 4096."""
MOST_SETTLED_DIGITS = 11.0
"""Rounding leaves long orbits of the calibration no more than 12 digits."""
CHANCE = 1e-3
"""Most often that a rotation number drawn at random may be taken for that of an island."""
DRIFT = 0.02
"""Most that an orbit of an island may seem to drift past the fraction over the whole horizon, in spacings 1/q of the
island's parts.  Curves close to a resonance of an ellipse drift by 0.1 and more, island orbits by 0.01 and less."""
LONGEST_PERIOD = PERIODS[-1]
CLOSEST = 1e-11
"""A rotation number is never held to be known better than this."""
DOUBTFUL = 3e-8
"""A rotation number that is closer than this to a fraction after FIRST_HORIZON bounces, and after more in proportion,
but not as close as it is known, leaves open whether the orbit is in an island: parts of an orbit may agree by chance
better than each of them is right."""


@dataclass(frozen=True)
class Verdicts:
    """Verdict codes of the register, and p/q of the island (0 outside islands); shape (n,) each.

    ``sure`` is false where it is open whether an orbit is in an island.
    """

    code: npt.NDArray[np.int8]
    sure: npt.NDArray[np.bool_]
    island_period: Periods
    island_rotation: Periods

    @property
    def is_regular(self) -> npt.NDArray[np.bool_]:
        """Where the verdict is one of the two regular ones."""
        found: npt.NDArray[np.bool_] = (self.code == REGULAR_ROTATIONAL) | (self.code == REGULAR_LIBRATIONAL)
        return found


@kernel
def find_fractions(
    rotation: Floats, spread: Floats, closest: float, bounces: int, top: Periods, bottom: Periods
) -> None:
    """Fraction p/q of smallest q that each rotation number cannot be told from, or 0, 0, into the last two arrays.

    Fractions with denominator up to q and margins of +-t cover about 0.6 q^2 t of the unit interval (there are
    0.3 q^2 of them); q is tried only while that is below CHANCE, so that a coincidence is unlikely.
    """
    for j in range(rotation.size):
        top[j] = 0
        bottom[j] = 0
        known = max(spread[j], closest)
        for q in range(2, LONGEST_PERIOD + 1):
            p = math.floor(rotation[j] * q + 0.5)
            tolerance = min(known, DRIFT / (q * bounces))
            if abs(rotation[j] - p / q) <= tolerance and 0.6 * q * q * tolerance <= CHANCE and 0 < p < q:
                top[j] = p
                bottom[j] = q
                break


def judge(readings: Readings, failed: npt.NDArray[np.bool_]) -> Verdicts:
    """Give every orbit a verdict; one whose chords could not be followed is undecided."""
    excess = readings.growth - math.log(readings.bounces)
    regular = (excess <= SHEAR_GROWTH) & (readings.digits >= REGULAR_DIGITS) & ~failed
    chaotic = (excess > CHAOTIC_GROWTH) & ~failed
    rotation = np.where(regular, readings.rotation, 0.0)
    top, bottom, _, possible = np.empty((4, failed.size), dtype=np.int16)
    find_fractions(rotation, readings.spread, CLOSEST, readings.bounces, top, bottom)
    find_fractions(
        rotation, readings.spread, DOUBTFUL * FIRST_HORIZON / readings.bounces, readings.bounces, _, possible
    )
    code = np.full(failed.shape, UNDECIDED, dtype=np.int8)
    code[chaotic] = CHAOTIC
    code[regular] = REGULAR_ROTATIONAL
    code[bottom > 0] = REGULAR_LIBRATIONAL
    return Verdicts(code, bottom == possible, bottom, top)


def is_settled(readings: Readings, verdicts: Verdicts) -> npt.NDArray[np.bool_]:
    """Where an orbit is regular beyond doubt and need not be followed further.

    Orbits that stick to an island for longer pretend better: what is asked for grows with the horizon.
    """
    doublings = (readings.bounces // FIRST_HORIZON).bit_length() - 1
    needed = min(SETTLED_DIGITS + DIGITS_PER_DOUBLING * doublings, MOST_SETTLED_DIGITS)
    found: npt.NDArray[np.bool_] = (
        verdicts.is_regular & verdicts.sure & (digits_of(readings.spread) >= needed) & (doublings >= 0)
    )
    return found
