"""Numbers with the names, dimensions and attributes that the register gives them."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from scanner.quantities import COORDINATES, Quantity, in_group

if TYPE_CHECKING:
    import xarray as xr


def label(group: str, values: Mapping[str, npt.ArrayLike], coords: Mapping[str, Any]) -> xr.Dataset:
    """Dataset of the variables of one group of the register that are in ``values``.

    Parameters
    ----------
    group
        A group of the store, like ``quantities.ROOT``.
    values
        Name to array, with the dimensions of the register's entry.
    coords
        Name of a dimension to its values, or of another coordinate to its dimension and values.
    """
    import xarray as xr

    def variable(entry: Quantity) -> tuple[tuple[str, ...], npt.NDArray[np.generic], dict[str, object]]:
        attributes = entry.attributes()
        if entry.flags:  # CF wants them in the type of the codes
            attributes["flag_values"] = np.asarray(attributes["flag_values"], dtype=entry.dtype)
        return entry.dims, np.asarray(values[entry.name], dtype=entry.dtype), attributes

    found = {entry.name: variable(entry) for entry in in_group(group) if entry.name in values}
    labelled = xr.Dataset(found, coords=dict(coords))
    for name, coordinate in labelled.coords.items():
        units = {"units": "1"} if coordinate.dtype.kind in "if" else {}
        coordinate.attrs = {"long_name": COORDINATES[str(name)], **units}
    return labelled
