"""The regular fraction after infinitely many bounces, from verdicts after finitely many.

Chaotic orbits stick to islands: recurrence times fall off like t^-g, with g between 1.3 and 1.6 in most
area-preserving maps (common practice, no single source), so that the chaotic measure not yet found out after n
bounces falls like ``f(n) = f_infinity + c n^-(g - 1)``.  A few horizons within a factor of eight do not determine g:
it is averaged over that range, each g as probable as it explains the data, and the spread over it is in the error.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.optimize import brentq
from scipy.stats import f, t

from scanner.errors import ScannerError

Floats = npt.NDArray[np.float64]

EXPONENT_RANGE = (1.3, 1.6)
"""Exponents of stickiness that are taken as equally probable beforehand."""
GRID = 31
"""Exponents tried in that range."""
CLEAR_FALL = 2.0
"""Standard errors by which the fraction must fall over the horizons before its law is extrapolated."""
MISFIT = 0.01
"""Probability of the data below which no exponent of the range is held to explain them."""


@dataclass(frozen=True)
class Extrapolation:
    """A fraction at infinite horizon.

    Attributes
    ----------
    value, stderr
        The fraction and its standard error, sampling and spread over the exponent together; NaN where undecided.
    low, high
        Interval that holds it with probability ``confidence``, within [0, 1]; NaN where undecided.
    confidence
        Of the interval.
    exponent, exponent_stderr
        Mean and standard deviation of g given the data; those of the range alone (1.45, 0.09) where they say nothing.
    misfit
        Probability of data that fit as badly or worse, at the exponent that fits best.
    last, last_stderr
        The fraction at the longest horizon and its standard error.
    reason
        Why it is undecided, in one line; empty where it is not.
    """

    value: float
    stderr: float
    low: float
    high: float
    confidence: float
    exponent: float
    exponent_stderr: float
    misfit: float
    last: float
    last_stderr: float
    reason: str = ""

    @property
    def decided(self) -> bool:
        """Whether the data allow an extrapolation."""
        return not self.reason


def extrapolate_fraction(
    horizons: npt.ArrayLike,
    fractions: npt.ArrayLike,
    *,
    exponents: tuple[float, float] = EXPONENT_RANGE,
    confidence: float = 0.95,
) -> Extrapolation:
    """Extrapolate a fraction that falls like a power of the horizon.

    The steps by which the fraction falls from one horizon to the next are counts of orbits found out in between,
    independent and with a variance in proportion to the count; weighted so, the best amplitude for a given g is the
    whole fall over the fall of n^-(g-1).  The error of each extrapolated value comes from the scatter of the
    replicates, which share no orbit, so that the correlation between horizons is in it.

    Parameters
    ----------
    horizons
        Shape (H,), H >= 3, bounces, increasing.
    fractions
        Shape (R, H), R >= 2: by replicate and horizon.
    exponents
        Range of the exponent g of stickiness, equally probable in it; 1 < low < high.
    confidence
        Of the interval, between 0 and 1.

    Returns
    -------
    Extrapolation
        Undecided, with the reason, where a number is missing, where the fraction does not clearly fall, where no
        exponent of the range explains how it falls, or where the extrapolated value is clearly negative.

    Raises
    ------
    ScannerError
        Shapes do not fit, or the range or the confidence makes no sense.
    """
    bounces, table = _checked(horizons, fractions, exponents, confidence)
    replicates = table.shape[0]
    last = float(table[:, -1].mean())
    last_stderr = _stderr(table[:, -1])
    grid = np.linspace(*exponents, GRID)
    falls = table[:, :-1] - table[:, 1:]
    fall, fall_stderr = float(falls.mean(axis=0).sum()), _stderr(falls.sum(axis=1))
    if not np.isfinite(table).all():
        return _undecided(confidence, last, last_stderr, math.nan, "a fraction is missing")
    if fall <= CLEAR_FALL * fall_stderr:
        return _undecided(
            confidence, last, last_stderr, math.nan, "no clear fall with the horizon, the last value stands"
        )

    # Shape (GRID, H - 1): share of the whole fall that each step should have.
    powers = bounces ** -(grid[:, None] - 1.0)
    shares = (powers[:, :-1] - powers[:, 1:]) / (powers[:, :1] - powers[:, -1:])
    beyond = powers[:, -1] / (powers[:, 0] - powers[:, -1])
    # The variance of all steps together, pooled over them; each has the part of it that it has of the fall.
    variance = float(falls.var(axis=0, ddof=1).sum()) / replicates
    if variance == 0.0:
        return _undecided(confidence, last, last_stderr, math.nan, "all replicates fall alike, which leaves no error")
    squares = ((falls.mean(axis=0) - fall * shares) ** 2 / (variance * shares)).sum(axis=1)
    # The variance is itself an estimate, so that the squares follow Fisher's distribution and not that of chi squared.
    steps = falls.shape[1]
    misfit = float(f.sf(squares.min() / (steps - 1), steps - 1, (replicates - 1) * steps))
    if misfit < MISFIT:
        return _undecided(confidence, last, last_stderr, misfit, "does not fall like such a power")

    weights = np.exp(-0.5 * (squares - squares.min()))
    weights /= weights.sum()
    limits = table[:, -1] - np.multiply.outer(beyond, falls.sum(axis=1))
    centres, widths = limits.mean(axis=1), limits.std(axis=1, ddof=1) / math.sqrt(replicates)
    value = float(weights @ centres)
    stderr = math.sqrt(float(weights @ (widths**2 + (centres - value) ** 2)))
    if value < -CLEAR_FALL * stderr:
        return _undecided(confidence, last, last_stderr, misfit, "the extrapolated fraction is clearly negative")
    low, high = _interval(centres, widths, weights, replicates - 1, confidence)
    exponent = float(weights @ grid)
    return Extrapolation(
        value=min(max(value, 0.0), 1.0),
        stderr=stderr,
        low=min(max(low, 0.0), 1.0),
        high=min(max(high, 0.0), 1.0),
        confidence=confidence,
        exponent=exponent,
        exponent_stderr=math.sqrt(float(weights @ (grid - exponent) ** 2)),
        misfit=misfit,
        last=last,
        last_stderr=last_stderr,
    )


def _checked(
    horizons: npt.ArrayLike, fractions: npt.ArrayLike, exponents: tuple[float, float], confidence: float
) -> tuple[Floats, Floats]:
    bounces = np.asarray(horizons, dtype=np.float64)
    table = np.asarray(fractions, dtype=np.float64)
    if bounces.ndim != 1 or bounces.size < 3 or bounces[0] < 1 or not (np.diff(bounces) > 0.0).all():
        raise ScannerError(f"horizons {bounces.tolist()} must be at least three numbers of bounces, increasing")
    if table.ndim != 2 or table.shape[0] < 2 or table.shape[1] != bounces.size:
        raise ScannerError(
            f"fractions of shape {table.shape} must have one row a replicate, at least 2, and {bounces.size} columns"
        )
    if not 1.0 < exponents[0] < exponents[1]:
        raise ScannerError(f"exponents {exponents} must be a range above 1, for example {EXPONENT_RANGE}")
    if not 0.0 < confidence < 1.0:
        raise ScannerError(f"confidence = {confidence} must lie between 0 and 1, for example 0.95")
    return bounces, table


def _stderr(values: Floats) -> float:
    return float(values.std(ddof=1)) / math.sqrt(values.size)


def _undecided(confidence: float, last: float, last_stderr: float, misfit: float, reason: str) -> Extrapolation:
    nothing = math.nan
    return Extrapolation(
        nothing, nothing, nothing, nothing, confidence, nothing, nothing, misfit, last, last_stderr, reason
    )


def _interval(centres: Floats, widths: Floats, weights: Floats, freedom: int, confidence: float) -> tuple[float, float]:
    """Quantiles of the mixture, over the exponent, of Student's distributions of the extrapolated values."""
    widths = np.maximum(widths, np.finfo(np.float64).tiny)
    reach = float(t.ppf(0.5 + 0.5 * confidence, freedom)) * widths
    bounds = float((centres - reach).min()) - 1e-12, float((centres + reach).max()) + 1e-12

    def quantile(probability: float) -> float:
        return float(brentq(lambda x: float(weights @ t.cdf((x - centres) / widths, freedom)) - probability, *bounds))

    return quantile(0.5 - 0.5 * confidence), quantile(0.5 + 0.5 * confidence)
