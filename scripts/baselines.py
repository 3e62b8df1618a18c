"""Two straightforward ways to measure orbits, to compare the package's speed and results with.

Both do the work that the package does for every bounce of a table whose boundary is a Fourier series: the next
end of the chord by Newton's method, reflection, the tangent map, a tangent vector carried along, and weighted
averages of advance, p and chord over the same windows.  ``measure_scalar`` follows one orbit after another in a
plain compiled loop, ``measure_vectorised`` all of them at once in NumPy arrays.  Neither shares code with the package,
and neither does what the package does besides: verdicts, centres of islands and the winding about them.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numba
import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]

TOLERANCE = 1e-9
"""A Newton step, in turns, after which the next one would be below rounding."""
MOST_STEPS = 60
"""Enough to find the chord by halving alone."""
TRANSIENT = 8
"""The exponent leaves out the first 1 / 8 of the bounces."""
MOST_DIGITS = 16.0


@dataclass(frozen=True)
class Windows:
    """When the averages of H horizons are taken, all the package takes.

    ``spans`` has a row (first bounce, length, place of its weights) for each of the W windows; ``weights`` one
    row of weights, filled up with zeros, for each distinct length and kind; ``marks`` the bounces at which the growth
    of the tangent vector is noted; ``of_horizon`` the places of seven windows for each horizon: its two halves; then
    with quick weights the whole, the two halves, the first and the last three quarters.
    """

    horizons: tuple[int, ...]
    spans: Integers
    weights: Floats
    marks: Integers
    of_horizon: tuple[tuple[int, ...], ...]


def smooth_weights(length: int) -> Floats:
    """Weights exp(-1 / (t (1 - t))) at midpoints, with sum 1 (Das, Saiki, Sander and Yorke, arXiv:1601.06051)."""
    t = (np.arange(length) + 0.5) / length
    weights = np.exp(-1.0 / (t * (1.0 - t)))
    return weights / weights.sum()


def quick_weights(length: int) -> Floats:
    """Weights sin^8(pi t) at midpoints, with sum 1: the Hann window of fourth order (Laskar 2003)."""
    weights = np.sin(math.pi * (np.arange(length) + 0.5) / length) ** 8
    return weights / weights.sum()


def lay_out_windows(horizons: Sequence[int]) -> Windows:
    """Windows of increasing horizons; one that serves two horizons is kept once."""
    wanted = []
    for end in horizons:
        half, most = end // 2, end - end // 4
        halves = ((0, half), (end - half, half))
        wanted.append(
            [(*span, smooth_weights) for span in halves]
            + [(*span, quick_weights) for span in ((0, end), *halves, (0, most), (end - most, most))]
        )
    spans = list(dict.fromkeys(span for seven in wanted for span in seven))
    kinds = list(dict.fromkeys((length, weigh) for _, length, weigh in spans))
    weights = np.zeros((len(kinds), max(length for length, _ in kinds)))
    for row, (length, weigh) in enumerate(kinds):
        weights[row, :length] = weigh(length)
    return Windows(
        horizons=tuple(horizons),
        spans=np.array([(first, length, kinds.index((length, weigh))) for first, length, weigh in spans]),
        weights=weights,
        marks=np.array(sorted({mark for end in horizons for mark in (end // TRANSIENT, end)})),
        of_horizon=tuple(tuple(map(spans.index, seven)) for seven in wanted),
    )


def measure_scalar(harmonics: Floats, turns: Floats, p: Floats, horizons: Sequence[int]) -> dict[str, Floats]:
    """Measure n orbits one after another in a compiled loop.

    Parameters
    ----------
    harmonics
        Shape (4, K + 1): x = sum_k harmonics[0, k] cos 2 pi k t + harmonics[1, k] sin 2 pi k t, y likewise from
        rows 2 and 3, counter-clockwise.
    turns, p
        Shape (n,): boundary parameter t and sine of the angle from the inward normal at the start.
    horizons
        H numbers of bounces, increasing; the last is the length of the orbits.

    Returns
    -------
    dict
        ``rotation_number`` (turns per bounce), ``weighted_chord`` (length), ``frequency_diffusion`` (log10),
        ``agreement_digits`` and ``lyapunov_per_bounce``, of shape (H, n), and ``mean_chord`` of shape (n,).
    """
    windows = lay_out_windows(horizons)
    averages = np.zeros((len(windows.spans), 3, turns.size))
    growth = np.zeros((windows.marks.size, turns.size))
    path = np.zeros(turns.size)
    _follow_each(harmonics, turns, p, windows.spans, windows.weights, windows.marks, averages, growth, path)
    return read_windows(windows, averages, growth, path)


def measure_vectorised(harmonics: Floats, turns: Floats, p: Floats, horizons: Sequence[int]) -> dict[str, Floats]:
    """Measure n orbits at once in arrays; arguments and result as of ``measure_scalar``."""
    windows = lay_out_windows(horizons)
    averages, growth, path = _follow_all(harmonics, turns, p, windows)
    return read_windows(windows, averages, growth, path)


def read_windows(windows: Windows, averages: Floats, growth: Floats, path: Floats) -> dict[str, Floats]:
    """What the measures of this module and of the others return, from sums over bounces."""
    place = {int(mark): number for number, mark in enumerate(windows.marks)}
    scale = (path.mean() / windows.horizons[-1]) if path.size else 1.0
    found: dict[str, list[Floats]] = {
        name: []
        for name in (
            "rotation_number",
            "weighted_chord",
            "frequency_diffusion",
            "agreement_digits",
            "lyapunov_per_bounce",
        )
    }
    for end, (first, second, whole, quick_first, quick_second, *_) in zip(
        windows.horizons, windows.of_horizon, strict=True
    ):
        change = np.abs(averages[second] - averages[first])
        change[2] /= scale
        change = np.log10(np.maximum(change, 10.0**-MOST_DIGITS))
        drift = np.abs(averages[quick_second, 0] - averages[quick_first, 0])
        settled = end // TRANSIENT
        found["rotation_number"].append(averages[whole, 0])
        found["weighted_chord"].append(averages[whole, 2])
        found["frequency_diffusion"].append(np.log10(np.maximum(drift, 10.0**-MOST_DIGITS)))
        found["agreement_digits"].append(-change.max(axis=0))
        found["lyapunov_per_bounce"].append((growth[place[end]] - growth[place[settled]]) / (end - settled))
    return {name: np.array(rows) for name, rows in found.items()} | {"mean_chord": path / windows.horizons[-1]}


# One orbit after another


@numba.njit(nogil=True, error_model="numpy")
def _boundary(harmonics, turns):
    """Point, first and second derivative by the angle 2 pi t, at t = ``turns``."""
    angle = 2.0 * math.pi * turns
    cos1 = math.cos(angle)
    sin1 = math.sin(angle)
    cos, sin = 1.0, 0.0
    x, y = harmonics[0, 0], harmonics[2, 0]
    x1 = y1 = x2 = y2 = 0.0
    for k in range(1, harmonics.shape[1]):
        cos, sin = cos * cos1 - sin * sin1, sin * cos1 + cos * sin1
        dx = harmonics[0, k] * cos + harmonics[1, k] * sin
        dy = harmonics[2, k] * cos + harmonics[3, k] * sin
        x += dx
        y += dy
        x1 += k * (harmonics[1, k] * cos - harmonics[0, k] * sin)
        y1 += k * (harmonics[3, k] * cos - harmonics[2, k] * sin)
        x2 -= k * k * dx
        y2 -= k * k * dy
    return x, y, x1, y1, x2, y2


@numba.njit(nogil=True, error_model="numpy")
def _advance(harmonics, turns, x0, y0, dx, dy):
    """Find the turns from a boundary point to the other end of the chord along (dx, dy), between 0 and 1."""
    # The first guess is exact for an ellipse: its affine image is a circle, where directions are angles.
    along = dx * harmonics[3, 1] - dy * harmonics[1, 1]
    across = dy * harmonics[0, 1] - dx * harmonics[2, 1]
    advance = 2.0 * (math.atan2(across, along) / (2.0 * math.pi) - turns) + 0.5
    advance -= math.floor(advance)
    low, high = 0.0, 1.0
    for _ in range(MOST_STEPS):
        x, y, x1, y1, _x2, _y2 = _boundary(harmonics, turns + advance)
        side = (x - x0) * dy - (y - y0) * dx
        if side > 0.0:
            low = advance
        else:
            high = advance
        trial = advance - side / (2.0 * math.pi * (x1 * dy - y1 * dx))
        if not low <= trial <= high:
            trial = 0.5 * (low + high)
        step = trial - advance
        advance = trial
        if abs(step) < TOLERANCE:
            break
    return advance


@numba.njit(nogil=True, error_model="numpy")
def _follow_each(harmonics, start_turns, start_p, spans, weights, marks, averages, growth, path):
    for orbit in range(start_turns.size):
        turns = start_turns[orbit]
        x, y, x1, y1, x2, y2 = _boundary(harmonics, turns)
        speed = math.sqrt(x1 * x1 + y1 * y1)
        tx, ty = x1 / speed, y1 / speed
        curvature = (x1 * y2 - y1 * x2) / (speed * speed * speed)
        p = start_p[orbit]
        c = math.sqrt((1.0 - p) * (1.0 + p))
        vector_s, vector_p, grown, travelled = 0.5, 0.5, 0.0, 0.0
        mark = 0
        for bounce in range(marks[-1]):
            dx = p * tx - c * ty
            dy = p * ty + c * tx
            advance = _advance(harmonics, turns, x, y, dx, dy)
            turns += advance
            turns -= math.floor(turns)
            x0, y0, c0, curvature0 = x, y, c, curvature
            x, y, x1, y1, x2, y2 = _boundary(harmonics, turns)
            speed = math.sqrt(x1 * x1 + y1 * y1)
            tx, ty = x1 / speed, y1 / speed
            curvature = (x1 * y2 - y1 * x2) / (speed * speed * speed)
            chord = math.sqrt((x - x0) ** 2 + (y - y0) ** 2)
            p = tx * dx + ty * dy
            c = ty * dx - tx * dy

            # Tangent map: Berry, Eur. J. Phys. 2:91, 1981.
            next_s = (curvature0 * chord - c0) / c * vector_s - chord / (c0 * c) * vector_p
            next_p = (curvature0 * c + curvature * c0 - curvature0 * curvature * chord) * vector_s + (
                curvature * chord - c
            ) / c0 * vector_p
            size = abs(next_s) + abs(next_p)
            vector_s, vector_p = next_s / size, next_p / size
            grown += math.log(size)
            travelled += chord
            if bounce + 1 == marks[mark]:
                growth[mark, orbit] = grown
                mark += 1

            for window in range(spans.shape[0]):
                number = bounce - spans[window, 0]
                if 0 <= number < spans[window, 1]:
                    weight = weights[spans[window, 2], number]
                    averages[window, 0, orbit] += weight * advance
                    averages[window, 1, orbit] += weight * p
                    averages[window, 2, orbit] += weight * chord
        path[orbit] = travelled


# All orbits at once


class _Boundary:
    """The boundary as a complex number w = x + i y, a Fourier series in z = exp(2 pi i t)."""

    def __init__(self, harmonics: Floats) -> None:
        xc, xs, yc, ys = harmonics
        order = np.arange(harmonics.shape[1])
        forward = 0.5 * ((xc + ys) + 1j * (yc - xs))
        backward = 0.5 * ((xc - ys) + 1j * (yc + xs))
        self.forward = np.array([forward, 1j * order * forward, -(order**2) * forward])
        self.backward = np.array([backward, -1j * order * backward, -(order**2) * backward])
        self.harmonics = harmonics

    def at(self, turns: Floats, derivatives: int) -> npt.NDArray[np.complex128]:
        """Rows w, w', w'' up to the number of ``derivatives`` by the angle 2 pi t, shape (derivatives + 1, n)."""
        powers = np.empty((self.forward.shape[1], turns.size), dtype=complex)
        powers[0] = 1.0
        powers[1] = np.exp(2j * np.pi * turns)
        for k in range(2, len(powers)):
            np.multiply(powers[k - 1], powers[1], out=powers[k])
        rows = derivatives + 1
        return self.forward[:rows] @ powers + self.backward[:rows] @ powers.conj()

    def guess(self, turns: Floats, ray: npt.NDArray[np.complex128]) -> Floats:
        """Advance in turns that is exact for an ellipse."""
        (_, xc), (_, xs), (_, yc), (_, ys) = self.harmonics[:, :2]
        angle = np.arctan2(ray.imag * xc - ray.real * yc, ray.real * ys - ray.imag * xs)
        return (2.0 * (angle / (2.0 * np.pi) - turns) + 0.5) % 1.0


