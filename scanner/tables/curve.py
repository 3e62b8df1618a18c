"""A boundary as a finite Fourier series, from its coefficients or from samples of its displacement."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from scanner.errors import TableError
from scanner.tables.boundary import FloatArray, evaluate, fourier_series

MOST_HARMONICS = 512
"""Harmonics that a boundary may have: a bounce costs time in proportion."""

TOLERANCE = 1e-14
"""What the harmonics left out may add up to, relative to the largest."""

ROUNDING = float(np.finfo(np.float64).eps)

_FEWEST_SAMPLES = 64
_MOST_SAMPLES = 4 * MOST_HARMONICS

Displacement = Callable[[FloatArray], tuple[FloatArray, FloatArray]]
"""From angles in turns to the displacement (dx, dy) of the points of an ellipse with these eccentric angles."""


@dataclass(frozen=True)
class Shape:
    """What a family knows of its curvature in closed form, where the series of the boundary cannot tell.

    ``reason`` says why the curve is not convex, and is empty if it is.
    """

    curvature_min: float
    curvature_max: float
    reason: str = ""


@dataclass(frozen=True)
class Curve:
    """A closed curve, counter-clockwise or not, as a family gives it.

    Attributes
    ----------
    harmonics : float64[4, K + 1]
        The boundary, as :mod:`scanner.tables.boundary` describes.
    error : float
        Largest distance from the family's own curve, relative to the size.
    residual : float
        R.m.s. distance of measured points from the curve fitted to them, in their unit; 0 where nothing was measured.
    shape : Shape, optional
        Curvature and convexity, where the family knows better than the series.
    digest : str
        Hash of the data that a parameter only points to, to identify the table by.
    """

    harmonics: FloatArray
    error: float = ROUNDING
    residual: float = 0.0
    shape: Shape | None = None
    digest: str = ""


def ellipse_harmonics(major: float, minor: float) -> FloatArray:
    """Harmonics of an ellipse by its eccentric angle."""
    return np.array([[0.0, major], [0.0, 0.0], [0.0, 0.0], [0.0, minor]])


def minor_axis(eccentricity: float) -> float:
    """Semi-minor axis of an ellipse of semi-major axis 1, without cancellation."""
    return float(np.sqrt((1.0 - eccentricity) * (1.0 + eccentricity)))


def displaced_ellipse(eccentricity: float, displacement: Displacement) -> Curve:
    """Sample the displacement of an ellipse with twice as many points until its harmonics have died away.

    Only the displacement is sampled, so that the rounding of the samples is relative to it and an undeformed
    ellipse keeps its single harmonic.

    Raises
    ------
    TableError
        If more than ``MOST_HARMONICS`` harmonics are needed to ``TOLERANCE``.
    """
    base = ellipse_harmonics(1.0, minor_axis(eccentricity))
    count = _FEWEST_SAMPLES
    while count <= _MOST_SAMPLES:
        harmonics = series_of_samples(*displacement(np.arange(count) / count), (count - 1) // 2)
        harmonics[:, :2] += base
        if unresolved_part(harmonics) <= TOLERANCE:
            kept = trim(harmonics)
            if kept.shape[1] <= MOST_HARMONICS + 1:
                return Curve(kept, _error_between_samples(kept, base, displacement, count))
        count *= 2
    if not _bends_inwards(base, displacement):
        raise TableError(
            f"the boundary needs more than {MOST_HARMONICS} harmonics to reach {TOLERANCE:g} relative; "
            "lower the eccentricity, the amplitude or the harmonic"
        )
    kept = harmonics[:, : MOST_HARMONICS + 1].copy()
    return Curve(kept, _error_between_samples(kept, base, displacement, _MOST_SAMPLES))


def series_of_samples(x: FloatArray, y: FloatArray, highest: int) -> FloatArray:
    """Harmonics 0..highest of a closed curve from equally spaced samples of one round."""
    return np.concatenate([fourier_series(x, highest), fourier_series(y, highest)])


def magnitudes(harmonics: FloatArray) -> FloatArray:
    """Bound on what each harmonic adds to the position, length K + 1."""
    bound: FloatArray = np.sqrt((harmonics * harmonics).sum(axis=0))
    return bound


def size(harmonics: FloatArray) -> float:
    """Give the largest coefficient, about the semi-major axis: what errors are relative to."""
    return float(np.abs(harmonics[:, 1:]).max())


def bring_to_unit_size(harmonics: FloatArray) -> tuple[FloatArray, float]:
    """Centre a boundary and divide it by its size: nothing must depend on the unit of length or on the place.

    Returns
    -------
    harmonics, size
        Of the same shape, and what they were divided by.
    """
    unit = size(harmonics)
    scaled = harmonics / unit
    scaled[:, 0] = 0.0
    return scaled, unit


def tails(sizes: FloatArray) -> FloatArray:
    """Sum of each harmonic and all above it."""
    sums: FloatArray = sizes[::-1].cumsum()[::-1]
    return sums


def unresolved_part(harmonics: FloatArray) -> float:
    """Sum of the last quarter of the harmonics, relative to the largest: what samples as many leave open."""
    sizes = magnitudes(harmonics)
    return float(tails(sizes)[3 * len(sizes) // 4] / size(harmonics))


def trim(harmonics: FloatArray) -> FloatArray:
    """Drop the highest harmonics that together stay below ``TOLERANCE`` of the largest."""
    sizes = magnitudes(harmonics)
    needed = np.flatnonzero(tails(sizes) > TOLERANCE * size(harmonics))
    return np.ascontiguousarray(harmonics[:, : max(2, int(needed[-1]) + 1)])


def _error_between_samples(harmonics: FloatArray, base: FloatArray, displacement: Displacement, count: int) -> float:
    """Largest distance from the family's curve half way between the samples, relative to the largest harmonic."""
    turns = (np.arange(count) + 0.5) / count
    x, y = evaluate(base, turns)[:2]
    dx, dy = displacement(turns)
    found = evaluate(harmonics, turns)
    distance = np.sqrt((found[0] - (x + dx)) ** 2 + (found[1] - (y + dy)) ** 2).max()
    return max(ROUNDING, float(distance / size(harmonics)))


def _bends_inwards(base: FloatArray, displacement: Displacement) -> bool:
    """Whether a polygon of samples has an inward corner, which no convex curve's has."""
    turns = np.arange(_MOST_SAMPLES) / _MOST_SAMPLES
    x, y = evaluate(base, turns)[:2]
    dx, dy = displacement(turns)
    edges = np.diff(np.array([x + dx, y + dy]), axis=1, append=np.array([[x[0] + dx[0]], [y[0] + dy[0]]]))
    following = np.roll(edges, -1, axis=1)
    corners = edges[0] * following[1] - edges[1] * following[0]
    lengths = np.sqrt((edges**2).sum(axis=0) * (following**2).sum(axis=0))
    return bool((corners < -1e-9 * lengths).any())
