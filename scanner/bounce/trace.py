"""Orbits bounce by bounce, for looking at and for tests; the indicators do not go through here."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from scanner.bounce.lanes import (
    ADVANCE,
    BUFFER,
    BUFFER_ROWS,
    CHORD,
    D_PP,
    D_PS,
    D_SP,
    D_SS,
    FAILED,
    KEPT_ROWS,
    LANES,
    MOMENTUM,
    POINT_X,
    POINT_Y,
    TURN_IM,
    TURN_RE,
    busy_lanes,
    fill_up,
)
from scanner.bounce.orbits import bounce_block, start_block
from scanner.compiled import kernel
from scanner.elementary import angle_turns
from scanner.errors import TableError
from scanner.quantities import COORDINATES

if TYPE_CHECKING:
    import xarray as xr

    from scanner.tables import Table

Floats = npt.NDArray[np.float64]

(T_TURNS, T_P, T_X, T_Y, T_CHORD, T_ADVANCE, T_SS, T_SP, T_PS, T_PP, T_FAILED) = range(11)
TRACE_ROWS = 11


@kernel
def trace_block(harmonics: Floats, turns: Floats, momenta: Floats, size: int, found: Floats) -> None:
    """Follow ``size`` orbits and fill ``found``, of shape (bounces + 1, TRACE_ROWS, LANES); row 0 is the start."""
    state = np.empty((KEPT_ROWS, LANES))
    buffer = np.full((BUFFER_ROWS, BUFFER, LANES), np.nan)
    start_block(harmonics, turns, momenta, state)
    for bounce in range(found.shape[0]):
        # Plain numbers in place of min and busy_lanes would be types of their own, and compiled once more.
        bounce_block(harmonics, state, buffer, min(bounce, 1), busy_lanes(size))
        for j in range(LANES):
            angle = angle_turns(state[TURN_IM, j], state[TURN_RE, j])
            found[bounce, T_TURNS, j] = angle if angle >= 0.0 else angle + 1.0
            found[bounce, T_P, j] = state[MOMENTUM, j]
            found[bounce, T_X, j] = state[POINT_X, j]
            found[bounce, T_Y, j] = state[POINT_Y, j]
            found[bounce, T_CHORD, j] = buffer[CHORD, 0, j]
            found[bounce, T_ADVANCE, j] = buffer[ADVANCE, 0, j]
            found[bounce, T_SS, j] = buffer[D_SS, 0, j]
            found[bounce, T_SP, j] = buffer[D_SP, 0, j]
            found[bounce, T_PS, j] = buffer[D_PS, 0, j]
            found[bounce, T_PP, j] = buffer[D_PP, 0, j]
            found[bounce, T_FAILED, j] = state[FAILED, j]


def follow(harmonics: Floats, turns: Floats, momenta: Floats, bounces: int) -> Floats:
    """Orbits from boundary parameters and momenta of shape (n,): array (bounces + 1, TRACE_ROWS, n)."""
    size = turns.size
    turns, momenta = fill_up(turns), fill_up(momenta)
    found = np.empty((bounces + 1, TRACE_ROWS, turns.size))
    for first in range(0, turns.size, LANES):
        lanes = slice(first, first + LANES)
        block = np.empty((bounces + 1, TRACE_ROWS, LANES))
        trace_block(harmonics, turns[lanes], momenta[lanes], size - first, block)
        found[:, :, lanes] = block
    found[:, T_X] += harmonics[0, 0]
    found[:, T_Y] += harmonics[2, 0]
    return found[:, :, :size]


def check_start(table: Table, s: npt.ArrayLike, p: npt.ArrayLike) -> tuple[Floats, Floats]:
    """Initial conditions as two arrays of shape (n,).

    Raises
    ------
    TableError
        If the table is not convex, the shapes do not agree, or a value is not finite or |p| >= 1.
    """
    if not table.is_convex:
        raise TableError(f"{table.identity}: orbits need a convex table, but {table.convexity}")
    try:
        s, p = np.broadcast_arrays(
            np.atleast_1d(np.asarray(s, dtype=np.float64)), np.atleast_1d(np.asarray(p, dtype=np.float64))
        )
    except (ValueError, TypeError) as problem:
        raise TableError(f"s and p must be numbers or arrays of one shape: {problem}") from None
    if s.ndim != 1 or s.size == 0:
        raise TableError(f"s and p have shape {s.shape}: give one value an orbit, at least one")
    if not np.all(np.isfinite(s)):
        raise TableError("s has values that are not finite: give arc lengths as fractions of the perimeter")
    if not np.all(np.abs(p) < 1.0):
        raise TableError(f"p = {p[~(np.abs(p) < 1.0)][0]} is outside -1 < p < 1: p is the sine of an angle")
    return np.ascontiguousarray(s), np.ascontiguousarray(p)


def trace(table: Table, s: npt.ArrayLike, p: npt.ArrayLike, bounces: int) -> xr.Dataset:
    """Follow orbits bounce by bounce.

    Parameters
    ----------
    table
        A convex table.
    s, p
        Start of each orbit, shape (n,): arc length over the perimeter, and the sine of the angle between the
        outgoing ray and the inward normal, positive along the boundary's direction (counter-clockwise).
    bounces
        How many bounces to follow, at least 1.

    Returns
    -------
    xarray.Dataset
        Dimensions ``orbit`` and ``bounce`` (0 is the start, so ``bounces + 1`` entries): ``s``, ``p``, ``x``, ``y``,
        and ``chord``, the length of the chord that ends at the bounce (NaN at the start).  ``status`` (orbit) is 1 for
        an orbit of which some chord could not be found; its values are NaN from there on.

    Raises
    ------
    TableError
        If the table is not convex or an initial condition is not valid.
    """
    import xarray as xr

    s, p = check_start(table, s, p)
    if bounces < 1:
        raise TableError(f"bounces = {bounces} must be at least 1")
    found = follow(table.harmonics, table.turns_from_arc(s), p, bounces)
    lost = found[:, T_FAILED] > 0.0
    arc = table.arc_from_turns(found[:, T_TURNS].reshape(-1)).reshape(found[:, T_TURNS].shape)

    def variable(values: Floats, long_name: str, units: str) -> tuple[tuple[str, str], Floats, dict[str, str]]:
        return ("orbit", "bounce"), np.where(lost, np.nan, values).T, {"long_name": long_name, "units": units}

    return xr.Dataset(
        {
            "s": variable(arc, "arc length as a fraction of the perimeter", "1"),
            "p": variable(found[:, T_P], "sine of the angle from the inward normal after the bounce", "1"),
            "x": variable(found[:, T_X], "x of the bounce", "length"),
            "y": variable(found[:, T_Y], "y of the bounce", "length"),
            "chord": variable(found[:, T_CHORD], "length of the chord that ends at the bounce", "length"),
            "status": (
                ("orbit",),
                lost[-1].astype(np.int8),
                {
                    "long_name": "state of the orbit",
                    "units": "1",
                    "flag_values": np.array([0, 1], dtype=np.int8),
                    "flag_meanings": "followed lost",
                },
            ),
        },
        coords={
            name: (name, np.arange(size), {"long_name": COORDINATES[name], "units": "1"})
            for name, size in (("bounce", bounces + 1), ("orbit", s.size))
        },
    )
