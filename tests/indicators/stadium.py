"""The stadium of two unit half-circles and straight sides of length 2, as a map that fills the indicators' buffer."""

from __future__ import annotations

import math

import numba
import numpy as np

from scanner.bounce.lanes import ADVANCE, CHORD, D_PP, D_PS, D_SP, D_SS, LANES, P_AFTER
from scanner.bounce.orbits import tangent_map

HALF_SIDE = 1.0
PERIMETER = 4 * HALF_SIDE + 2 * math.pi
AREA = math.pi + 4 * HALF_SIDE


@numba.njit
def place(s: float) -> tuple[float, float, float, float, float]:
    """Point, unit tangent (counter-clockwise) and curvature at arc length s, from the right end of the lower side."""
    a = HALF_SIDE
    s %= PERIMETER
    if s < math.pi:
        return a + math.sin(s), -math.cos(s), math.cos(s), math.sin(s), 1.0
    s -= math.pi
    if s < 2 * a:
        return a - s, 1.0, -1.0, 0.0, 0.0
    s -= 2 * a
    if s < math.pi:
        return -a - math.sin(s), math.cos(s), -math.cos(s), -math.sin(s), 1.0
    s -= math.pi
    return -a + s, -1.0, 1.0, 0.0, 0.0


@numba.njit
def find_end(x: float, y: float, dx: float, dy: float) -> float:
    """Arc length at which a ray from a point of the boundary meets it again."""
    a = HALF_SIDE
    best, end = 1e300, 0.0
    for side in (-1.0, 1.0):
        if dy * side > 0.0:
            path = (side - y) / dy
            hit = x + path * dx
            if 1e-12 < path < best and abs(hit) <= a:
                best = path
                end = math.pi + a - hit if side > 0 else 2 * math.pi + 3 * a + hit
        rx = x - side * a
        along = rx * dx + y * dy
        inside = along * along - (rx * rx + y * y - 1.0)
        if inside > 0.0:
            path = -along + math.sqrt(inside)
            hx, hy = rx + path * dx, y + path * dy
            if 1e-12 < path < best and hx * side >= 0.0:
                best = path
                angle = math.atan2(hx * side, -hy * side)
                end = angle if side > 0 else math.pi + 2 * a + angle
    return end


@numba.njit
def stadium(s: np.ndarray, p: np.ndarray, buffer: np.ndarray, count: int) -> None:
    """Bounce a block of orbits; s in units of length."""
    for row in range(count):
        for j in range(LANES):
            x, y, tx, ty, k0 = place(s[j])
            c0 = math.sqrt(1.0 - p[j] * p[j])
            dx, dy = tx * p[j] - ty * c0, tx * c0 + ty * p[j]
            end = find_end(x, y, dx, dy)
            x1, y1, tx, ty, k1 = place(end)
            length = math.hypot(x1 - x, y1 - y)
            after = tx * dx + ty * dy
            c1 = ty * dx - tx * dy
            ss, sp, ps, pp = tangent_map(k0, c0, k1, c1, length)
            buffer[ADVANCE, row, j] = (end - s[j]) % PERIMETER / PERIMETER
            buffer[P_AFTER, row, j] = after
            buffer[CHORD, row, j] = length
            buffer[D_SS, row, j] = ss
            buffer[D_SP, row, j] = sp
            buffer[D_PS, row, j] = ps
            buffer[D_PP, row, j] = pp
            s[j] = end
            p[j] = min(max(after, -1.0 + 1e-15), 1.0 - 1e-15)
