"""Numbers of a table from its orbits: fractions of the section and of the energy shell, exponents, their errors.

Every one of them is a ratio of two sums over the orbits; the error comes from the spread over the independent
replicates, by leaving out one at a time (the jackknife; Tukey, Ann. Math. Stat. 29:614, 1958).  For a plain mean
over replicates of equal size this is the usual standard error of the mean.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from scanner.measure.last_curves import last_curves
from scanner.quantities import CHAOTIC, P_BINS, PERIODS, REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL, UNDECIDED
from scanner.tables import Table

Floats = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]


@dataclass(frozen=True)
class Ratio:
    """A ratio of two sums over orbits, whole and by replicate."""

    value: float
    stderr: float
    replicates: Floats


def _sums(values: Floats, replicates: int) -> Floats:
    """Exactly rounded sum for each replicate: the same on every processor."""
    return np.array([math.fsum(part) for part in values.reshape(replicates, -1)])


def _quotient(above: float, below: float) -> float:
    return above / below if below else math.nan


def ratio(above: Floats, below: Floats, replicates: int) -> Ratio:
    """Ratio of the sums of two arrays over the orbits, with its standard error.

    Parameters
    ----------
    above, below
        Shape (orbits,), replicate after replicate.
    replicates
        Number of independent replicates of equal size.

    Returns
    -------
    Ratio
        NaN where nothing is counted below; the error is NaN unless at least two replicates count something.
    """
    tops = _sums(above, replicates)
    bottoms = _sums(below, replicates)
    top, bottom = math.fsum(tops), math.fsum(bottoms)
    counted = int(np.count_nonzero(bottoms))
    each = np.array([_quotient(t, b) for t, b in zip(tops, bottoms, strict=True)])
    left_out = [(top - t) / (bottom - b) for t, b in zip(tops, bottoms, strict=True) if b] if counted > 1 else []
    stderr = math.nan
    if left_out:
        centre = math.fsum(left_out) / counted
        stderr = math.sqrt((counted - 1) / counted * math.fsum((x - centre) ** 2 for x in left_out))
    return Ratio(_quotient(top, bottom), stderr, each)


def _fraction(inside: Mask, weight: Floats, replicates: int) -> Ratio:
    return ratio(np.where(inside, weight, 0.0), weight, replicates)


def _is_regular(verdict: npt.NDArray[np.int8]) -> Mask:
    found: Mask = (verdict == REGULAR_ROTATIONAL) | (verdict == REGULAR_LIBRATIONAL)
    return found


def regular_error(verdict: npt.NDArray[np.int8], replicates: int) -> float:
    """Standard error of the regular fraction of the section; NaN with a single replicate.

    Where all replicates agree, as when no orbit of all differs, their spread of 0 is not the error: they might as well
    have disagreed by one orbit, which gives 1/orbits, the smallest spread there is.
    """
    regular = _fraction(_is_regular(verdict), np.ones(verdict.size), replicates)
    return _at_least_one_orbit(regular.stderr, verdict.size)


def _at_least_one_orbit(stderr: float, orbits: int) -> float:
    return stderr if math.isnan(stderr) else max(stderr, 1.0 / orbits)


def _by_p(regular: Mask, p: Floats) -> Floats:
    """Regular fraction in each bin of p; NaN in a bin without orbits.

    Every orbit counts for p and for -p, where it runs backwards.
    """
    bins = P_BINS // 2
    place = np.minimum((np.abs(p) * bins).astype(np.int64), bins - 1)
    counts = np.bincount(place, minlength=bins)
    inside = np.bincount(place[regular], minlength=bins)
    forward = [_quotient(float(a), float(b)) for a, b in zip(inside, counts, strict=True)]
    return np.array([*reversed(forward), *forward])


def _by_period(librational: Mask, period: npt.NDArray[np.generic], weight: Floats, replicates: int) -> Floats:
    """Fraction in the islands of each period and its error, shape (2, periods); both 0 where none was met."""
    found = np.zeros((2, len(PERIODS)))
    for q in np.unique(period[librational]):
        part = _fraction(librational & (period == q), weight, replicates)
        found[:, PERIODS.index(int(q))] = part.value, _at_least_one_orbit(part.stderr, librational.size)
    return found


def _median(values: Floats) -> float:
    return float(np.median(values)) if values.size else math.nan


def table_numbers(
    table: Table, orbits: Mapping[str, npt.NDArray[np.generic]], replicates: int
) -> dict[str, float | Floats]:
    """Every root variable of one table, except its status.

    Parameters
    ----------
    table
        The table the orbits belong to.
    orbits
        Variables of the group ``orbits`` for all its orbits, replicate after replicate.
    replicates
        Number of independent replicates of equal size.

    Returns
    -------
    dict
        Name to number, or to an array over the variable's own dimension.
    """
    verdict = np.asarray(orbits["verdict"], dtype=np.int8)
    by_horizon = np.asarray(orbits["verdict_by_horizon"], dtype=np.int8)
    period = np.asarray(orbits["island_period"])
    start = np.asarray(orbits["p0"], dtype=np.float64)
    rotation = np.asarray(orbits["rotation_number"], dtype=np.float64)
    exponent = np.asarray(orbits["lyapunov_per_bounce"], dtype=np.float64)
    chord = np.asarray(orbits["mean_chord"], dtype=np.float64)
    diffusion = np.asarray(orbits["frequency_diffusion"], dtype=np.float64)
    # An orbit whose chords could not be followed has no mean chord of its own; it still takes up its room.
    chord = np.where(np.isfinite(chord), chord, table.mean_chord_exact)

    one = np.ones(verdict.size)
    regular = _is_regular(verdict)
    chaotic = verdict == CHAOTIC
    librational = verdict == REGULAR_LIBRATIONAL
    area = _fraction(regular, one, replicates)
    volume = _fraction(regular, chord, replicates)
    growth = np.where(chaotic, exponent, 0.0)
    per_bounce = ratio(growth, np.where(chaotic, 1.0, 0.0), replicates)
    per_length = ratio(growth, np.where(chaotic, chord, 0.0), replicates)
    island_area = _by_period(librational, period, one, replicates)
    island_volume = _by_period(librational, period, chord, replicates)
    seen = [_is_regular(by_horizon[:, number]) for number in range(by_horizon.shape[1])]
    return {
        "regular_area_fraction": area.value,
        "regular_area_fraction_stderr": regular_error(verdict, replicates),
        "regular_area_fraction_replicates": area.replicates,
        "regular_volume_fraction": volume.value,
        "regular_volume_fraction_stderr": _at_least_one_orbit(volume.stderr, verdict.size),
        "regular_volume_fraction_replicates": volume.replicates,
        "regular_area_fraction_by_horizon": np.array([_fraction(mask, one, replicates).value for mask in seen]),
        "regular_volume_fraction_by_horizon": np.array([_fraction(mask, chord, replicates).value for mask in seen]),
        "chaotic_area_fraction": _fraction(chaotic, one, replicates).value,
        "undecided_area_fraction": _fraction(verdict == UNDECIDED, one, replicates).value,
        "rotational_area_fraction": _fraction(verdict == REGULAR_ROTATIONAL, one, replicates).value,
        "librational_area_fraction": _fraction(librational, one, replicates).value,
        "regular_area_fraction_by_p": _by_p(regular, start),
        **last_curves(start, rotation, verdict),
        "island_area_fraction": island_area[0],
        "island_area_fraction_stderr": island_area[1],
        "island_volume_fraction": island_volume[0],
        "island_volume_fraction_stderr": island_volume[1],
        "lyapunov_per_bounce": per_bounce.value,
        "lyapunov_per_bounce_stderr": per_bounce.stderr,
        "lyapunov_per_length": per_length.value,
        "lyapunov_per_length_stderr": per_length.stderr,
        "entropy_per_bounce": ratio(growth, one, replicates).value,
        "diffusion_median": _median(diffusion[chaotic]),
        "bounces_used": float(np.asarray(orbits["bounces_used"]).sum()),
        "perimeter": table.perimeter,
        "area": table.area,
        "curvature_min": table.curvature_min,
        "curvature_max": table.curvature_max,
        "mean_chord": ratio(chord, one, replicates).value,
        "mean_chord_exact": table.mean_chord_exact,
        "boundary_error": table.boundary_error,
        "orbits_used": verdict.size,
        "symmetry_order": table.symmetry.order,
        "mirror_s": math.nan if table.symmetry.mirror_s is None else table.symmetry.mirror_s,
    }
