"""Random deformations of an ellipse, one fixed shape to each realisation."""

from __future__ import annotations

import math

import numpy as np

from scanner.elementary import cos_sin_array, exp_array, log_array
from scanner.tables.boundary import FloatArray, evaluate
from scanner.tables.curve import Curve, displaced_ellipse
from scanner.tables.formulas import outward_normal


def random_harmonic(eccentricity: float, amplitude: float, decay: float, harmonic_max: int, realisation: int) -> Curve:
    """Ellipse displaced along its normal by a random sum of waves of the eccentric angle."""
    heights = _draw_heights(decay, harmonic_max, realisation)

    def displace(turns: FloatArray) -> tuple[FloatArray, FloatArray]:
        along_x, along_y = outward_normal(eccentricity, turns)
        height = amplitude * evaluate(heights, turns)[0]
        return height * along_x, height * along_y

    return displaced_ellipse(eccentricity, displace)


def _draw_heights(decay: float, harmonic_max: int, realisation: int) -> FloatArray:
    """Gaussian coefficients 2..harmonic_max falling as k^-decay, scaled to unit mean square; rows 0 and 1 of a series.

    The generator's bits are fixed for ever, its normal deviates are not; these are made of the bits by Box and
    Muller's transform (Ann. Math. Stat. 29:610, 1958), one pair a harmonic, so that a shape with more harmonics
    has the same first ones but for the scale.
    """
    order = np.arange(2, harmonic_max + 1)
    bits = np.random.PCG64(np.random.SeedSequence(realisation)).random_raw(2 * len(order)).reshape(-1, 2)
    uniform = ((bits >> np.uint64(11)) + np.array([1, 0], dtype=np.uint64)) * 2.0**-53
    radius = np.sqrt(-2.0 * log_array(uniform[:, 0])) * exp_array(-decay * log_array(order))
    heights = np.zeros((4, harmonic_max + 1))
    heights[:2, 2:] = radius * np.array(cos_sin_array(uniform[:, 1]))
    return heights / math.sqrt(0.5 * math.fsum((heights * heights).flat))
