"""What a sweep is about: its swept parameters, the study behind it, picking tables and averaging over them."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
import xarray as xr

from scanner.errors import ScannerError
from scanner.quantities import DONE, RESONANCES


@dataclass(frozen=True)
class StudyFacts:
    """The parts of a study that a reader of its results wants to see; empty or None where the store does not say.

    ``orbits`` is what a table gets, "256 to 4096" where that depends on the table.
    """

    title: str = ""
    family: str = ""
    fixed: Mapping[str, float | str] = field(default_factory=dict)
    bounces: int | None = None
    orbits: str = ""


def study_of(tree: xr.DataTree | xr.Dataset) -> StudyFacts:
    """Read the study that a sweep answers from its root attributes."""
    try:
        entries = tomllib.loads(str(tree.attrs.get("study", "")))
    except tomllib.TOMLDecodeError:
        return StudyFacts()
    table, orbits = entries.get("table", {}), entries.get("orbits", {})
    return StudyFacts(
        title=str(entries.get("study", {}).get("title", "")),
        family=str(table.get("family", "")),
        fixed={name: value for name, value in table.items() if name != "family" and not isinstance(value, dict)},
        bounces=orbits.get("bounces"),
        orbits=" to ".join(str(orbits[key]) for key in ("per_table", "most_per_table") if key in orbits),
    )


def swept_parameters(sweep: xr.DataTree | xr.Dataset) -> tuple[str, ...]:
    """Names of the swept parameters, in the study's order."""
    return tuple(str(name) for name in sweep["table_status"].dims)


def pick_tables(tree: xr.DataTree, wanted: Mapping[str, float | str]) -> tuple[xr.DataTree, dict[str, float]]:
    """Hold swept parameters at their stored values nearest to the wanted ones.

    Parameters
    ----------
    tree
        A sweep.
    wanted
        Value by name of swept parameter, as a number or its text.

    Returns
    -------
    tree
        The sweep without the dimensions that are now held.
    taken
        The stored values that were taken.

    Raises
    ------
    ScannerError
        The name is not swept, or the value is not a number.
    """
    positions: dict[str, int] = {}
    taken: dict[str, float] = {}
    for name, value in wanted.items():
        require_swept(tree, name)
        stored = tree.coords[name].values
        positions[name] = _nearest(name, stored, value)
        taken[name] = stored[positions[name]].item()
    return tree.isel(positions), taken


def require_swept(sweep: xr.DataTree | xr.Dataset, name: str) -> None:
    """Refuse a name that is not a swept parameter of this sweep."""
    names = swept_parameters(sweep)
    if name not in names:
        known = f"it sweeps {', '.join(names)}" if names else "it holds a single table"
        raise ScannerError(f"{name!r} is not a swept parameter of this study: {known}")


def require_resonances(sweep: xr.DataTree) -> None:
    """Refuse a sweep whose study did not ask for periodic orbits."""
    if RESONANCES not in sweep.children:
        raise ScannerError(
            "this store has no resonances: put [resonances] with period_max = 8 in the study file and sweep it again"
        )


def _nearest(name: str, stored: np.ndarray, value: float | str) -> int:
    try:
        number = float(value)
    except ValueError:
        number = np.nan
    if not np.isfinite(number):
        raise ScannerError(f"{name} = {value!r} is not a number: give one, for example {name}={stored[0]}")
    return int(np.abs(stored - number).argmin())


def average_tables(root: xr.Dataset, names: Sequence[str]) -> xr.Dataset:
    """Average the root variables over swept parameters, as over the realisations of a random family.

    Only tables that are done count.  Each ``_stderr`` becomes the standard error of that mean from the scatter
    between the tables, which holds the sampling error too; with fewer than two tables it is NaN.

    Parameters
    ----------
    root
        Root variables of a sweep.
    names
        Swept parameters to average over.

    Returns
    -------
    Dataset
        The root variables without these dimensions, and ``tables_averaged``, how many tables are done: a number that
        some of them lack, as without chaos an exponent, is averaged over fewer.  What describes a symmetry is left out.

    Raises
    ------
    ScannerError
        A name is not swept.
    """
    for name in names:
        require_swept(root, name)
    if not names:
        return root
    done = root["table_status"] == DONE
    count = done.sum(names).drop_attrs()
    averaged: dict[str, xr.DataArray] = {}
    for key, variable in root.data_vars.items():
        if not set(names) & set(variable.dims) or key in ("table_status", "symmetry_order", "mirror_s"):
            continue
        finite = variable.where(done)
        source = str(key).removesuffix("_stderr")
        if str(key).endswith("_stderr") and source in root:
            scattered = root[source].where(done)
            several = scattered.count(names)
            averaged[str(key)] = scattered.std(names, ddof=1).where(several > 1) / np.sqrt(several.clip(1))
        else:
            averaged[str(key)] = finite.mean(names)
        averaged[str(key)].attrs = dict(variable.attrs)
    status = root["table_status"].max(names).where(count == 0, DONE).astype(root["table_status"].dtype)
    status.attrs = dict(root["table_status"].attrs)
    kept = root.drop_vars([name for name in [*root.data_vars, *names] if name in root.variables])
    return kept.assign({"table_status": status, **averaged, "tables_averaged": count})
