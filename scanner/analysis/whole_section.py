"""The whole section of a table from the part of it that was sampled."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np
import xarray as xr

from scanner.analysis.sweep import swept_parameters
from scanner.errors import ScannerError
from scanner.quantities import ORBITS, PENDING


def whole_section(tree: xr.DataTree) -> xr.Dataset:
    """Orbits of one table with all their images under time reversal and the table's symmetry.

    A sweep samples the part of the section that its images make whole.  Fractions and means over all orbits need no
    images; pictures of the section and averages at given s or p do.

    Parameters
    ----------
    tree
        A sweep of which one table is left, as by ``tree.sel(amplitude=0.05, method="nearest")``.

    Returns
    -------
    Dataset
        As from `orbit_images`.

    Raises
    ------
    ScannerError
        Several tables are left.
    """
    names = swept_parameters(tree)
    if names:
        raise ScannerError(f"a section is that of one table: select a value of {', '.join(names)} first")
    if "symmetry_order" not in tree:  # of a version that sampled all of the section
        return tree[ORBITS].to_dataset()
    order = float(tree["symmetry_order"].item())
    # A table without numbers has no orbits that need images.
    return orbit_images(tree[ORBITS].to_dataset(), int(order) if order > 0 else 1, float(tree["mirror_s"].item()))


def orbit_images(orbits: xr.Dataset, symmetry_order: int, mirror_s: float = math.nan) -> xr.Dataset:
    """Orbits of one table with all their images.

    Parameters
    ----------
    orbits
        Variables of the group ``orbits`` of one table.
    symmetry_order, mirror_s
        Its root variables of these names; without a mirror line the latter is NaN.

    Returns
    -------
    Dataset
        The same variables along a dimension ``orbit`` that is 2 ``symmetry_order`` times as long, or twice that with
        mirrors; ``image_of`` is the number of the orbit that each is an image of, themselves first.  Orbits that were
        not followed are left out.
    """
    followed = np.flatnonzero(orbits["verdict"].values != PENDING)
    images = list(_images(orbits.isel(orbit=followed).load(), symmetry_order, mirror_s))
    whole = xr.concat(images, "orbit", data_vars="minimal", coords="minimal")
    return whole.assign_coords(
        orbit=np.arange(whole.sizes["orbit"]), image_of=("orbit", np.tile(followed, len(images)))
    )


def _images(orbits: xr.Dataset, order: int, mirror: float) -> Iterator[xr.Dataset]:
    """Every image of all orbits, the orbits themselves first."""
    for number in range(order):
        for reflected in (False, True) if math.isfinite(mirror) else (False,):
            place = _moved(orbits, number / order, mirror if reflected else None)
            yield place
            yield _reversed(place)


def _moved(orbits: xr.Dataset, turn: float, mirror: float | None) -> xr.Dataset:
    """Images elsewhere on the boundary with the same p: turned, or run backwards, seen in the mirror and turned."""
    moved = {}
    for name in {"s0", "island_centre_s"} & set(orbits.data_vars):
        s = orbits[name] if mirror is None else 2.0 * mirror - orbits[name]
        moved[name] = ((s + turn) % 1.0).assign_attrs(orbits[name].attrs)
    return orbits.assign(moved)


def _reversed(orbits: xr.Dataset) -> xr.Dataset:
    """The orbits run backwards, from the same places."""
    found = {}
    for name in {"p0", "island_centre_p"} & set(orbits.data_vars):
        found[name] = -orbits[name]
    if "rotation_number" in orbits:
        found["rotation_number"] = 1.0 - orbits["rotation_number"]
    if "island_rotation" in orbits:
        found["island_rotation"] = orbits["island_period"] - orbits["island_rotation"]
    return orbits.assign({name: values.assign_attrs(orbits[name].attrs) for name, values in found.items()})