def _cross(a: npt.NDArray[np.complex128], b: npt.NDArray[np.complex128]) -> Floats:
    return a.real * b.imag - a.imag * b.real


def _advance_all(
    boundary: _Boundary, turns: Floats, start: npt.NDArray[np.complex128], ray: npt.NDArray[np.complex128]
) -> Floats:
    advance = boundary.guess(turns, ray)
    low, high = np.zeros_like(turns), np.ones_like(turns)
    unsolved = np.arange(turns.size)
    for _ in range(MOST_STEPS):
        last, along = advance[unsolved], ray[unsolved]
        w, w1 = boundary.at(turns[unsolved] + last, derivatives=1)
        side = _cross(w - start[unsolved], along)
        ahead = side > 0.0
        low[unsolved[ahead]] = last[ahead]
        high[unsolved[~ahead]] = last[~ahead]
        trial = last - side / (2.0 * np.pi * _cross(w1, along))
        inside = (trial >= low[unsolved]) & (trial <= high[unsolved])
        trial = np.where(inside, trial, 0.5 * (low + high)[unsolved])
        advance[unsolved] = trial
        unsolved = unsolved[np.abs(trial - last) >= TOLERANCE]
        if unsolved.size == 0:
            break
    return advance


def _follow_all(harmonics: Floats, turns: Floats, p: Floats, windows: Windows) -> tuple[Floats, Floats, Floats]:
    boundary = _Boundary(harmonics)
    averages = np.zeros((len(windows.spans), 3, turns.size))
    growth = np.zeros((windows.marks.size, turns.size))
    path, grown = np.zeros(turns.size), np.zeros(turns.size)
    vector_s, vector_p = np.full(turns.size, 0.5), np.full(turns.size, 0.5)
    w, w1, w2 = boundary.at(turns, derivatives=2)
    tangent = w1 / np.abs(w1)
    curvature = _cross(w1, w2) / np.abs(w1) ** 3
    c = np.sqrt((1.0 - p) * (1.0 + p))
    mark = 0
    for bounce in range(windows.horizons[-1]):
        ray = (p + 1j * c) * tangent
        advance = _advance_all(boundary, turns, w, ray)
        turns = (turns + advance) % 1.0
        start, c0, curvature0 = w, c, curvature
        w, w1, w2 = boundary.at(turns, derivatives=2)
        speed = np.abs(w1)
        tangent = w1 / speed
        curvature = _cross(w1, w2) / speed**3
        chord = np.abs(w - start)
        turned = ray * tangent.conj()
        p, c = turned.real, -turned.imag

        vector_s, vector_p = (
            (curvature0 * chord - c0) / c * vector_s - chord / (c0 * c) * vector_p,
            (curvature0 * c + curvature * c0 - curvature0 * curvature * chord) * vector_s
            + (curvature * chord - c) / c0 * vector_p,
        )
        size = np.abs(vector_s) + np.abs(vector_p)
        vector_s /= size
        vector_p /= size
        grown += np.log(size)
        path += chord
        if bounce + 1 == windows.marks[mark]:
            growth[mark] = grown
            mark += 1

        seen = np.array([advance, p, chord])
        for window, (first, length, row) in enumerate(windows.spans):
            if first <= bounce < first + length:
                averages[window] += windows.weights[row, bounce - first] * seen
    return averages, growth, path
