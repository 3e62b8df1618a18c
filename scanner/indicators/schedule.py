"""When the indicators look at an orbit: horizons, averaging windows and their weights.

A verdict is given at several horizons T, the last being all the bounces.  Each uses three windows: all T bounces and
the two consecutive halves that end at T.  Windows that coincide are kept once.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
import numpy.typing as npt

from scanner.elementary import exp_array

MINIMUM_BOUNCES = 64
FRACTIONS = (8, 4, 2, 1)
"""Horizons are the bounces divided by these, rounded down."""
TRANSIENT = 8
"""The exponent leaves out the first T / 8 bounces, in which the tangent vector turns to the unstable direction."""


def horizons(bounces: int) -> tuple[int, ...]:
    """Numbers of bounces after which a verdict is given, the last being ``bounces``."""
    return tuple(bounces // fraction for fraction in FRACTIONS)


@dataclass(frozen=True)
class Schedule:
    """What the streaming kernels need to know, as flat arrays.

    Attributes
    ----------
    horizons
        Bounces after which a verdict is given.
    windows
        Shape (W, 3), int64: first bounce, length, and where its weights start in ``weights``.
    weights
        Normalised weights of the distinct window lengths, one after the other.
    marks
        Shape (M,), int64, increasing: bounces at which the tangent growth is noted; the last is all of them.
    of_window
        For each horizon its windows: (whole, first half, second half).
    of_mark
        For each horizon its marks: (end of the transient, T).
    """

    horizons: tuple[int, ...]
    windows: npt.NDArray[np.int64]
    weights: npt.NDArray[np.float64]
    marks: npt.NDArray[np.int64]
    of_window: tuple[tuple[int, int, int], ...]
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


@lru_cache(maxsize=8)
def make_schedule(bounces: int) -> Schedule:
    """Lay out horizons, windows and marks for orbits of ``bounces`` bounces, at least MINIMUM_BOUNCES."""
    ends = horizons(bounces)
    spans: dict[tuple[int, int], int] = {}
    of_window = []
    for end in ends:
        half = end // 2
        chosen = ((0, end), (end - 2 * half, half), (end - half, half))
        of_window.append(tuple(spans.setdefault(span, len(spans)) for span in chosen))
    lengths = sorted({length for _, length in spans})
    pieces = [window_weights(length) for length in lengths]
    starts = dict(zip(lengths, np.cumsum([0, *lengths[:-1]]), strict=True))
    moments = sorted({moment for end in ends for moment in (end // TRANSIENT, end)})
    place = {moment: number for number, moment in enumerate(moments)}
    return Schedule(
        horizons=ends,
        windows=np.array([(first, length, starts[length]) for first, length in spans], dtype=np.int64),
        weights=np.concatenate(pieces),
        marks=np.array(moments, dtype=np.int64),
        of_window=tuple((a, b, c) for a, b, c in of_window),
        of_mark=tuple((place[end // TRANSIENT], place[end]) for end in ends),
    )
