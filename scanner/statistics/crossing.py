"""Where along a family a quantity crosses a level, from the replicates of each table."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.interpolate import PchipInterpolator
from scipy.stats import norm, t

from scanner.errors import ScannerError

Floats = npt.NDArray[np.float64]

RESAMPLES = 2000


@dataclass(frozen=True)
class Crossing:
    """Critical value of a parameter.

    Attributes
    ----------
    value
        Where the quantity crosses the level; NaN unless it does so exactly once.
    stderr
        Standard deviation over the resamples that cross; NaN where the value is, or where fewer than two cross.
    low, high
        Bootstrap interval; infinite on a side where too many resamples no longer cross within the range, NaN where
        the value is.
    confidence
        Of the interval.
    interpolation
        How far a monotone cubic through the same points moves the value: bound of what the spacing of the tables
        may be worth, not part of the interval.
    crossings
        All places where the mean crosses the level, in order: empty, one or several.
    unique
        Share of the resamples that cross exactly once.
    """

    value: float
    stderr: float
    low: float
    high: float
    confidence: float
    interpolation: float
    crossings: tuple[float, ...]
    unique: float


def find_crossing(
    parameter: npt.ArrayLike,
    replicates: npt.ArrayLike,
    level: float,
    *,
    generator: np.random.Generator,
    confidence: float = 0.95,
    resamples: int = RESAMPLES,
) -> Crossing:
    """Find where the mean over replicates crosses a level, linearly between neighbouring tables.

    The bootstrap draws replicates anew, with replacement, of each table by itself, as no two tables share a random
    number.  Means of few resampled replicates scatter too little: the interval takes percentiles further out, by what
    Student's distribution and the root of R / (R - 1) ask for (Hesterberg, Am. Stat. 69:371, 2015 [from memory]).  In
    a resample that crosses several times the first place counts for the lower end and the last for the upper one; one
    that does not cross counts as a crossing beyond the end of the range that it misses.

    Parameters
    ----------
    parameter
        Shape (A,), A >= 2, increasing.
    replicates
        Shape (A, R), R >= 2.  Tables with a NaN (not convex, not done) are left out.
    level
        The level.
    generator
        Source of the resampling's randomness.
    confidence
        Of the interval, between 0 and 1.
    resamples
        How many, at least 100.

    Returns
    -------
    Crossing
        With all crossings of the mean; value and interval where there is one.

    Raises
    ------
    ScannerError
        Shapes do not fit, fewer than two tables have numbers, or another argument makes no sense.
    """
    places, values = _checked(parameter, replicates, level, confidence, resamples)
    means = values.mean(axis=1)
    crossings = _crossings(places, means - level)
    firsts, lasts, counts = _resample(places, values - level, generator, resamples)
    unique = float((counts == 1).mean())
    if len(crossings) != 1:
        nothing = math.nan
        return Crossing(nothing, nothing, nothing, nothing, confidence, nothing, crossings, unique)
    size = values.shape[1]
    tail = float(norm.sf(math.sqrt(size / (size - 1)) * t.ppf(0.5 + 0.5 * confidence, size - 1)))
    (value,) = crossings
    crossing = counts > 0
    middles = 0.5 * (firsts[crossing] + lasts[crossing])
    return Crossing(
        value=value,
        stderr=float(middles.std(ddof=1)) * math.sqrt(size / (size - 1)) if middles.size > 1 else math.nan,
        # A percentile that is one of the resamples: nothing is interpolated towards an infinite one.
        low=float(np.quantile(firsts, tail, method="inverted_cdf")),
        high=float(np.quantile(lasts, 1.0 - tail, method="inverted_cdf")),
        confidence=confidence,
        interpolation=_interpolation_error(places, means - level, value),
        crossings=crossings,
        unique=unique,
    )


def _checked(
    parameter: npt.ArrayLike, replicates: npt.ArrayLike, level: float, confidence: float, resamples: int
) -> tuple[Floats, Floats]:
    places = np.asarray(parameter, dtype=np.float64)
    values = np.asarray(replicates, dtype=np.float64)
    if places.ndim != 1 or not (np.diff(places) > 0.0).all():
        raise ScannerError("the parameter must be a row of increasing values: sort the tables by it")
    if values.ndim != 2 or values.shape[0] != places.size or values.shape[1] < 2:
        raise ScannerError(
            f"replicates of shape {values.shape} must have {places.size} rows, one a table, of at least 2 replicates"
        )
    if not math.isfinite(level):
        raise ScannerError(f"level = {level} must be a finite number")
    if not 0.0 < confidence < 1.0:
        raise ScannerError(f"confidence = {confidence} must lie between 0 and 1, for example 0.95")
    if resamples < 100:
        raise ScannerError(f"resamples = {resamples} must be at least 100")
    known = np.isfinite(values).all(axis=1)
    if np.count_nonzero(known) < 2:
        raise ScannerError(f"{np.count_nonzero(known)} of {places.size} tables have numbers: a crossing needs two")
    return places[known], values[known]


def _crossings(places: Floats, heights: Floats) -> tuple[float, ...]:
    """Zeros of the line through all points; a point at 0 counts as above."""
    (cells,) = np.nonzero(np.diff(heights >= 0.0))
    return tuple(_zeros(places, heights, cells).tolist())


def _zeros(places: Floats, heights: Floats, cells: npt.NDArray[np.intp]) -> Floats:
    left, right = np.take(heights, cells), np.take(heights, cells + 1)
    return places[cells] + (places[cells + 1] - places[cells]) * left / (left - right)


def _resample(
    places: Floats, heights: Floats, generator: np.random.Generator, resamples: int
) -> tuple[Floats, Floats, npt.NDArray[np.intp]]:
    """First and last crossing of every resample, shape (resamples,), and how many it has."""
    tables, size = heights.shape
    falls = heights[0].mean() >= heights[-1].mean()
    firsts, lasts = np.empty(resamples), np.empty(resamples)
    counts = np.zeros(resamples, dtype=np.intp)
    for number in range(resamples):
        chosen = generator.integers(size, size=(tables, size))
        means = np.take_along_axis(heights, chosen, axis=1).mean(axis=1)
        (cells,) = np.nonzero(np.diff(means >= 0.0))
        counts[number] = cells.size
        if cells.size:
            firsts[number], lasts[number] = _zeros(places, means, cells[[0, -1]])
        else:
            firsts[number] = lasts[number] = math.inf if (means[0] >= 0.0) == falls else -math.inf
    return firsts, lasts, counts


def _interpolation_error(places: Floats, heights: Floats, value: float) -> float:
    """Distance to the crossing of a shape-preserving cubic, which crosses in the same cell."""
    found = PchipInterpolator(places, heights, extrapolate=False).roots(discontinuity=False)
    found = found[np.isfinite(found)]  # a stretch that lies on the level is marked by a NaN
    return float(np.abs(found - value).min()) if found.size else 0.0
