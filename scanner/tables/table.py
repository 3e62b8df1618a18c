"""The table that every kernel runs on: its boundary, its arc length and what is known of its shape."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

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
from scanner.tables.card import table_card
from scanner.tables.curve import Curve, Shape, tails
from scanner.tables.symmetry import Symmetry, find_symmetry

Value = float | int | str

ARC_TOLERANCE = 1e-15
"""What the harmonics of the arc length left out may add up to, in perimeters."""

_CONVEXITY_ROUNDING = 1e-12
_MOST_ARC_SAMPLES = 8192
_ARC_SAMPLES_NOT_CONVEX = 1024


@dataclass(frozen=True, eq=False, repr=False)
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
    harmonics: FloatArray
    arc: FloatArray
    perimeter: float
    area: float
    curvature_min: float
    curvature_max: float
    is_convex: bool
    convexity: str
    boundary_error: float
    residual: float
    identity: str

    def __repr__(self) -> str:
        """Show the family, the parameters and the main numbers."""
        shown = "".join(f", {name}={value!r}" for name, value in self.parameters.items())
        shape = "convex" if self.is_convex else f"not convex: {self.convexity}"
        return (
            f"<Table {self.family}{shown}: perimeter {self.perimeter:.6g}, area {self.area:.6g}, curvature "
            f"{self.curvature_min:.6g} to {self.curvature_max:.6g}, {self.harmonics.shape[1] - 1} harmonics, {shape}>"
        )

    def _repr_html_(self) -> str:
        return table_card(self)

    @property
    def mean_chord_exact(self) -> float:
        """Mean chord over the section, pi A / L (Santalo 1976)."""
        return 0.5 * TWO_PI * self.area / self.perimeter

    @cached_property
    def symmetry(self) -> Symmetry:
        """Rotations and mirrors that map the table onto itself, found from its boundary."""
        order, mirror = find_symmetry(self.harmonics)
        return Symmetry(order, None if mirror is None else float(self.arc_from_turns(mirror)))

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


def make_table(family: str, parameters: Mapping[str, Value], curve: Curve) -> Table:
    """Measure a curve: orientation, area, curvature, convexity, arc length.

    Raises
    ------
    TableError
        If the coefficients are not finite or the arc length needs too many harmonics.
    """
    used = np.flatnonzero(curve.harmonics.any(axis=0))
    harmonics = np.ascontiguousarray(curve.harmonics[:, : max(2, int(used[-1]) + 1)])
    if not np.isfinite(harmonics).all():
        raise TableError("the boundary is not finite; lower the amplitude")
    area = signed_area(harmonics)
    if area < 0.0:
        harmonics = harmonics * np.array([[1.0], [-1.0], [1.0], [-1.0]])
        area = -area
    shape = curve.shape or _judge_shape(harmonics, area)
    arc, perimeter = _measure_arc(harmonics, max(ARC_TOLERANCE, curve.error / 16.0), convex=not shape.reason)
    for array in (harmonics, arc):
        array.setflags(write=False)
    return Table(
        family=family,
        parameters=dict(parameters),
        harmonics=harmonics,
        arc=arc,
        perimeter=perimeter,
        area=area,
        curvature_min=shape.curvature_min,
        curvature_max=shape.curvature_max,
        is_convex=not shape.reason,
        convexity=shape.reason,
        boundary_error=curve.error,
        residual=curve.residual,
        identity=_identify(family, parameters, curve.digest),
    )


def _identify(family: str, parameters: Mapping[str, Value], digest: str) -> str:
    """Name a table by what decides it: the contents of a file, not where the file lies."""
    shown = {name: digest if digest and isinstance(value, str) else value for name, value in parameters.items()}
    return f"{family}({', '.join(f'{name}={shown[name]!r}' for name in sorted(shown))})"


def _judge_shape(harmonics: FloatArray, area: float) -> Shape:
    """Range of the curvature, and the reason why the curve is not convex, if any."""
    least, least_at, most, _ = curvature_range(harmonics)
    x, y, dx, dy, *_ = (float(row[0]) for row in evaluate(harmonics, np.array([least_at])))
    # The numerator of the curvature is a difference of products of these sums: rounding is relative to them.
    order = np.arange(harmonics.shape[1])
    sizes = np.abs(harmonics).sum(axis=0)
    rounding = _CONVEXITY_ROUNDING * (order * sizes).sum() * (order * order * sizes).sum()
    speed = np.sqrt(dx * dx + dy * dy)
    if np.isneginf(least) or least * speed * speed * speed < -rounding:
        return Shape(least, most, f"curvature {least:.6g} at t = {least_at:.6g} turns, point ({x:.6g}, {y:.6g})")
    turns = round(turning_number(harmonics))
    if turns != 1 or area == 0.0:
        return Shape(least, most, f"crosses itself: the tangent turns {turns} times in one round")
    return Shape(least if least > 0.0 else 0.0, most)


def _measure_arc(harmonics: FloatArray, tolerance: float, convex: bool) -> tuple[FloatArray, float]:
    """Series of the arc length and the perimeter, from the mean of the speed (spectrally accurate).

    The arc length of a curve that is not convex is of no use to anyone and is taken as far as it goes cheaply.
    """
    most_samples = _MOST_ARC_SAMPLES if convex else _ARC_SAMPLES_NOT_CONVEX
    count = 64
    while count < min(4 * harmonics.shape[1], most_samples):
        count *= 2
    while True:
        arc, perimeter = _arc_of_samples(speed_samples(harmonics, count))
        beyond = tails(np.abs(arc).sum(axis=0))
        resolved = beyond[3 * len(beyond) // 4] <= tolerance
        if resolved or 2 * count > most_samples:
            break
        count *= 2
    if convex and not resolved:
        raise TableError(
            f"the arc length needs more than {len(beyond)} harmonics to reach {tolerance:g}; "
            "lower the eccentricity or round the corners"
        )
    needed = np.flatnonzero(beyond > tolerance)
    return np.ascontiguousarray(arc[:, : int(needed[-1]) + 1 if len(needed) else 1]), perimeter


def _arc_of_samples(speed: FloatArray) -> tuple[FloatArray, float]:
    """Integrate the series of the speed: arc length in perimeters beyond the angle in turns, and the perimeter."""
    series = fourier_series(speed, (len(speed) - 1) // 2)
    perimeter = TWO_PI * float(series[0, 0])
    arc = np.zeros_like(series)
    arc[:, 1:] = series[:, 1:] / (np.arange(1, series.shape[1]) * perimeter)
    return arc, perimeter
