"""When the indicators look at an orbit: horizons, averaging windows and their weights.

A verdict is given at horizons T that double up to all the bounces.  It rests on the agreement of averages over the two
halves of the T bounces.  What is told of an orbit are averages over all of them, with weights that make more of few
bounces; with these it is also seen whether the orbit has settled so well that it can be left, from windows that are
longer than halves: the first and the last three quarters.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
import numpy.typing as npt

from scanner.elementary import cos_sin_array, exp_array

MINIMUM_BOUNCES = 64
FIRST_HORIZON = 512
"""Horizons are halved while they stay at least this long."""
FEWEST_HORIZONS = 4
"""An eighth, a quarter, a half and all of the bounces, however few."""
TRANSIENT = 8
"""The exponent leaves out the first T / 8 bounces, in which the tangent vector turns to the unstable direction."""
FEWEST_COMMON = 1024
"""Exponents of chaotic orbits are measured over an eighth of the bounces, and over at least this many."""


def horizons(bounces: int) -> tuple[int, ...]:
    """Numbers of bounces after which a verdict is given, each about twice the one before, the last ``bounces``."""
    count = FEWEST_HORIZONS
    while bounces >> count >= FIRST_HORIZON:
        count += 1
    return tuple(bounces >> shift for shift in reversed(range(count)))


def common_bounces(bounces: int) -> int:
    """Bounces over which the exponents of chaotic orbits are measured unless something else is asked for."""
    return min(bounces, max(bounces // TRANSIENT, FEWEST_COMMON))


@dataclass(frozen=True)
class Schedule:
    """What the streaming kernels need to know, as flat arrays.

    Attributes
    ----------
    horizons
        Bounces after which a verdict is given.
    adaptive
        Whether an orbit is left as soon as it is clear what it is.
    common
        Number of the first horizon at which an orbit may be left as chaotic.  All the orbits that are not settled as
        regular get as many bounces, and what is said of a chaotic orbit is what it did in them: an exponent read
        when an orbit happens to be found out would be too large on average.
    windows
        Shape (W, 3), int64: first bounce, length, and where its weights start in ``weights``.
    weights
        Normalised weights of the distinct window lengths, one after the other.
    marks
        Shape (M,), int64, increasing: bounces at which the tangent growth is noted; the last is all of them.
    of_window
        For each horizon its windows: the two halves; then, with quick weights, the whole, the two halves, the first
        and the last three quarters.
    of_mark
        For each horizon its marks: (end of the transient, T).
    """

    horizons: tuple[int, ...]
    adaptive: bool
    common: int
    windows: npt.NDArray[np.int64]
    weights: npt.NDArray[np.float64]
    marks: npt.NDArray[np.int64]
    of_window: tuple[tuple[int, ...], ...]
    of_mark: tuple[tuple[int, int], ...]


@lru_cache(maxsize=256)
def window_weights(length: int) -> npt.NDArray[np.float64]:
    """Weights exp(-1 / (t (1 - t))) at the midpoints t of ``length`` equal steps, with sum 1.

    Das, Saiki, Sander and Yorke, Nonlinearity 30:4111, 2017.
    """
    t = (np.arange(length) + 0.5) / length
    weights = exp_array(-1.0 / (t * (1.0 - t)))
    weights /= math.fsum(weights)
    weights.flags.writeable = False  # shared by all who ask
    return weights


@lru_cache(maxsize=2048)  # orbits in islands ask for about as many different lengths as there are returns
def quick_weights(length: int) -> npt.NDArray[np.float64]:
    """Weights sin^8(pi t) at the same midpoints, with sum 1: the Hann window of fourth order.

    The error of an average falls like length^-10 (Laskar, Frequency map analysis and quasiperiodic decompositions,
    2003): slower in the end than with ``window_weights``, but within a few hundred bounces it is smaller.
    """
    sine = cos_sin_array(0.5 * (np.arange(length) + 0.5) / length)[1]
    square = sine * sine
    weights: npt.NDArray[np.float64] = (square * square) * (square * square)
    weights /= math.fsum(weights)
    weights.flags.writeable = False
    return weights


@lru_cache(maxsize=8)
def make_schedule(bounces: int, exponent_bounces: int | None = None, adaptive: bool = True) -> Schedule:
    """Lay out horizons, windows and marks.

    Parameters
    ----------
    bounces
        Most bounces of an orbit, at least MINIMUM_BOUNCES.
    exponent_bounces
        Least bounces over which the exponent of a chaotic orbit is measured, rounded up to a horizon.
    adaptive
        Whether an orbit is left as soon as it is clear what it is; all get all the bounces otherwise.
    """
    ends = horizons(bounces)
    wanted = common_bounces(bounces) if exponent_bounces is None else exponent_bounces
    if not adaptive:
        wanted = bounces
    wanted_spans = [
        [
            (0, end // 2, window_weights),
            (end - end // 2, end // 2, window_weights),
            (0, end, quick_weights),
            (0, end // 2, quick_weights),
            (end - end // 2, end // 2, quick_weights),
            (0, end - end // 4, quick_weights),
            (end // 4, end - end // 4, quick_weights),
        ]
        for end in ends
    ]
    spans = list(dict.fromkeys(span for of_horizon in wanted_spans for span in of_horizon))
    kinds = list(dict.fromkeys((length, weigh) for _, length, weigh in spans))
    starts = dict(zip(kinds, np.cumsum([0, *(length for length, _ in kinds[:-1])]), strict=True))
    moments = sorted({moment for end in ends for moment in (end // TRANSIENT, end)})
    place = {moment: number for number, moment in enumerate(moments)}
    return Schedule(
        horizons=ends,
        adaptive=adaptive,
        common=next(number for number, end in enumerate(ends) if end >= min(wanted, bounces)),
        windows=np.array([(first, length, starts[length, weigh]) for first, length, weigh in spans], dtype=np.int64),
        weights=np.concatenate([weigh(length) for length, weigh in kinds]),
        marks=np.array(moments, dtype=np.int64),
        of_window=tuple(tuple(map(spans.index, of_horizon)) for of_horizon in wanted_spans),
        of_mark=tuple((place[end // TRANSIENT], place[end]) for end in ends),
    )
