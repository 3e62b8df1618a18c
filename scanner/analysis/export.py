"""A sweep in other people's formats: netCDF-4 whole, csv and parquet as rows of tables, of orbits or of resonances."""

from __future__ import annotations

import importlib.util
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import xarray as xr

from scanner.analysis.files import check_target, replace_whole
from scanner.analysis.rows import blocks, stored_steps, to_rows
from scanner.analysis.sweep import require_resonances, swept_parameters
from scanner.errors import ScannerError
from scanner.quantities import DONE, ORBITS, PENDING, RESONANCES, ROOT, TABLE_STATUS, VERDICTS, in_group

SUFFIXES = (".nc", ".csv", ".parquet")
ROW_DIMS = {ORBITS: "orbit", RESONANCES: "resonance"}
"""Dimension of each group along which it has rows of its own."""
ROW_NAMES: dict[str, list[str]] = {ORBITS: [], RESONANCES: ["rotation", "resonance_period"]}
"""Coordinates that name those rows where their number does not."""


def export_sweep(tree: xr.DataTree, target: Path, *, rows: str = ROOT, force: bool = False) -> None:
    """Write a sweep to a file of another format, whole or not at all.

    Parameters
    ----------
    tree
        A sweep.
    target
        File to write: ``.nc`` is the whole sweep as netCDF-4 with all groups; ``.csv`` and ``.parquet`` are rows with
        codes as words.
    rows
        Group whose rows are written: ``root`` for one row a table, with the fate of its curves if there are
        resonances; ``orbits`` and ``resonances`` for one row each of the tables that are done, and
        of the orbits that were followed.
    force
        Replace a file that exists.

    Raises
    ------
    ScannerError
        The file cannot or must not be written, the sweep has no resonances, or pyarrow is not installed.
    """
    if rows == RESONANCES:
        require_resonances(tree)
    check_target(target, SUFFIXES, force=force)
    suffix = target.suffix.lower()
    if suffix == ".parquet" and importlib.util.find_spec("pyarrow") is None:
        raise ScannerError(f"{target}: parquet needs pyarrow, install it with: pip install 'scanner[parquet]'")
    with replace_whole(target) as partial:
        if suffix == ".nc":
            _write_netcdf(tree, partial)
        elif suffix == ".csv":
            _write_csv(_frames(tree, rows), partial)
        else:
            _write_parquet(_frames(tree, rows), partial)


def _frames(tree: xr.DataTree, group: str) -> Iterator[pd.DataFrame]:
    """Rows of one group, in blocks of bounded size."""
    names = swept_parameters(tree)
    root = _in_order(tree.to_dataset(), ROOT)
    if group == ROOT:
        whole = root.assign(_of_whole_tables(tree))
        yield from (to_rows(block, names) for block in blocks(whole, names))
        return
    dim, named_by = ROW_DIMS[group], ROW_NAMES[group]
    data = _in_order(tree[group].to_dataset(), group)
    own = [name for name, variable in data.data_vars.items() if dim in variable.dims]
    rows = data.reset_coords(named_by)[[*named_by, *own]].assign(table_status=root["table_status"].drop_encoding())
    left_out = ["table_status", *([dim] if named_by else [])]
    for block in blocks(rows, [*names, dim]):
        frame = to_rows(block, [*names, dim])
        wanted = frame["table_status"] == TABLE_STATUS[DONE]
        if group == ORBITS:
            wanted &= frame["verdict"] != VERDICTS[PENDING]
        yield frame[wanted].drop(columns=left_out)


def _of_whole_tables(tree: xr.DataTree) -> dict[str, xr.DataArray]:
    """Numbers of the group of resonances that are no resonance's own: those of the curves between them."""
    if RESONANCES not in tree.children:
        return {}
    curves = _in_order(tree[RESONANCES].to_dataset(), RESONANCES)
    return {str(name): found for name, found in curves.data_vars.items() if ROW_DIMS[RESONANCES] not in found.dims}


def _in_order(data: xr.Dataset, group: str) -> xr.Dataset:
    """Put the variables in the order of the register, others last; a store lists them as its disk does."""
    known = [quantity.name for quantity in in_group(group) if quantity.name in data]
    return data[[*known, *sorted(str(name) for name in data.data_vars if name not in known)]]


def _write_csv(frames: Iterator[pd.DataFrame], path: Path) -> None:
    for number, frame in enumerate(frames):
        frame.to_csv(path, mode="a" if number else "w", header=number == 0, index=False, encoding="utf-8")


def _write_parquet(frames: Iterator[pd.DataFrame], path: Path) -> None:
    import pyarrow as pa
    import pyarrow.parquet as pq

    first = pa.Table.from_pandas(next(frames), preserve_index=False)
    with pq.ParquetWriter(path, first.schema) as writer:
        writer.write_table(first)
        for frame in frames:
            writer.write_table(pa.Table.from_pandas(frame, schema=first.schema, preserve_index=False))


def _write_netcdf(tree: xr.DataTree, path: Path) -> None:
    """Write all groups a stored block at a time, in this thread: HDF5 takes one writer."""
    groups, encoding = {}, {}
    for node in tree.subtree:
        data = node.to_dataset(inherit=False)
        steps = stored_steps(data)
        groups[node.path] = _plain_dataset(data).chunk(steps)
        encoding[node.path] = {
            name: {"zlib": True, "complevel": 1, "chunksizes": tuple(steps[str(dim)] for dim in variable.dims)}
            for name, variable in data.data_vars.items()
            if variable.ndim
        }
    plain = xr.DataTree.from_dict(groups)
    writing: Any = plain.to_netcdf(path, engine="h5netcdf", encoding=encoding, compute=False)
    writing.compute(scheduler="synchronous")


def _plain_dataset(data: xr.Dataset) -> xr.Dataset:
    """Copy the data with attributes that netCDF can hold, and without the encoding of where it came from."""
    plain = data.copy()
    plain.attrs = _plain_attributes(data.attrs)
    for name, variable in data.variables.items():
        plain[name].attrs = _plain_attributes(variable.attrs)
        if "flag_values" in variable.attrs:
            plain[name].attrs["flag_values"] = np.asarray(variable.attrs["flag_values"], dtype=variable.dtype)
    return plain.drop_encoding()


def _plain_attributes(attributes: dict[str, object]) -> dict[str, object]:
    """Numbers, arrays of numbers and texts stay; the rest becomes text, and what is empty goes."""
    found: dict[str, object] = {}
    for name, value in attributes.items():
        if value is None:
            continue
        array = np.asarray(value) if isinstance(value, int | float | list | tuple | np.ndarray) else None
        if array is not None and array.dtype.kind in "iuf" and array.size:
            found[str(name)] = value
        else:
            found[str(name)] = value if isinstance(value, str) else str(value)
    return found
