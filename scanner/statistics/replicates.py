"""Fractions by replicate from the verdicts of orbits: what errors of derived numbers are made from."""

from __future__ import annotations

from collections.abc import Collection

import numpy as np
import numpy.typing as npt

from scanner.errors import ScannerError
from scanner.measure.fractions import ratio
from scanner.quantities import PENDING

Floats = npt.NDArray[np.float64]


def verdict_fractions(
    verdicts: npt.ArrayLike, codes: Collection[int], replicates: int, weight: npt.ArrayLike | None = None
) -> Floats:
    """Fraction of the section, or of the energy shell, with one of some verdicts, by replicate.

    Parameters
    ----------
    verdicts
        Codes of the register, shape (orbits,) or (orbits, H), replicate after replicate.  Orbits that were not
        followed, of code 0, do not count.
    codes
        Those that count, for example ``{REGULAR_ROTATIONAL, REGULAR_LIBRATIONAL}`` of `scanner.quantities`.
    replicates
        Number of independent replicates of equal size.
    weight
        Shape (orbits,): mean chords for a fraction of the energy shell; the section by default.

    Returns
    -------
    ndarray
        Shape (replicates,) or (replicates, H).

    Raises
    ------
    ScannerError
        The orbits cannot be shared equally, shapes do not fit, or the weight of an orbit is not finite.
    """
    given = np.asarray(verdicts)
    orbits = given.shape[0] if given.ndim else 0
    if given.ndim not in (1, 2) or orbits == 0 or replicates < 1 or orbits % replicates:
        raise ScannerError(f"verdicts of shape {given.shape} cannot be shared equally by {replicates} replicates")
    chords = np.ones(orbits) if weight is None else np.asarray(weight, dtype=np.float64)
    if chords.shape != (orbits,):
        raise ScannerError(f"weights of shape {chords.shape} must be one for each of {orbits} orbits")
    columns = given.reshape(orbits, -1).T
    weights = [np.where(column == PENDING, 0.0, chords) for column in columns]
    if not np.isfinite(weights).all():
        raise ScannerError(
            "a weight is not finite, as the mean chord of an orbit that was lost; give it that of its table, pi area / "
            "perimeter, instead"
        )
    each = [
        ratio(np.where(np.isin(column, list(codes)), own, 0.0), own, replicates).replicates
        for column, own in zip(columns, weights, strict=True)
    ]
    found: Floats = np.stack(each, axis=1).reshape(replicates, *given.shape[1:])
    return found
