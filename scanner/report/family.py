"""What was swept: the family's curve, its parameters and the sampling, in words."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import xarray as xr

from scanner.analysis import study_of, swept_parameters
from scanner.tables.families import FAMILIES


@dataclass(frozen=True)
class ParameterFacts:
    """One parameter of the family: its values in words, and what it means."""

    name: str
    values: str
    meaning: str


@dataclass(frozen=True)
class FamilyFacts:
    """The family as a reader sees it."""

    name: str
    formula: str
    parameters: tuple[ParameterFacts, ...]


def describe_family(tree: xr.DataTree, root: xr.Dataset) -> FamilyFacts:
    """Describe the family of a sweep.

    Parameters
    ----------
    tree
        The whole sweep.
    root
        Its tables that are reported, some parameters perhaps held.
    """
    study = study_of(tree)
    known = FAMILIES.get(study.family)
    meanings = {parameter.name: parameter.meaning for parameter in known.parameters} if known else {}
    found = [ParameterFacts(name, f"{value}", meanings.get(name, "")) for name, value in study.fixed.items()]
    for name in swept_parameters(tree):
        values = np.atleast_1d(root[name].values)
        found.append(ParameterFacts(name, _range_of(values), meanings.get(name, "")))
    formula = known.formula if known else "the user's own function, module:function"
    return FamilyFacts(study.family, formula, tuple(found))


def _range_of(values: np.ndarray) -> str:
    """Write few values one by one, many as their ends and count."""
    if len(values) <= 6:
        return ", ".join(f"{value:.6g}" for value in values)
    return f"{values[0]:.6g} to {values[-1]:.6g}, {len(values)} values"
