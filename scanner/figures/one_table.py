"""The one table that a figure is about: refused where several are left, built again to follow its orbits anew."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr

from scanner.analysis import study_of, swept_parameters
from scanner.bounce import trace
from scanner.errors import ScannerError
from scanner.figures.request import Request
from scanner.quantities import DONE, ORBITS, TABLE_STATUS
from scanner.tables import Table, build_table

MOST_POINTS = 2_000_000


def require_one_table(picked: xr.DataTree, kind: str, request: Request) -> None:
    """Refuse a sweep of which several tables are left, or whose one table was not measured."""
    held = [*swept_parameters(picked), *request.average]
    if held:
        raise ScannerError(f"a {kind} shows one table: give a value of {', '.join(held)} with --select")
    status = int(picked["table_status"].item())
    if status != DONE:
        raise ScannerError(f"this table has no orbits to draw, its status is {TABLE_STATUS[status]}: select another")


def orbits_of(picked: xr.DataTree) -> xr.Dataset:
    """Orbits as they are stored, in the part of the section that was sampled."""
    return picked[ORBITS].to_dataset().load()


def rebuild_table(picked: xr.DataTree, *, allow_code: bool = False) -> Table:
    """Build the one table that is left, from the study and the values at which swept parameters are held."""
    study = study_of(picked)
    held = {str(name): value.item() for name, value in picked.coords.items() if not value.dims}
    parameters: dict[str, Any] = {**study.fixed, **held}
    return build_table(study.family, allow_code=allow_code, **parameters)


def follow_anew(table: Table, s: np.ndarray, p: np.ndarray, bounces: int) -> tuple[np.ndarray, np.ndarray]:
    """Follow orbits from where they started: s and p of shape (orbits, bounces + 1)."""
    if s.size * bounces > MOST_POINTS:
        raise ScannerError(
            f"{s.size} orbits of {bounces} bounces are {s.size * bounces} points, at most {MOST_POINTS} can be told "
            f"apart: ask for {MOST_POINTS // s.size} bounces or fewer"
        )
    orbits = trace(table, s, p, bounces)
    return orbits["s"].values, orbits["p"].values
