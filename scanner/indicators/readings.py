"""What the streams of an orbit say at one horizon, before any verdict."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from scanner.elementary import log10_array
from scanner.indicators.blocks import Streams
from scanner.indicators.schedule import Schedule

Floats = npt.NDArray[np.float64]

MOST_DIGITS = 16.0
"""Agreement to the last bit counts as this many digits."""


@dataclass(frozen=True)
class Readings:
    """Indicators of n orbits at one horizon; every array has shape (n,).

    Attributes
    ----------
    bounces
        The horizon.
    rotation
        Weighted average of the advance over the whole horizon, in perimeters.
    rotation_change
        Its change between the two halves.
    digits
        Decimal digits to which the averages of advance, p and chord (over the mean chord) agree between the two
        halves: the worst of the three.
    spread
        Change of those averages between the first and the last three quarters, with quick weights: the largest.
    exponent
        Growth of the tangent vector per bounce after the transient.
    growth
        Logarithm of its growth over the whole horizon.
    chord
        Weighted average of the chord: of a regular orbit the more accurate mean.
    plain_chord
        Its plain mean: of a chaotic orbit the less scattered one.
    """

    bounces: int
    rotation: Floats
    rotation_change: Floats
    digits: Floats
    spread: Floats
    exponent: Floats
    growth: Floats
    chord: Floats
    plain_chord: Floats


def digits_of(change: Floats) -> Floats:
    """Decimal digits of agreement, -log10 of a change, at most MOST_DIGITS; NaN where the change is not known."""
    known = np.isfinite(change)
    digits = -log10_array(np.maximum(np.abs(np.where(known, change, 1.0)), 10.0**-MOST_DIGITS))
    return np.where(known, digits, np.nan)


def largest_of(change: Floats, chord_scale: float) -> Floats:
    """Largest change of the averages of advance, p and chord, shape (3, n), the last in units of ``chord_scale``."""
    found: Floats = np.maximum(np.maximum(np.abs(change[0]), np.abs(change[1])), np.abs(change[2]) / chord_scale)
    return found


def read_streams(streams: Streams, schedule: Schedule, number: int, chord_scale: float) -> Readings:
    """Read the streams at horizon ``number`` of the schedule; chords are compared in units of ``chord_scale``."""
    first, second, whole, quick_first, quick_second, early, late = schedule.of_window[number]
    settled, end = schedule.of_mark[number]
    bounces = schedule.horizons[number]
    since = int(schedule.marks[settled])
    return Readings(
        bounces=bounces,
        rotation=streams.averages[whole, 0],
        rotation_change=streams.averages[quick_second, 0] - streams.averages[quick_first, 0],
        digits=digits_of(largest_of(streams.averages[second] - streams.averages[first], chord_scale)),
        spread=largest_of(streams.averages[late] - streams.averages[early], chord_scale),
        exponent=(streams.growth[end] - streams.growth[settled]) / (bounces - since),
        growth=streams.growth[end],
        chord=streams.averages[whole, 2],
        plain_chord=streams.path[end] / bounces,
    )
