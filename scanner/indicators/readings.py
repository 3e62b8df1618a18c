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
    disagreement
        Change of the averages of advance, p and chord (over the mean chord) between the two halves: the largest of
        the three.
    digits
        The same in decimal digits of agreement.
    exponent
        Growth of the tangent vector per bounce after the transient.
    growth
        Logarithm of its growth over the whole horizon.
    """

    bounces: int
    rotation: Floats
    rotation_change: Floats
    disagreement: Floats
    digits: Floats
    exponent: Floats
    growth: Floats


def digits_of(change: Floats) -> Floats:
    """Decimal digits of agreement, -log10 of a change, at most MOST_DIGITS; NaN where the change is not known."""
    known = np.isfinite(change)
    digits = -log10_array(np.maximum(np.abs(np.where(known, change, 1.0)), 10.0**-MOST_DIGITS))
    return np.where(known, digits, np.nan)


def read_streams(streams: Streams, schedule: Schedule, number: int, chord_scale: float) -> Readings:
    """Read the streams at horizon ``number`` of the schedule; chords are compared in units of ``chord_scale``."""
    whole, first, second = schedule.of_window[number]
    settled, end = schedule.of_mark[number]
    bounces = schedule.horizons[number]
    change = streams.averages[second] - streams.averages[first]
    change[2] /= chord_scale
    disagreement = np.max(np.abs(change), axis=0)
    since = int(schedule.marks[settled])
    return Readings(
        bounces=bounces,
        rotation=streams.averages[whole, 0],
        rotation_change=change[0],
        disagreement=disagreement,
        digits=digits_of(disagreement),
        exponent=(streams.growth[end] - streams.growth[settled]) / (bounces - since),
        growth=streams.growth[end],
    )
