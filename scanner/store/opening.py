"""Reading a store."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from scanner.store.ledger import Ledger

if TYPE_CHECKING:
    import xarray as xr


def enclosing_store(place: Path) -> Path | None:
    """Find the store, of this tool or another zarr hierarchy, that a place is in or is itself."""
    here = place.absolute()
    return next((folder for folder in (here, *here.parents) if (folder / "zarr.json").exists()), None)


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
        The path is missing or not a store of this tool.
    """
    import xarray as xr  # here, as it would be a fifth of a worker's memory, and workers do not read this way

    Ledger(Path(path)).charter()
    return xr.open_datatree(path, engine="zarr", consolidated=False)
