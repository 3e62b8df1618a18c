"""Sentences and tables about a sweep and about one of its tables."""

from __future__ import annotations

import time

import numpy as np
import xarray as xr

from scanner.atlas.watch import Snapshot
from scanner.atlas.words import name_of, plain, with_units, write_number
from scanner.cards import describe
from scanner.quantities import ROOT, in_group


def say_study(snapshot: Snapshot) -> str:
    """Say what was swept: the family, what is fixed, how many orbits of how many bounces."""
    study = snapshot.study
    parts = [plain(study.family) if ":" not in study.family else study.family, describe(study.fixed)]
    if study.orbits and study.bounces:
        parts.append(f"{study.orbits} orbits of {study.bounces} bounces a table")
    return "; ".join(part for part in parts if part)


def say_activity(snapshot: Snapshot) -> str:
    """Say how far the sweep is."""
    state = snapshot.progress
    found = f"{state.done} of {state.tables} tables done"
    others = [
        f"{count} {word}" for count, word in ((state.not_convex, "not convex"), (state.failed, "failed")) if count
    ]
    found = ", ".join([found, *others])
    if state.complete:
        return found
    seen = time.strftime("%H:%M:%S", time.localtime(snapshot.taken))
    activity = "being written" if state.running else "not finished and nobody is writing it"
    return f"{found}; {activity}, as of {seen}"


def table_facts(root: xr.Dataset) -> list[tuple[str, str, str]]:
    """Name, meaning and value with its error of every number of one table.

    Parameters
    ----------
    root
        Root variables of the one table that is left.
    """
    found = []
    for name in _in_order(root):
        variable = root[name]
        error = root[f"{name}_stderr"].item() if f"{name}_stderr" in root else np.nan
        found.append((with_units(variable), name_of(variable), write_number(float(variable.item()), float(error))))
    return found


def _in_order(root: xr.Dataset) -> list[str]:
    """Names of the single numbers, in the order of the register; errors stand with what they belong to."""
    single = [
        str(name)
        for name, variable in root.data_vars.items()
        if not variable.ndim and name != "table_status" and not str(name).endswith("_stderr")
    ]
    order = [quantity.name for quantity in in_group(ROOT)]
    return sorted(single, key=lambda name: order.index(name) if name in order else len(order))
