"""Reading a store."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from scanner.errors import StoreError
from scanner.store.metadata import damaged_metadata

if TYPE_CHECKING:
    import xarray as xr


def open_sweep(path: str | Path) -> xr.DataTree:
    """Open a store as labelled data, finished or not; values are read when they are used.

    Parameters
    ----------
    path
        The folder of the store.

    Returns
    -------
    DataTree
        One value a table at the root, one value an orbit in the group ``orbits``; swept parameters are dimensions.
        A table that is not done is NaN, and ``table_status`` says why.

    Raises
    ------
    StoreError
        The path is missing or not a store of this tool, or its metadata is damaged.
    """
    import xarray as xr  # here, as it would be a fifth of a worker's memory, and workers do not read this way

    # Looked at beforehand: of damaged metadata the libraries complain at length.
    for name, kind in damaged_metadata(Path(path)):
        raise StoreError(f"{path}: damaged, {name} is {kind}; the same `scanner sweep` writes it again")
    return xr.open_datatree(path, engine="zarr", consolidated=False)
