"""What follows from measured fractions: spectra, infinite horizons, critical amplitudes, ensembles.

Works on plain arrays and labelled data alone, so also on a store of last year or on numbers from elsewhere.
"""

from __future__ import annotations

from scanner.statistics.crossing import Crossing, find_crossing
from scanner.statistics.ensemble import ensemble_average
from scanner.statistics.infinite_horizon import EXPONENT_RANGE, Extrapolation, extrapolate_fraction
from scanner.statistics.regular_part import RegularPart, compare_regular_parts, fit_regular_part
from scanner.statistics.replicates import verdict_fractions
from scanner.statistics.spacings import (
    draw_spacings,
    gap_probability,
    spacing_cumulative,
    spacing_density,
    spacing_moment,
)

__all__ = [
    "EXPONENT_RANGE",
    "Crossing",
    "Extrapolation",
    "RegularPart",
    "compare_regular_parts",
    "draw_spacings",
    "ensemble_average",
    "extrapolate_fraction",
    "find_crossing",
    "fit_regular_part",
    "gap_probability",
    "spacing_cumulative",
    "spacing_density",
    "spacing_moment",
    "verdict_fractions",
]
