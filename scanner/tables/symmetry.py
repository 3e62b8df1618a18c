"""Rotations and mirrors that map a table onto itself, found from the Fourier coefficients of its boundary.

With z(t) = x + iy = sum_k c_k exp(2 pi i k t) about c_0, k of both signs: a rotation by 1/n turn takes t to t + 1/n
where c_k = 0 unless k = 1 mod n; the mirror line through the point at t = m takes m + t to m - t where all
c_k exp(2 pi i k m) lie on one straight line through 0.  A curve whose parameter does not follow its symmetry passes
for one without any, which costs orbits and nothing else.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from scanner.elementary import angle_array, cos_sin_array
from scanner.tables.boundary import FloatArray

TOLERANCE = 1e-12
"""Distance of the boundary from a symmetric curve, over its size, that counts as rounding.

Those of symmetric tables add up to 1e-16 in most families, and never to 1e-13.  What so small a deformation changes on
the section, islands as narrow as its square root, is far below the error of any sample.
"""


@dataclass(frozen=True)
class Symmetry:
    """Symmetry of a table: a rotation of some order, and perhaps mirror lines.

    Attributes
    ----------
    order
        n for rotations by 1/n turn; 1 if there is none.
    mirror_s
        Arc length over the perimeter of a boundary point on a mirror line; None if there is none.  With it, there are
        mirrors at every further 1/(2n).
    """

    order: int
    mirror_s: float | None

    @property
    def start(self) -> float:
        """Arc length over the perimeter where the fundamental part of the boundary begins."""
        return 0.0 if self.mirror_s is None else self.mirror_s

    @property
    def width(self) -> float:
        """Length of the fundamental part over the perimeter: its images fill the boundary."""
        return 1.0 / self.order if self.mirror_s is None else 0.5 / self.order


def find_symmetry(harmonics: FloatArray) -> tuple[int, float | None]:
    """Order of the rotations of a curve and the parameter, in turns, of a point on a mirror line, if there is one.

    A circle, which has every symmetry, is taken for an ellipse.

    Parameters
    ----------
    harmonics
        Boundary, shape (4, K + 1), counter-clockwise.
    """
    wave, real, imaginary = _coefficients(harmonics)
    sizes = np.sqrt(real * real + imaginary * imaginary)
    first = int(np.flatnonzero(wave == 1)[0])
    allowed = TOLERANCE * float(sizes.max())
    kept = _rise_above(sizes, allowed)
    if not kept[first]:
        return 1, None
    kept[first] = False
    if not kept.any():
        return 2, 0.0
    order = math.gcd(*(wave[kept] - 1).tolist())
    # Each coefficient over the phase of the first, which is then on the line itself.
    along = (real * real[first] + imaginary * imaginary[first]) / sizes[first]
    across = (imaginary * real[first] - real * imaginary[first]) / sizes[first]
    mirror = _find_mirror((wave - 1)[kept], along[kept], across[kept], order, allowed)
    return order, mirror


def _coefficients(harmonics: FloatArray) -> tuple[np.ndarray, FloatArray, FloatArray]:
    """Wave numbers k but 0, and the real and imaginary part of each c_k."""
    x_cosine, x_sine, y_cosine, y_sine = harmonics[:, 1:]
    wave = np.arange(1, harmonics.shape[1])
    real = 0.5 * np.concatenate([x_cosine + y_sine, x_cosine - y_sine])
    imaginary = 0.5 * np.concatenate([y_cosine - x_sine, y_cosine + x_sine])
    return np.concatenate([wave, -wave]), real, imaginary


def _rise_above(sizes: FloatArray, allowed: float) -> np.ndarray:
    """Mark all but the smallest sizes that together stay within what is allowed."""
    rising = np.argsort(sizes, kind="stable")
    kept = np.empty(sizes.size, dtype=np.bool_)
    kept[rising] = sizes[rising].cumsum() > allowed
    return kept


def _find_mirror(
    shift: np.ndarray, real: FloatArray, imaginary: FloatArray, order: int, allowed: float
) -> float | None:
    """Find the parameter m at which all (real, imaginary) turned by ``shift * m`` lie on the real axis.

    Candidates come from the coefficient whose phase says most of m, so that rounding of m moves no other one by more.
    """
    sharpest = int(np.argmax(np.abs(shift) * np.sqrt(real * real + imaginary * imaginary)))
    phase = float(angle_array(imaginary[sharpest], real[sharpest]))
    steps = int(shift[sharpest])
    for number in range(abs(steps) // order):  # beyond these the same lines come again
        mirror = (0.5 * number - phase) / steps
        cosine, sine = cos_sin_array(shift * mirror)
        if np.abs(imaginary * cosine + real * sine).sum() <= allowed:
            return mirror % (0.5 / order)
    return None
