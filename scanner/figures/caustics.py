"""The caustic of an orbit on an invariant curve: the envelope of its chords."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]

MOST_LAG = 1024
CLOSE = (1e-5, 0.01)
"""Bounds of a return that is taken for a neighbour: closer is lost in rounding, farther may be another curve."""


class Caustic(NamedTuple):
    """A caustic by points on it, shape (n, 2).

    ``tangents`` are the unit vectors of the chords that touch it there, shape (n, 2), ``steps`` the distances to the
    next point along it, shape (n,).
    """

    points: Floats
    tangents: Floats
    steps: Floats


def find_caustic(x: Floats, y: Floats, s: Floats, p: Floats) -> Caustic | None:
    """Find where the chords of an orbit touch their envelope.

    On an invariant curve the orbit comes back close to each of its points after the same number of bounces, the lag.
    The bounces one lag before and one lag after a bounce lie next to it on the curve, to either side, so that their
    chords give the derivative of the chord along the curve; the error is of second order in the distance.

    Parameters
    ----------
    x, y, s, p
        Bounces of one orbit, shape (n,); s as a fraction of the perimeter.

    Returns
    -------
    Caustic or None
        The part of the envelope inside the table.  None for an orbit without close returns, as on no curve, and for a
        periodic one, of which there is no curve to be seen.
    """
    lag = _closest_return(s, p)
    if lag is None:
        return None
    bounces = np.column_stack([x, y])
    along_chords = np.diff(bounces, axis=0)
    chords = np.hypot(*along_chords.T)
    rays = along_chords / chords[:, None]
    here = slice(lag, len(chords) - lag)
    moved = bounces[2 * lag : -1] - bounces[: len(chords) - 2 * lag]
    turned = rays[2 * lag :] - rays[: len(chords) - 2 * lag]
    with np.errstate(divide="ignore", invalid="ignore"):
        reach = -_cross(rays[here], moved) / _cross(rays[here], turned)
    inside = (reach > 0.0) & (reach < chords[here])
    points = bounces[:-1][here] + np.where(inside, reach, np.nan)[:, None] * rays[here]
    steps = np.hypot(*(points[lag:] - points[:-lag]).T)
    known = np.isfinite(steps)
    return Caustic(points[:-lag][known], rays[here][:-lag][known], steps[known])


def _closest_return(s: Floats, p: Floats) -> int | None:
    """Lag after which the whole orbit comes back closest to itself, if that is close but not the same points."""
    lags = range(1, min(MOST_LAG, len(s) // 4) + 1)
    far = np.array([_largest_distance(s, p, lag) for lag in lags])
    far[far < CLOSE[0]] = np.inf
    best = int(far.argmin())
    return lags[best] if far[best] < CLOSE[1] else None


def _largest_distance(s: Floats, p: Floats, lag: int) -> float:
    along = s[lag:] - s[:-lag]
    return float(np.hypot(along - np.rint(along), p[lag:] - p[:-lag]).max())


def _cross(a: Floats, b: Floats) -> Floats:
    found: Floats = a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0]
    return found
