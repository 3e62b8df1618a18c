"""Level spacings of a mixed system: independent spectra of its regular part and of its chaotic components, mixed.

Berry and Robnik, J. Phys. A 17:2413, 1984: no level falls in an interval of S mean spacings with probability
``E(S) = exp(-r S) prod_i erfc(x_i)``, ``x_i = sqrt(pi) c_i S / 2``, where r is the regular part of the energy shell
and c_i are its chaotic components, r + sum_i c_i = 1.  The density of spacings is E''.  With
``q_i = c_i exp(-x_i^2) / erfc(x_i)``, for which ``q_i' = q_i^2 - (pi / 2) c_i^2 S q_i``, it becomes a sum of positive
terms, in which nothing cancels:

``P(S) = E(S) [r^2 + 2 r sum_i q_i + 2 sum_{i<j} q_i q_j + (pi / 2) S sum_i c_i^2 q_i]``.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
import numpy.typing as npt
from scipy.integrate import quad
from scipy.special import erf, erfcx

from scanner.errors import ScannerError

Floats = npt.NDArray[np.float64]

ROUNDING = 1e-9
"""Parts of a whole may miss 1 by this much."""


def parts_of(regular: float, chaotic: Sequence[float] | None) -> tuple[float, Floats]:
    """Regular part and chaotic components, checked; a single component by default.

    Raises
    ------
    ScannerError
        A part is outside [0, 1] or they do not add up to 1.
    """
    components = np.asarray([1.0 - regular] if chaotic is None else chaotic, dtype=np.float64)
    for part in (regular, *components.tolist()):
        if not 0.0 <= part <= 1.0:
            raise ScannerError(f"part {part} of the energy shell must lie between 0 and 1")
    whole = math.fsum([regular, *components.tolist()])
    if abs(whole - 1.0) > ROUNDING:
        raise ScannerError(f"the parts of the energy shell add up to {whole:.9g}, they must add up to 1: rescale them")
    return float(regular), components


def _check_spacing(spacing: npt.ArrayLike) -> Floats:
    found = np.asarray(spacing, dtype=np.float64)
    if not (np.isfinite(found) & (found >= 0.0)).all():
        raise ScannerError("a spacing is negative or not a finite number: spacings are differences of sorted levels")
    return found


def _scaled(spacing: Floats, components: Floats) -> Floats:
    """The x_i, shape (components, ...)."""
    return 0.5 * math.sqrt(math.pi) * _upright(components, spacing) * spacing


def _upright(components: Floats, spacing: Floats) -> Floats:
    """The components along a first axis of their own, before those of the spacings."""
    return components.reshape(-1, *(1,) * spacing.ndim)


def _log_erfc(x: Floats) -> Floats:
    """Logarithm of erfc for x >= 0: no digits are lost near 0, and nothing underflows far out."""
    near = np.minimum(x, 0.5)
    found: Floats = np.where(x < 0.5, np.log1p(-erf(near)), np.log(erfcx(x)) - x * x)
    return found


def log_density(spacing: Floats, regular: float, components: Floats) -> Floats:
    """Logarithm of the density of spacings, -inf where it vanishes."""
    x = _scaled(spacing, components)
    hazard = _upright(components, spacing) / erfcx(x)
    pairs = np.zeros_like(spacing)
    so_far = np.full_like(spacing, regular)
    for q in hazard:
        pairs = pairs + so_far * q
        so_far = so_far + q
    repulsion = 0.5 * math.pi * spacing * np.tensordot(components**2, hazard, axes=1)
    log_gap = -regular * spacing + _log_erfc(x).sum(axis=0)
    with np.errstate(divide="ignore"):
        found: Floats = log_gap + np.log(regular**2 + 2.0 * pairs + repulsion)
    return found


def gap_probability(spacing: npt.ArrayLike, regular: float, chaotic: Sequence[float] | None = None) -> Floats:
    """Probability that an interval holds no level, E(S).

    Parameters
    ----------
    spacing
        Length of the interval in mean spacings, any shape.
    regular
        Regular part of the energy shell (rho_1), 0 to 1: a store's ``regular_volume_fraction``.
    chaotic
        Chaotic components of the energy shell (rho_2, rho_3, ...); one that holds all the rest by default.

    Returns
    -------
    ndarray
        Shape of ``spacing``.

    Raises
    ------
    ScannerError
        A spacing is negative, or the parts do not make a whole.

    References
    ----------
    Berry and Robnik, J. Phys. A 17:2413, 1984.
    """
    lengths = _check_spacing(spacing)
    r, components = parts_of(regular, chaotic)
    found: Floats = np.exp(-r * lengths + _log_erfc(_scaled(lengths, components)).sum(axis=0))
    return found


def spacing_density(spacing: npt.ArrayLike, regular: float, chaotic: Sequence[float] | None = None) -> Floats:
    """Probability density of the spacing between neighbouring levels, P(S) = E''(S), per mean spacing.

    Parameters, errors and source as for `gap_probability`.  Limits: Wigner's surmise (pi / 2) S exp(-pi S^2 / 4) for
    a single chaotic component, exp(-S) without chaos; P(0) = 1 - sum_i rho_i^2 over the chaotic components.

    Returns
    -------
    ndarray
        Shape of ``spacing``.
    """
    r, components = parts_of(regular, chaotic)
    found: Floats = np.exp(log_density(_check_spacing(spacing), r, components))
    return found


def spacing_cumulative(spacing: npt.ArrayLike, regular: float, chaotic: Sequence[float] | None = None) -> Floats:
    """Probability of a spacing up to S, W(S) = 1 + E'(S).

    Parameters, errors and source as for `gap_probability`.  Written as a sum over the part that the lower level
    belongs to, of positive terms, so that small probabilities keep their digits.

    Returns
    -------
    ndarray
        Shape of ``spacing``.
    """
    lengths = _check_spacing(spacing)
    r, components = parts_of(regular, chaotic)
    x = _scaled(lengths, components)
    log_gaps = _log_erfc(x)
    log_gap = -r * lengths + log_gaps.sum(axis=0)
    found: Floats = -r * np.expm1(log_gap)
    for part, own, own_x in zip(components, log_gaps, x, strict=True):
        found = found - part * np.expm1(log_gap - own - own_x**2)
    return found


def spacing_moment(order: int, regular: float, chaotic: Sequence[float] | None = None) -> float:
    """Mean of the ``order``-th power of the spacing, in powers of the mean spacing.

    Parameters
    ----------
    order
        A whole number, 0 or more; moments 0 and 1 are 1.
    regular, chaotic
        As for `gap_probability`.

    Returns
    -------
    float
        ``order (order - 1) int S^(order - 2) E(S) dS`` after two partial integrations, to about 1e-10 of itself.

    Raises
    ------
    ScannerError
        The order is negative or not whole, or the parts do not make a whole.
    """
    if order != int(order) or order < 0:
        raise ScannerError(f"order = {order} of a moment must be a whole number, 0 or more")
    parts_of(regular, chaotic)
    if order < 2:
        return 1.0

    def integrand(spacing: float) -> float:
        return float(spacing ** (order - 2) * gap_probability(spacing, regular, chaotic))

    # The gap probability is at most exp(-S) times a Gaussian's reach: most of the integral lies around `order`.
    split = float(order)
    parts = [quad(integrand, *ends, epsabs=0.0, epsrel=1e-10)[0] for ends in ((0.0, split), (split, math.inf))]
    return order * (order - 1) * math.fsum(parts)


def draw_spacings(
    count: int, regular: float, chaotic: Sequence[float] | None = None, *, generator: np.random.Generator
) -> Floats:
    """Draw independent spacings, exactly.

    The lower level belongs to a part of the shell with probability equal to the part; the next level is the first
    among the next one of that part (a Wigner or exponential spacing away) and the next of all others (a wait from a
    random moment away).

    Parameters
    ----------
    count
        How many.
    regular, chaotic
        As for `gap_probability`.
    generator
        Source of randomness.

    Returns
    -------
    ndarray
        Shape (count,), in mean spacings.

    Raises
    ------
    ScannerError
        The count is negative, or the parts do not make a whole.
    """
    if count < 0:
        raise ScannerError(f"count = {count} of spacings must be 0 or more")
    r, components = parts_of(regular, chaotic)
    with np.errstate(divide="ignore"):
        reach = 2.0 / math.sqrt(math.pi) / components[:, None]
        regular_next = generator.standard_exponential(count) / np.float64(r) if r else np.full(count, math.inf)
    own = generator.choice(components.size + 1, size=count, p=np.array([r, *components]) / (r + components.sum()))
    waits = np.abs(generator.standard_normal((components.size, count))) / math.sqrt(2.0)
    spacings = np.sqrt(generator.standard_exponential((components.size, count)))
    is_own = own == np.arange(1, components.size + 1)[:, None]
    chaotic_next = np.where(is_own, spacings, waits) * reach
    nearest: Floats = np.minimum(regular_next, chaotic_next.min(axis=0, initial=math.inf))
    return nearest
