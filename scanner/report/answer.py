"""The question, and the answer in short: where tables are most and least regular, and where they are half so."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import xarray as xr

from scanner.analysis import swept_parameters
from scanner.analysis.wording import uncertain
from scanner.cards import describe
from scanner.quantities import DONE

HALF = 0.5
QUESTION = "How much of phase space is regular in these tables, and how strongly chaotic is the rest?"


def question_of(tree: xr.DataTree) -> str:
    """Return the question that the study asks: the first paragraph of comment at its head, or what all studies ask."""
    lines: list[str] = []
    for line in str(tree.attrs.get("study", "")).strip().splitlines():
        text = line.removeprefix("#").strip()
        if not line.startswith("#") or not text:
            break
        lines.append(text)
    return " ".join(lines) or QUESTION


def describe_answer(root: xr.Dataset) -> list[str]:
    """Say in a few sentences what was found, each number with its error; none where no table is done."""
    done = root["table_status"].values == DONE
    if not done.any():
        return []
    names = swept_parameters(root)
    if not names:
        return [
            f"The regular part of the section is {_fraction(root, 'area', ())}, that of the energy shell "
            f"{_fraction(root, 'volume', ())}."
        ]
    area = np.where(done, root["regular_area_fraction"].values, np.nan)
    most, least = (np.unravel_index(choose(area), area.shape) for choose in (np.nanargmax, np.nanargmin))
    found = [
        f"The regular part of the section is between {_fraction(root, 'area', least)} at {place_of(root, least)} and "
        f"{_fraction(root, 'area', most)} at {place_of(root, most)}; at these tables that of the energy shell is "
        f"{_fraction(root, 'volume', least)} and {_fraction(root, 'volume', most)}."
    ]
    if len(names) == 1:
        found += _crossings(root, names[0], area)
    return found


def place_of(root: xr.Dataset, place: Sequence[int | np.intp]) -> str:
    """Write the parameters of one table, given its place in the grid."""
    names = swept_parameters(root)
    return describe({name: root[name].values[at].item() for name, at in zip(names, place, strict=True)})


def _fraction(root: xr.Dataset, part: str, place: Sequence[int | np.intp]) -> str:
    name = f"regular_{part}_fraction"
    return uncertain(float(root[name].values[tuple(place)]), float(root[f"{name}_stderr"].values[tuple(place)]))


def _crossings(root: xr.Dataset, name: str, area: np.ndarray) -> list[str]:
    """Say between which stored tables half the section is regular."""
    values = root[name].values
    above = area > HALF
    known = np.isfinite(area[:-1]) & np.isfinite(area[1:])
    places = np.flatnonzero(known & (above[:-1] != above[1:]))
    if not len(places):
        return []
    spans = ", ".join(f"{values[at]:.6g} and {values[at + 1]:.6g}" for at in places[:3])
    return [f"Half of the section is regular between {name} = {spans}."]
