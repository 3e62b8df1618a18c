"""The table that every kernel runs on: its boundary, its arc length and what is known of its shape."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike

from scanner.elementary import TWO_PI
from scanner.errors import TableError
from scanner.tables.boundary import (
    FloatArray,
    arc_from_turns,
    curvature_range,
    evaluate,
    fourier_series,
    signed_area,
    speed_samples,
    turning_number,
    turns_from_arc,
)
from scanner.tables.curve import Curve

Value = float | int | str

ARC_TOLERANCE = 1e-15
"""What the harmonics of the arc length left out may add up to, in perimeters."""

_CONVEXITY_ROUNDING = 1e-12
_MOST_ARC_SAMPLES = 8192
_ARC_SAMPLES_NOT_CONVEX = 1024


@dataclass(frozen=True, eq=False)
class Table:
    """A closed curve that a particle moves in, as a finite Fourier series of its boundary.

    Attributes
    ----------
    family : str
        Name of the family.
    parameters : mapping
        Parameters of the family.
    harmonics : float64[4, K + 1], read-only
        ``x(t) = sum_k harmonics[0, k] cos 2 pi k t + harmonics[1, k] sin 2 pi k t``, y with rows 2 and 3, t in turns;
        counter-clockwise.
    arc : float64[2, M + 1], read-only
        Arc length as a fraction of the perimeter:
        ``sigma(t) = t + sum_k arc[0, k] sin 2 pi k t + arc[1, k] (1 - cos 2 pi k t)``, sigma(0) = 0.
    perimeter, area : float
        In the family's unit of length, and its square.
    curvature_min, curvature_max : float
        Range of the curvature, per unit of length.
    is_convex : bool
        Whether the curve bends one way only and does not cross itself; isolated points of zero curvature are allowed.
    convexity : str
        Reason in one line where it is not convex, else empty.
    boundary_error : float
        Largest distance of the stored boundary from the family's curve, relative to the size.
    residual : float
        R.m.s. distance of measured points from the outline fitted to them, in the unit of the points; else 0.
    identity : str
        Stable text of the family and its parameters, to key randomness by.
    """

    family: str
    parameters: Mapping[str, Value]
    harmonics: FloatArray = field(repr=False)
    arc: FloatArray = field(repr=False)
    perimeter: float
    area: float
    curvature_min: float
    curvature_max: float
    is_convex: bool
    convexity: str
    boundary_error: float
    residual: float
    identity: str = field(repr=False)

    @property
    def mean_chord_exact(self) -> float:
        """Mean chord over the section, pi A / L (Santalo 1976)."""
        return 0.5 * TWO_PI * self.area / self.perimeter

    def point(self, s: ArrayLike) -> tuple[FloatArray, FloatArray]:
        """Points of the boundary.

        Parameters
        ----------
        s : array_like
            Arc length as a fraction of the perimeter, any real number, any shape.

        Returns
        -------
        x, y : ndarray
            Same shape, in the family's unit.
        """
        rows = evaluate(self.harmonics, np.ravel(self.turns_from_arc(s)))
        return rows[0].reshape(np.shape(s)), rows[1].reshape(np.shape(s))

    def arc_from_turns(self, t: ArrayLike) -> FloatArray:
        """Arc length as a fraction of the perimeter at parameters in turns, any shape."""
        return arc_from_turns(self.arc, _flat(t)).reshape(np.shape(t))

    def turns_from_arc(self, s: ArrayLike) -> FloatArray:
        """Parameter in turns at arc lengths as fractions of the perimeter, any shape."""
        return turns_from_arc(self.arc, _flat(s)).reshape(np.shape(s))


def _flat(values: ArrayLike) -> FloatArray:
    return np.ascontiguousarray(values, dtype=np.float64).ravel()


def make_table(family: str, parameters: Mapping[str, Value], curve: Curve, identity: str) -> Table:
    """Measure a curve: orientation, area, curvature, convexity, arc length.

    Raises
    ------
    TableError
        If the coefficients are not finite or the arc length needs too many harmonics.
    """
    harmonics = curve.harmonics
    if not np.isfinite(harmonics).all():
        raise TableError("the boundary is not finite; lower the amplitude")
    area = signed_area(harmonics)
    if area < 0.0:
        harmonics = harmonics * np.array([[1.0], [-1.0], [1.0], [-1.0]])
        area = -area
    least, most, convexity = _judge_shape(harmonics, area) if curve.curvatures is None else (*curve.curvatures, "")
    arc, perimeter = _measure_arc(harmonics, convex=not convexity)
    for array in (harmonics, arc):
        array.setflags(write=False)
    return Table(
        family=family,
        parameters=MappingProxyType(dict(parameters)),
        harmonics=harmonics,
        arc=arc,
        perimeter=perimeter,
        area=area,
        curvature_min=least,
        curvature_max=most,
        is_convex=not convexity,
        convexity=convexity,
        boundary_error=curve.error,
        residual=curve.residual,
        identity=identity,
    )


def _judge_shape(harmonics: FloatArray, area: float) -> tuple[float, float, str]:
    """Smallest and largest curvature, and the reason why the curve is not convex, if any."""
    least, least_at, most, _ = curvature_range(harmonics)
    x, y, dx, dy, *_ = (float(row[0]) for row in evaluate(harmonics, np.array([least_at])))
    # The numerator of the curvature is a difference of products of these sums: rounding is relative to them.
    order = np.arange(harmonics.shape[1])
    sizes = np.abs(harmonics).sum(axis=0)
    rounding = _CONVEXITY_ROUNDING * (order * sizes).sum() * (order * order * sizes).sum()
    if not least * (dx * dx + dy * dy) ** 1.5 >= -rounding:
        return least, most, f"curvature {least:.6g} at t = {least_at:.6g} turns, point ({x:.6g}, {y:.6g})"
    turns = round(turning_number(harmonics))
    if turns != 1 or area == 0.0:
        return least, most, f"crosses itself: the tangent turns {turns} times in one round"
    return (least if least > 0.0 else 0.0), most, ""


def _measure_arc(harmonics: FloatArray, convex: bool) -> tuple[FloatArray, float]:
    """Series of the arc length and the perimeter, from the mean of the speed (spectrally accurate).

    The arc length of a curve that is not convex is of no use to anyone and is taken as far as it goes cheaply.
    """
    most_samples = _MOST_ARC_SAMPLES if convex else _ARC_SAMPLES_NOT_CONVEX
    count = 64
    while count < min(4 * harmonics.shape[1], most_samples):
        count *= 2
    while True:
        speed = fourier_series(speed_samples(harmonics, count), (count - 1) // 2)
        mean = float(speed[0, 0])
        order = np.arange(1, speed.shape[1])
        arc = np.zeros_like(speed)
        arc[:, 1:] = speed[:, 1:] / (order * (TWO_PI * mean))
        tails = np.abs(arc).sum(axis=0)[::-1].cumsum()[::-1]
        if tails[3 * len(tails) // 4] <= ARC_TOLERANCE or 2 * count > most_samples:
            break
        count *= 2
    if tails[3 * len(tails) // 4] > ARC_TOLERANCE and convex:
        raise TableError(
            f"the arc length needs more than {len(tails)} harmonics to reach {ARC_TOLERANCE:g}; "
            "lower the eccentricity or round the corners"
        )
    needed = np.flatnonzero(tails > ARC_TOLERANCE)
    kept = int(needed[-1]) + 1 if len(needed) else 1
    return np.ascontiguousarray(arc[:, :kept]), TWO_PI * mean
