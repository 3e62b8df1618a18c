"""Measured outlines: the ellipse that fits best, and a smooth periodic function for what it leaves."""

from __future__ import annotations

import hashlib
import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from scanner.compiled import kernel
from scanner.elementary import angle_array, cos_sin_turns
from scanner.errors import TableError
from scanner.tables.boundary import FloatArray
from scanner.tables.curve import Curve, trim
from scanner.tables.points import parse_points, read_content

_MOST_WAVES = 128
_POINTS_PER_WAVE = 4
_ELLIPSE_WAVES = 2
_WAVES_AHEAD = 16  # looked at without gain before giving up
_FURTHEST_BACK = 0.02
_COST_OF_FREEDOM = 1.4  # more than 1 against following noise (Kim and Gu, J. R. Stat. Soc. B 66:337, 2004; from memory)
_THINNEST = 1e-6
_MOST_STEPS = 60
_STILL = 1e-14


@dataclass(frozen=True)
class _Ellipse:
    """Image of the unit circle under ``centre + matrix u``, the matrix symmetric."""

    centre: FloatArray
    matrix: FloatArray

    def polar(self, points: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Angle in turns and radius of the points as the ellipse is the unit circle."""
        (a, b), (c, d) = self.matrix
        x, y = points - self.centre[:, None]
        determinant = a * d - b * c
        u, v = (d * x - b * y) / determinant, (a * y - c * x) / determinant
        return angle_array(v, u), np.sqrt(u * u + v * v)

    def moved(self, wave: FloatArray) -> _Ellipse:
        """Ellipse that takes up waves 0, 1 and 2 of the radius in its frame, to first order."""
        size, x, y, stretch, shear = wave[0, 0], wave[0, 1], wave[1, 1], wave[0, 2], wave[1, 2]
        (a, b), (c, d) = self.matrix
        e, f, g = 1.0 + size + stretch, shear, 1.0 + size - stretch
        first, second = (a * e + b * f, a * f + b * g), (c * e + d * f, c * f + d * g)
        root = _symmetric_root(
            first[0] * first[0] + first[1] * first[1],
            first[0] * second[0] + first[1] * second[1],
            second[0] * second[0] + second[1] * second[1],
        )
        return _Ellipse(self.centre + np.array([a * x + b * y, c * x + d * y]), root)


@dataclass(frozen=True)
class _Fit:
    """A smooth outline: radius ``1 + wave`` in the frame of its best-fit ellipse."""

    ellipse: _Ellipse
    wave: FloatArray
    residual: float

    def harmonics(self, amplitude: float) -> FloatArray:
        """Boundary with the wave scaled by an amplitude."""
        scaled = amplitude * self.wave
        scaled[0, 0] += 1.0
        circle = _times_circle(scaled)
        (a, b), (c, d) = self.ellipse.matrix
        harmonics = np.concatenate([a * circle[:2] + b * circle[2:], c * circle[:2] + d * circle[2:]])
        harmonics[[0, 2], 0] += self.ellipse.centre
        return harmonics


def outline_file(file: str, amplitude: float) -> Curve:
    """Outline through measured points, from its best-fit ellipse (0) to itself (1) and beyond."""
    content = read_content(file)
    fit = fit_outline(content)
    digest = f"sha256:{hashlib.sha256(content).hexdigest()}"
    return Curve(trim(fit.harmonics(amplitude)), residual=fit.residual, digest=digest)


@lru_cache(maxsize=8)
def fit_outline(content: bytes) -> _Fit:
    """Fit an ellipse to points, then a periodic function to the radius in its frame.

    A point's angle in the frame of the ellipse says where it belongs, however the points are spaced; the radius is
    then an ordinary function of it, fitted by least squares with as many waves as generalised cross-validation asks
    for (Craven and Wahba, Numer. Math. 31:377, 1979).  The ellipse starts as that of the area's second moments and is
    moved until the function has no waves 0, 1 and 2: it fits the curve best, wherever the points are dense.

    Raises
    ------
    TableError
        One line: see ``parse_points``; and if the points do not go once round their centre, or leave a gap.
    """
    points = parse_points(content)
    fit = _fit_in_frame(_ellipse_of_moments(points), points)
    waves = fit.wave.shape[1] - 1
    for _ in range(_MOST_STEPS):
        fit = _fit_in_frame(fit.ellipse.moved(fit.wave), points, waves)
        if np.abs(fit.wave[:, : _ELLIPSE_WAVES + 1]).max() < _STILL:
            break
    return _fit_in_frame(fit.ellipse, points)


def _fit_in_frame(ellipse: _Ellipse, points: FloatArray, waves: int | None = None) -> _Fit:
    """Fit the radius of the points in the frame of an ellipse, with a given number of waves or as many as tell."""
    angles, radii = ellipse.polar(points)
    _check_round(angles)
    fewest, most = (waves, waves) if waves else (_ELLIPSE_WAVES, _most_waves(angles))
    coefficients, residuals = fit_waves(angles, radii - 1.0, fewest, most)
    wave = np.zeros((2, len(coefficients) // 2 + 1))
    wave[0, 0], wave[0, 1:], wave[1, 1:] = coefficients[0], coefficients[1::2], coefficients[2::2]
    distances = np.sqrt(((points - ellipse.centre[:, None]) ** 2).sum(axis=0)) / radii * residuals
    return _Fit(ellipse, wave, float(np.sqrt((distances * distances).cumsum()[-1] / len(distances))))


def _ellipse_of_moments(points: FloatArray) -> _Ellipse:
    """Ellipse with the centroid and the second moments of the area of a polygon (Green's theorem)."""
    origin = points[:, :1]
    (x, y), (u, v) = points - origin, np.roll(points, -1, axis=1) - origin
    cross = x * v - u * y
    area = 0.5 * cross.cumsum()[-1]
    if abs(area) <= _THINNEST * (x * x + y * y).max():
        raise TableError("the points enclose no area; give them in order round the outline")
    centre = np.array([((x + u) * cross).cumsum()[-1], ((y + v) * cross).cumsum()[-1]]) / (6.0 * area)
    (x, y), (u, v) = (x - centre[0], y - centre[1]), (u - centre[0], v - centre[1])
    cross = x * v - u * y
    moments = [x * x + x * u + u * u, y * y + y * v + v * v, x * y + u * v + 0.5 * (x * v + u * y)]
    xx, yy, xy = ((moment * cross).cumsum()[-1] / (12.0 * area) for moment in moments)
    # An ellipse of matrix M has moments M M^T / 4.
    return _Ellipse(centre + origin[:, 0], _symmetric_root(4.0 * xx, 4.0 * xy, 4.0 * yy))


def _symmetric_root(xx: float, xy: float, yy: float) -> FloatArray:
    """Square root of a positive definite symmetric matrix (Cayley and Hamilton)."""
    squared = xx * yy - xy * xy
    if not squared > 0.0:
        raise TableError("no ellipse fits the points; use an outline nearer to an ellipse")
    determinant = math.sqrt(squared)
    scale = math.sqrt(xx + yy + 2.0 * determinant)
    return np.array([[xx + determinant, xy], [xy, yy + determinant]]) / scale


def _check_round(angles: FloatArray) -> None:
    """Refuse points that do not go once round the centre, or turn back further than noise would."""
    steps = np.diff(angles, append=angles[:1])
    steps -= np.rint(steps)
    travelled = steps.cumsum()
    rounds = round(float(travelled[-1]))
    forward = travelled * rounds
    back = float((np.maximum.accumulate(forward) - forward).max())
    if abs(rounds) != 1 or back > _FURTHEST_BACK:
        raise TableError(
            f"seen from its centre the outline goes round {abs(rounds)} times and turns back by {back:.3g} turns, must "
            f"be once and at most {_FURTHEST_BACK:g}; use an outline nearer to an ellipse, its points in order"
        )


def _most_waves(angles: FloatArray) -> int:
    """Waves that the points can carry: none shorter than twice the widest gap."""
    ordered = np.sort(angles)
    gap = float(np.diff(ordered, append=ordered[0] + 1.0).max())
    most = min(_MOST_WAVES, len(angles) // _POINTS_PER_WAVE, int(0.5 / gap))
    if most <= _ELLIPSE_WAVES:
        raise TableError(
            f"the points leave a gap of {gap:.3g} turns, must be at most {0.5 / (_ELLIPSE_WAVES + 1):.3g}; fill it"
        )
    return most


@kernel
def fit_waves(angles: FloatArray, heights: FloatArray, fewest: int, most: int) -> tuple[FloatArray, FloatArray]:
    """Least squares with waves 0..n, n from ``fewest`` to ``most`` by generalised cross-validation; and the residuals.

    The waves are orthogonalised one by one, so that each n costs only its own two columns.  Returns the constant,
    then cosine and sine of each wave.
    """
    count = angles.size
    columns = 2 * most + 1
    basis = np.empty((columns, count))
    upper = np.zeros((columns, columns))
    along = np.zeros(columns)
    rest = heights.copy()
    residuals = heights.copy()
    chosen = fewest
    lowest = np.inf
    for column in range(columns):
        wave = (column + 1) // 2
        for j in range(count):
            cosine, sine = cos_sin_turns(wave * angles[j])
            basis[column, j] = sine if column > 0 and column % 2 == 0 else cosine
        for _ in range(2):  # twice is enough
            for earlier in range(column):
                upper[earlier, column] += _remove(basis[earlier], basis[column])
        upper[column, column] = np.sqrt(_dot(basis[column], basis[column]))
        for j in range(count):
            basis[column, j] /= upper[column, column]
        for _ in range(2):
            along[column] += _remove(basis[column], rest)
        if column % 2 == 0 and wave >= fewest:
            freedom = 1.0 - _COST_OF_FREEDOM * (column + 1.0) / count
            score = _dot(rest, rest) / (freedom * freedom)
            if score < lowest:
                lowest, chosen = score, wave
                residuals = rest.copy()
            elif wave > 2 * chosen + _WAVES_AHEAD:
                break
    coefficients = np.zeros(2 * chosen + 1)
    for row in range(2 * chosen, -1, -1):
        value = along[row]
        for beyond in range(row + 1, 2 * chosen + 1):
            value -= upper[row, beyond] * coefficients[beyond]
        coefficients[row] = value / upper[row, row]
    return coefficients, residuals


@kernel
def _remove(direction: FloatArray, row: FloatArray) -> float:
    """Take its part along a unit vector out of a row, and give that part."""
    part = _dot(direction, row)
    for j in range(row.size):
        row[j] -= part * direction[j]
    return part


@kernel
def _dot(first: FloatArray, second: FloatArray) -> float:
    total = 0.0
    for j in range(first.size):
        total += first[j] * second[j]
    return total


def _times_circle(wave: FloatArray) -> FloatArray:
    """Harmonics of ``wave (cos, sin)``: each wave gives one harmonic below and one above."""
    highest = wave.shape[1]
    cosine, sine = np.zeros(highest + 2), np.zeros(highest + 2)
    cosine[:highest], sine[:highest] = 0.5 * wave
    cosine[0] *= 2.0
    harmonics = np.zeros((4, highest + 1))
    up = slice(1, highest + 1)
    harmonics[0, up] += cosine[:highest]
    harmonics[1, up] += sine[:highest]
    harmonics[2, up] -= sine[:highest]
    harmonics[3, up] += cosine[:highest]
    down = slice(0, highest)
    harmonics[0, down] += cosine[1 : highest + 1]
    harmonics[1, down] += sine[1 : highest + 1]
    harmonics[2, down] += sine[1 : highest + 1]
    harmonics[3, down] -= cosine[1 : highest + 1]
    harmonics[[1, 3], 0] = 0.0
    return harmonics
