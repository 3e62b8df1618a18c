"""An independent bounce in 40 digits: bracketing on the undivided cross product, no shared formula with the package."""

from __future__ import annotations

from dataclasses import dataclass

import mpmath as mp
import numpy as np

DIGITS = 40


@dataclass(frozen=True)
class SlowBounce:
    advance: float  # turns of the boundary parameter
    p: float
    chord: float
    tangent_map: np.ndarray  # (2, 2) in (s, p)


def boundary(harmonics: np.ndarray, t: mp.mpf) -> tuple[mp.mpc, mp.mpc, mp.mpc]:
    """Point and its first two derivatives by the angle 2 pi t."""
    point, first, second = mp.mpc(0), mp.mpc(0), mp.mpc(0)
    for k in range(harmonics.shape[1]):
        c, s = mp.cospi(2 * k * t), mp.sinpi(2 * k * t)
        cos_part = mp.mpc(harmonics[0, k], harmonics[2, k])
        sin_part = mp.mpc(harmonics[1, k], harmonics[3, k])
        point += cos_part * c + sin_part * s
        first += k * (sin_part * c - cos_part * s)
        second -= k * k * (cos_part * c + sin_part * s)
    return point, first, second


def curvature(first: mp.mpc, second: mp.mpc) -> mp.mpf:
    return (mp.conj(first) * second).imag / abs(first) ** 3


def slow_bounce(harmonics: np.ndarray, turns: float, p: float) -> SlowBounce:
    """One bounce on the Fourier boundary, to double precision."""
    with mp.workdps(DIGITS):
        t0, p0 = mp.mpf(turns), mp.mpf(p)
        c0 = mp.sqrt((1 - p0) * (1 + p0))
        w0, first0, second0 = boundary(harmonics, t0)
        ray = first0 / abs(first0) * mp.mpc(p0, c0)

        def across(advance: mp.mpf) -> mp.mpf:
            point, _, _ = boundary(harmonics, t0 + advance)
            return (mp.conj(ray) * (point - w0)).imag

        # Behind the start the cross product is negative, before the end of the turn it is positive.
        low, high = mp.mpf(10) ** -16, 1 - mp.mpf(10) ** -16
        assert across(low) < 0 < across(high)
        for _ in range(70):
            middle = (low + high) / 2
            if across(middle) < 0:
                low = middle
            else:
                high = middle
        advance = mp.findroot(across, (low, high), solver="secant", tol=mp.mpf(10) ** -60, verify=False)
        w1, first1, second1 = boundary(harmonics, t0 + advance)
        tangent = first1 / abs(first1)
        incoming = mp.conj(tangent) * ray
        p1, c1 = incoming.real, -incoming.imag
        length = abs(w1 - w0)
        k0, k1 = curvature(first0, second0), curvature(first1, second1)
        matrix = [
            [(k0 * length - c0) / c1, -length / (c0 * c1)],
            [k0 * c1 + k1 * c0 - k0 * k1 * length, (k1 * length - c1) / c0],
        ]
        return SlowBounce(
            float(advance), float(p1), float(length), np.array([[float(x) for x in row] for row in matrix])
        )
