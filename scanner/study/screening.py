"""Which tables of a line of the grid are convex, many at once: they differ in one real parameter only.

What decides is smooth in that parameter: the bend of the boundary, its direction and its speed are interpolated between
a few tables (at Chebyshev points), and bounded between their samples along the boundary by the sums of their harmonics.
Only what these bounds settle with room to spare is settled here; tables near the limit of convexity, and whatever else
is doubtful, are left to be built.  With such room, matrix products and transforms of libraries will do.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from scanner.errors import TableError
from scanner.study.model import Value
from scanner.tables import FAMILIES
from scanner.tables.boundary import evaluate
from scanner.tables.building import check_parameters
from scanner.tables.curve import Curve

Floats = npt.NDArray[np.float64]
States = npt.NDArray[np.int8]

UNSETTLED, CONVEX, NOT_CONVEX = range(3)

FEWEST = 8
"""Tables of a line that are worth it."""
SAMPLES = 1024
"""Along the boundary."""
MOST_HARMONICS = 200
"""Of a boundary: products of two of its derivatives then have less than half as many as there are samples, and with
more a table may be past what can be built."""
POINTS = (3, 8, 20)
"""Numbers of tables to interpolate between; a boundary linear in the parameter needs three."""
FIT = 1e-10
"""What interpolation may be wrong by, relative to the largest value."""
ROOM = 1e-8
"""Room that is left to the limit, relative to the sum of the harmonics of what is compared."""
STRIP = 0.02
"""A speed without zeros so near to the real angles, in radians, has harmonics falling as exp(-STRIP k): below 1e-24 at
the 3072 by which the arc length of a table must have settled to 1e-15."""
TABLES_AT_ONCE = 64
UNDEFORMED = {"amplitude": 0.0, "quadratic": 0.0}


class _Sheet(NamedTuple):
    """What decides, for a stretch of a line.

    Attributes
    ----------
    points : float64[m]
        Values of the parameter to interpolate between.
    samples : float64[m, 3, SAMPLES]
        Bend (velocity cross acceleration), component along the undeformed curve's velocity, and square of the velocity.
    sums : float64[m, 3, 3]
        Sums of the sizes of their harmonics: plain, for the second derivative, and for the strip.
    folds
        Whether the curve has a closed form of its curvature, and leaves convexity by folding into cusps.
    """

    points: Floats
    samples: Floats
    sums: Floats
    folds: bool


def screen_line(family: str, fixed: Mapping[str, Value], name: str, values: Floats) -> States:
    """Settle the tables of a line that are clearly convex and can be built, or are clearly not convex.

    Parameters
    ----------
    family
        A built-in family.
    fixed
        All parameters but one.
    name
        That one, which is a real number.
    values : float64[n]
        Its values, in any order.

    Returns
    -------
    int8[n]
        CONVEX, NOT_CONVEX or, where that is not clear, UNSETTLED.
    """

    def curve_at(value: float, changes: Mapping[str, Value]) -> Curve:
        entry = FAMILIES[family]
        return entry.curve(**check_parameters(entry, {**fixed, name: value, **changes}))

    def sample(value: float) -> tuple[Floats, bool] | None:
        plain = {key: zero for key, zero in UNDEFORMED.items() if key == name or key in fixed}
        return _sample(curve_at(value, {}), curve_at(value, plain))

    order = np.argsort(values, kind="stable")
    found = np.zeros(len(values), dtype=np.int8)
    found[order] = _screen(sample, values[order])
    return found


def _screen(sample: Callable[[float], tuple[Floats, bool] | None], values: Floats) -> States:
    """Screen rising values, in two halves where they cannot be screened as a whole."""
    if len(values) < FEWEST:
        return np.zeros(len(values), dtype=np.int8)
    sheet = _make_sheet(sample, float(values[0]), float(values[-1]))
    if sheet is None:
        half = len(values) // 2
        return np.concatenate([_screen(sample, values[:half]), _screen(sample, values[half:])])
    weights = _weights(sheet.points, values)
    return np.concatenate(
        [_judge(sheet, batch) for batch in np.split(weights, range(0, len(values), TABLES_AT_ONCE)[1:])]
    )


def _sample(curve: Curve, plain: Curve) -> tuple[Floats, bool] | None:
    """Sample what decides on one curve; None where it has too many harmonics or was cut short."""
    if max(curve.harmonics.shape[1], plain.harmonics.shape[1]) > MOST_HARMONICS or curve.error > FIT:
        return None
    turns = np.arange(SAMPLES) / SAMPLES
    _, _, dx, dy, ddx, ddy = evaluate(curve.harmonics, turns)
    _, _, along_x, along_y, _, _ = evaluate(plain.harmonics, turns)
    decisive = np.stack([dx * ddy - dy * ddx, dx * along_x + dy * along_y, dx * dx + dy * dy])
    return decisive, curve.shape is not None


def _make_sheet(sample: Callable[[float], tuple[Floats, bool] | None], low: float, high: float) -> _Sheet | None:
    """Sample a few tables of a stretch and see that those between follow from them; None if not."""
    for count in POINTS:
        points = low + 0.5 * (high - low) * (1.0 + np.cos(np.pi * (np.arange(count) + 0.5) / count))
        probes = low + (high - low) * np.array([0.0, 0.41, 0.97])
        try:
            taken = [sample(float(value)) for value in (*points, *probes)]
        except TableError:
            return None
        sound = [each for each in taken if each is not None]
        if len(sound) < len(taken):
            return None
        samples = np.stack([decisive for decisive, _ in sound])
        wrong = np.abs(np.tensordot(_weights(points, probes), samples[:count], axes=1) - samples[count:])
        if (wrong.max(axis=(0, 2)) <= FIT * np.abs(samples).max(axis=(0, 2))).all():
            sizes = np.abs(np.fft.rfft(samples[:count])) * (2.0 / SAMPLES)
            order = np.arange(sizes.shape[2])
            sums = np.stack([sizes.sum(axis=2), sizes @ (order * order), sizes @ np.expm1(STRIP * order)], axis=2)
            return _Sheet(points, samples[:count], sums, sound[0][1])
    return None


def _weights(points: Floats, values: Floats) -> Floats:
    """Weights of points in the interpolation at values (Lagrange), shape (values, points)."""
    found = np.ones((len(values), len(points)))
    for own, point in enumerate(points):
        for other in np.delete(points, own):
            found[:, own] *= (values - other) / (point - other)
    return found


def _judge(sheet: _Sheet, weights: Floats) -> States:
    """Settle tables by their weights in a sheet."""
    samples = np.tensordot(weights, sheet.samples, axes=1)
    plain, second, strip = np.moveaxis(np.tensordot(np.abs(weights), sheet.sums, axes=1), 2, 0)
    lowest, room = samples.min(axis=2), ROOM * plain
    # Between two samples a function lies below their chord by no more than h^2 / 8 times its second derivative.
    least = lowest - (2.0 * np.pi / SAMPLES) ** 2 / 8.0 * second - room
    bend, along, speed = range(3)
    # The tangent turns once, as the undeformed curve's does, from which it is nowhere a right angle away.
    convex = (least[:, bend] > 0.0) & (least[:, along] > 0.0) & (least[:, speed] > strip[:, speed])
    if sheet.folds:  # the directions of both curves are the same, but where the deformed one runs backwards
        dented = lowest[:, along] < -room[:, along]
    else:
        dented = (lowest[:, bend] < -room[:, bend]) & (samples[:, bend].max(axis=1) > room[:, bend])
    found = np.zeros(len(weights), dtype=np.int8)
    found[convex] = CONVEX
    found[dented] = NOT_CONVEX
    return found
