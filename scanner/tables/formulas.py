"""Curves of the families with a formula: closed-form harmonics, or the displacement of an ellipse."""

from __future__ import annotations

import numpy as np

from scanner.elementary import TWO_PI, angle_array, cos_sin_array, exp_array
from scanner.tables.boundary import FloatArray
from scanner.tables.curve import Curve, Shape, displaced_ellipse, ellipse_harmonics, minor_axis
from scanner.tables.extremes import find_extremes

_RADIUS_ROUNDING = 1e-12


def ellipse(eccentricity: float) -> Curve:
    """Ellipse by its eccentric angle."""
    return Curve(ellipse_harmonics(1.0, minor_axis(eccentricity)))


def radial_harmonic(amplitude: float, harmonic: int) -> Curve:
    """Circle deformed along its radius: the product of the two waves has harmonics of sum and difference."""
    harmonics = np.zeros((4, harmonic + 2))
    harmonics[0, 1] = harmonics[3, 1] = 1.0
    harmonics[0, harmonic + 1] += 0.5 * amplitude
    harmonics[3, harmonic + 1] += 0.5 * amplitude
    harmonics[0, harmonic - 1] += 0.5 * amplitude
    harmonics[3, harmonic - 1] -= 0.5 * amplitude if harmonic > 1 else 0.0
    return Curve(harmonics)


def limacon(quadratic: float) -> Curve:
    """Quadratic conformal image of the circle."""
    harmonics = np.zeros((4, 3))
    harmonics[0, 1:] = harmonics[3, 1:] = (1.0, quadratic)
    return Curve(harmonics)


def curvature_harmonic(amplitude: float, harmonic: int) -> Curve:
    """Integrate the radius of curvature along the tangent angle, which is the parameter.

    The numerator of the curvature is the square of the radius in this parameter and cannot turn negative: that
    the curve is convex as long as the radius does not is known in closed form.
    """
    harmonics = np.zeros((4, harmonic + 2))
    harmonics[1, 1], harmonics[2, 1] = 1.0, -1.0
    above, below = 0.5 * amplitude / (harmonic + 1), 0.5 * amplitude / (harmonic - 1)
    harmonics[1, harmonic + 1] += above
    harmonics[2, harmonic + 1] -= above
    harmonics[1, harmonic - 1] += below
    harmonics[2, harmonic - 1] += below
    lowest = 0.5 if amplitude > 0.0 else 0.0
    return Curve(harmonics, shape=_shape_of_radii(1.0 - abs(amplitude), lowest / harmonic, 1.0 + abs(amplitude)))


def normal_harmonic(eccentricity: float, amplitude: float, harmonic: int, phase: float) -> Curve:
    """Ellipse displaced along its outward normal by a wave of the eccentric angle."""

    def displace(turns: FloatArray) -> tuple[FloatArray, FloatArray]:
        along_x, along_y = outward_normal(eccentricity, turns)
        height = amplitude * _wave(harmonic, turns, phase)[0]
        return height * along_x, height * along_y

    return displaced_ellipse(eccentricity, displace)


def confocal_harmonic(eccentricity: float, amplitude: float, harmonic: int, phase: float) -> Curve:
    """Ellipse with a wave added to its elliptic coordinate mu, on its own foci.

    On the ellipse (focal distance) cosh mu0 = 1 and (focal distance) sinh mu0 = b, so that neither the focal distance
    nor mu0, which has no limit at eccentricity 0, is needed.
    """
    minor = minor_axis(eccentricity)

    def displace(turns: FloatArray) -> tuple[FloatArray, FloatArray]:
        cosine, sine = cos_sin_array(turns)
        raised = amplitude * _wave(harmonic, turns, phase)[0]
        sinh = 0.5 * (exp_array(raised) - exp_array(-raised))
        cosh_beyond_one = sinh * sinh / (1.0 + np.sqrt(1.0 + sinh * sinh))
        return (cosh_beyond_one + minor * sinh) * cosine, (minor * cosh_beyond_one + sinh) * sine

    return displaced_ellipse(eccentricity, displace)


def support_harmonic(eccentricity: float, amplitude: float, harmonic: int, phase: float) -> Curve:
    """Ellipse with a wave of the normal's angle psi added to its support function.

    The parameter is the eccentric angle of the ellipse, not psi: the ellipse then keeps its single harmonic, and only
    the deformation needs more.  Where the curve stops being convex its radius of curvature passes through zero and
    it folds into cusps; the radius is known in closed form.
    """
    minor = minor_axis(eccentricity)

    def displace(turns: FloatArray) -> tuple[FloatArray, FloatArray]:
        cosine, sine = outward_normal(eccentricity, turns)
        wave, quarter_wave = _wave(harmonic, angle_array(sine, cosine), phase)
        height, slope = amplitude * wave, -amplitude * harmonic * quarter_wave
        return height * cosine - slope * sine, height * sine + slope * cosine

    def radius(turns: FloatArray) -> FloatArray:
        cosine, sine = cos_sin_array(turns)
        scale = np.sqrt(minor * minor * cosine * cosine + sine * sine)
        wave = _wave(harmonic, angle_array(sine, minor * cosine), phase)[0]
        return scale * scale * scale / minor + amplitude * (1.0 - harmonic * harmonic) * wave

    low, low_at, high, _ = find_extremes(radius, max(64, 8 * harmonic))
    curve = displaced_ellipse(eccentricity, displace)
    return Curve(curve.harmonics, curve.error, shape=_shape_of_radii(low, low_at, high))


def outward_normal(eccentricity: float, turns: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Give the unit normal of the ellipse at eccentric angles in turns."""
    cosine, sine = cos_sin_array(turns)
    cosine = minor_axis(eccentricity) * cosine
    length = np.sqrt(cosine * cosine + sine * sine)
    return cosine / length, sine / length


def _wave(harmonic: int, turns: FloatArray, phase: float) -> tuple[FloatArray, FloatArray]:
    """Cosine and sine of ``harmonic`` times an angle in turns plus a phase in radians."""
    whole = harmonic * turns
    lag = phase / TWO_PI
    return cos_sin_array((whole - np.rint(whole)) + (lag - np.rint(lag)))


def _shape_of_radii(low: float, low_at: float, high: float) -> Shape:
    """Shape of a curve given by its radius of curvature, convex while that is nowhere negative."""
    if low < -_RADIUS_ROUNDING * high:
        reason = f"radius of curvature {low:.6g} at t = {low_at:.6g} turns: the boundary folds into cusps"
        return Shape(-np.inf, np.inf, reason)
    return Shape(1.0 / high, 1.0 / low if low > _RADIUS_ROUNDING * high else np.inf, "")
