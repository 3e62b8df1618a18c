"""Measured points of a closed outline: read from text and checked."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np

from scanner.compiled import kernel
from scanner.errors import TableError
from scanner.tables.boundary import FloatArray

FEWEST_POINTS = 16
MOST_POINTS = 20_000

_NOISY_PART = 50  # a loop over fewer points than one in so many is taken for noise of points close together


def read_content(file: str) -> bytes:
    """Read a file whole.

    Raises
    ------
    TableError
        If it is not there or cannot be read.
    """
    try:
        return Path(file).read_bytes()
    except OSError as error:
        raise TableError(f"{file} cannot be read: {error.strerror or error}") from None


def parse_points(content: bytes) -> FloatArray:
    """Points of a text with x and y on each line, apart by blanks or a comma; ``#`` starts a comment.

    Points that repeat the one before, and a last one that repeats the first, are dropped.

    Raises
    ------
    TableError
        One line: a line that is not two numbers, too few or too many points, an outline that crosses itself.
    """
    points: list[tuple[float, float]] = []
    for number, line in enumerate(content.decode("utf-8-sig", errors="replace").splitlines(), start=1):
        words = line.partition("#")[0].replace(",", " ").split()
        if words:
            point = _parse_point(words)
            if point is None:
                raise TableError(f"line {number} must be two finite numbers, x and y, but is {line.strip()[:60]!r}")
            if not points or point != points[-1]:
                points.append(point)
    if len(points) > 1 and points[0] == points[-1]:
        points.pop()
    if not FEWEST_POINTS <= len(points) <= MOST_POINTS:
        raise TableError(f"{len(points)} different points, must be {FEWEST_POINTS} to {MOST_POINTS}")
    outline = np.ascontiguousarray(np.array(points).T)
    first, second = find_crossing(outline, max(1, len(points) // _NOISY_PART))
    if first >= 0:
        x, y = points[first]
        raise TableError(
            f"the outline crosses itself: the line from point {first + 1} ({x:g}, {y:g}) meets that from point "
            f"{second + 1}; put the points in order round the outline"
        )
    return outline


def _parse_point(words: list[str]) -> tuple[float, float] | None:
    try:
        x, y = map(float, words)
    except ValueError:
        return None
    # Squares of coordinates, and of their inverses, must be numbers too.
    return (x, y) if max(abs(x), abs(y)) < 1e100 and math.isfinite(x + y) else None


@kernel
def find_crossing(outline: FloatArray, reach: int) -> tuple[int, int]:
    """Find the first two lines of a polygon that cross, by their first points; -1, -1 if none do.

    Lines at most ``reach`` apart along the polygon are not looked at.
    """
    count = outline.shape[1]
    for i in range(count - 1):
        ax, ay, bx, by = outline[0, i], outline[1, i], outline[0, i + 1], outline[1, i + 1]
        left, right = min(ax, bx), max(ax, bx)
        for j in range(i + reach + 1, min(count, count + i - reach)):
            following = j + 1 if j + 1 < count else 0
            cx, cy, dx, dy = outline[0, j], outline[1, j], outline[0, following], outline[1, following]
            if max(cx, dx) < left or min(cx, dx) > right:
                continue
            side_c = (bx - ax) * (cy - ay) - (by - ay) * (cx - ax)
            side_d = (bx - ax) * (dy - ay) - (by - ay) * (dx - ax)
            side_a = (dx - cx) * (ay - cy) - (dy - cy) * (ax - cx)
            side_b = (dx - cx) * (by - cy) - (dy - cy) * (bx - cx)
            if side_c * side_d < 0.0 and side_a * side_b < 0.0:
                return i, j
    return -1, -1
