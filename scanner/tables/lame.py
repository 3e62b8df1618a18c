"""Superellipses: smooth to all orders only for even exponents."""

from __future__ import annotations

import numpy as np

from scanner.elementary import cos_sin_array, exp_array, log_array
from scanner.tables.boundary import FloatArray, evaluate
from scanner.tables.curve import MOST_HARMONICS, ROUNDING, Curve, Shape, series_of_samples, size, trim
from scanner.tables.extremes import find_extremes

_SAMPLES = 4 * MOST_HARMONICS
_NEAREST_ZERO = 1e-300  # stands for 0 where a logarithm is taken


def lame(exponent: float, aspect: float) -> Curve:
    """Superellipse by the polar angle of its image with aspect 1.

    At the ends of the axes the boundary is only as smooth as ``abs(x)^exponent``: unless the exponent is even, its
    harmonics fall as k^-(exponent + 1), and the boundary gets as many as a table may have.  What is left out is
    measured, and it is convex as long as the exponent is at least 1.
    """
    turns = np.arange(_SAMPLES) / _SAMPLES
    x, y = _points(exponent, aspect, turns)
    harmonics = trim(series_of_samples(x, y, MOST_HARMONICS))
    quarter = np.arange(_SAMPLES // 2 + 1) / (2 * _SAMPLES)  # samples and points between them, both ends of the axes
    x, y = _points(exponent, aspect, quarter)
    found = evaluate(harmonics, quarter)
    distance = np.sqrt((found[0] - x) ** 2 + (found[1] - y) ** 2).max()
    error = max(ROUNDING, float(distance / size(harmonics)))
    return Curve(harmonics, error, shape=_shape(exponent, aspect))


def _points(exponent: float, aspect: float, turns: FloatArray) -> tuple[FloatArray, FloatArray]:
    cosine, sine = cos_sin_array(turns)
    across, along = np.minimum(abs(cosine), abs(sine)), np.maximum(abs(cosine), abs(sine))
    ratio = _power(across / along, exponent)
    radius = exp_array(log_array(1.0 + ratio) / -exponent) / along
    return radius * cosine, aspect * radius * sine


def _shape(exponent: float, aspect: float) -> Shape:
    """Range of the curvature: 0 or infinite at the ends of the axes unless the exponent is 2."""

    def curvature(turns: FloatArray) -> FloatArray:
        x, y = (abs(row) for row in _points(exponent, 1.0, turns))
        along_x, along_y = aspect * _power(x, exponent - 1.0), _power(y, exponent - 1.0)
        gradient = np.sqrt(along_x * along_x + along_y * along_y)
        # The numerator has the factor x^exponent + y^exponent, which is 1.
        bend = (exponent - 1.0) * aspect * _power(x * y, exponent - 2.0)
        found: FloatArray = bend / (gradient * gradient * gradient)
        return found

    low, _, high, _ = find_extremes(curvature, _SAMPLES // 4)
    if exponent > 2.0:
        low = 0.0
    if exponent < 2.0:
        high = np.inf
    return Shape(low, high)


def _power(base: FloatArray, exponent: float) -> FloatArray:
    return exp_array(exponent * log_array(np.maximum(base, _NEAREST_ZERO)))
