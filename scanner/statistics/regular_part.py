"""The regular part of the energy shell from measured level spacings, to be set against the one from the dynamics.

The likelihood of the Berry-Robnik density (J. Phys. A 17:2413, 1984) with one chaotic component.  It is not regular
at its ends: near rho_1 = 1 it depends on (1 - rho_1)^2 alone, near rho_1 = 0 its information diverges.  Intervals and
comparisons therefore come from ratios of likelihoods, which do not depend on how the part is parametrised and hold at
the ends too (there they cover more than they say, by half of what is left), and not from a curvature alone.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.optimize import brentq, minimize_scalar
from scipy.stats import chi2

from scanner.errors import ScannerError
from scanner.statistics.spacings import log_density

Floats = npt.NDArray[np.float64]

FEWEST = 20
"""Spacings below this number say nothing of a part of the shell."""
MEAN_TOLERANCE = 5.0
"""Standard errors by which the mean of unfolded spacings may miss 1."""
GRID = 33
"""Places from which the highest likelihood is looked for."""
STEP = 1e-3
"""Step of the second difference that gives the observed information."""


@dataclass(frozen=True)
class RegularPart:
    """Regular part of the energy shell as seen by a spectrum.

    Attributes
    ----------
    value
        Most likely rho_1, in [0, 1].
    stderr
        From the observed information; NaN where the interval reaches 0 or 1, as no parabola fits there.
    low, high
        Interval of all values that a likelihood ratio does not reject.
    confidence
        Of the interval.
    log_likelihood
        At ``value``.
    spacings
        How many there were.
    """

    value: float
    stderr: float
    low: float
    high: float
    confidence: float
    log_likelihood: float
    spacings: int


def fit_regular_part(spacings: npt.ArrayLike, *, confidence: float = 0.95) -> RegularPart:
    """Fit the regular part rho_1 to unfolded level spacings by maximum likelihood.

    Parameters
    ----------
    spacings
        Shape (n,), n >= 20, of unit mean: unfold the spectrum first.  They are taken as independent; those of one
        spectrum repel each other in the long run, which makes the interval wider than need be.
    confidence
        Of the interval, between 0 and 1.

    Returns
    -------
    RegularPart
        Estimate, standard error and profile-likelihood interval.

    Raises
    ------
    ScannerError
        Too few spacings, a negative one, a mean that is not 1 within its error, or a confidence outside (0, 1).

    References
    ----------
    Berry and Robnik, J. Phys. A 17:2413, 1984; Wilks, Ann. Math. Stat. 9:60, 1938.
    """
    if not 0.0 < confidence < 1.0:
        raise ScannerError(f"confidence = {confidence} must lie between 0 and 1, for example 0.95")
    likelihood = _log_likelihood(spacings)
    best, top = _highest(likelihood)
    lowest = top - 0.5 * float(chi2.ppf(confidence, 1))

    def above(part: float) -> float:
        return likelihood(part) - lowest

    low = 0.0 if above(0.0) >= 0.0 else float(brentq(above, 0.0, best, xtol=1e-9))
    high = 1.0 if above(1.0) >= 0.0 else float(brentq(above, best, 1.0, xtol=1e-9))
    stderr = _stderr(likelihood, best) if low > 0.0 and high < 1.0 else math.nan
    return RegularPart(best, stderr, low, high, confidence, top, np.size(spacings))


def compare_regular_parts(spacings: npt.ArrayLike, value: float, stderr: float) -> float:
    """Number of standard deviations by which a spectrum's regular part exceeds that of the dynamics.

    Parameters
    ----------
    spacings
        As for `fit_regular_part`.
    value, stderr
        Regular part of the energy shell from orbits and its standard error: ``regular_volume_fraction`` and
        ``regular_volume_fraction_stderr`` of a store.  An error of 0 holds the value exactly.

    Returns
    -------
    float
        Signed root of the likelihood ratio of two parts against one common part.  Far from the ends it is the
        difference over the root of the sum of both squared errors; if the two parts are equal it is normal with
        mean 0 and variance 1, or nearer to 0 at the ends.

    Raises
    ------
    ScannerError
        As for `fit_regular_part`, or the value or its error make no sense.
    """
    if not (0.0 <= value <= 1.0 and 0.0 <= stderr < math.inf):
        raise ScannerError(f"regular part {value} +- {stderr} must lie between 0 and 1, with an error of 0 or more")
    likelihood = _log_likelihood(spacings)
    best, top = _highest(likelihood)
    if stderr == 0.0:
        common = likelihood(value)
    else:
        _, common = _highest(lambda part: likelihood(part) - 0.5 * ((part - value) / stderr) ** 2)
    return math.copysign(math.sqrt(2.0 * max(top - common, 0.0)), best - value)


def _log_likelihood(spacings: npt.ArrayLike) -> Callable[[float], float]:
    found = np.asarray(spacings, dtype=np.float64)
    if found.ndim != 1 or found.size < FEWEST:
        raise ScannerError(f"spacings of shape {found.shape} are too few: give a row of at least {FEWEST}")
    if not (np.isfinite(found) & (found >= 0.0)).all():
        raise ScannerError("a spacing is negative or not a finite number: spacings are differences of sorted levels")
    mean, error = float(found.mean()), float(found.std(ddof=1)) / math.sqrt(found.size)
    if abs(mean - 1.0) > MEAN_TOLERANCE * error:
        raise ScannerError(f"spacings have mean {mean:.4g} +- {error:.2g}, it must be 1: unfold the spectrum first")

    def likelihood(part: float) -> float:
        return float(log_density(found, part, np.array([1.0 - part])).sum())

    return likelihood


def _highest(likelihood: Callable[[float], float]) -> tuple[float, float]:
    """Where a function on [0, 1] is highest, and how high; an end counts where nothing inside is higher."""
    grid = np.linspace(0.0, 1.0, GRID)
    values = [likelihood(part) for part in grid]
    place = int(np.argmax(values))
    ends = grid[max(place - 1, 0)], grid[min(place + 1, GRID - 1)]
    inside = minimize_scalar(lambda part: -likelihood(part), bounds=ends, method="bounded", options={"xatol": 1e-8})
    candidates = [(-float(inside.fun), float(inside.x)), (values[place], float(grid[place]))]
    top, best = max(candidates)
    return best, top


def _stderr(likelihood: Callable[[float], float], best: float) -> float:
    step = min(STEP, 0.5 * best, 0.5 * (1.0 - best))
    information = (2.0 * likelihood(best) - likelihood(best - step) - likelihood(best + step)) / step**2
    return 1.0 / math.sqrt(information) if information > 0.0 else math.nan
