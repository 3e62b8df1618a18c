"""Labelled arrays as rows: one row a table or an orbit, codes as words, further dimensions as further columns."""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator, Mapping, Sequence

import numpy as np
import pandas as pd
import xarray as xr


def to_rows(data: xr.Dataset, dims: Sequence[str]) -> pd.DataFrame:
    """Turn a dataset into rows.

    Parameters
    ----------
    data
        Variables over `dims` and, some of them, over further dimensions.
    dims
        Dimensions whose combinations are the rows, the last one running fastest; none makes a single row.

    Returns
    -------
    DataFrame
        A column for each of `dims`, then one for each variable; a variable with a further dimension gives a column
        for each of its values, named ``variable_value``.  Codes are written as their meanings.
    """
    labels = np.meshgrid(*(_labels(data, name) for name in dims), indexing="ij")
    columns: dict[str, np.ndarray] = {name: grid.ravel() for name, grid in zip(dims, labels, strict=True)}
    rows = math.prod(data.sizes[name] for name in dims)
    for name, variable in data.data_vars.items():
        further = [str(dim) for dim in variable.dims if dim not in dims]
        places = itertools.product(*(_labels(data, dim) for dim in further))
        suffixes = ["".join(f"_{_short(label)}" for label in place) for place in places]
        full = variable.variable.set_dims({dim: data.sizes[dim] for dim in (*dims, *further)})  # type: ignore[no-untyped-call]
        values = _words(full.values.reshape(rows, len(suffixes)), variable.attrs)
        columns.update({f"{name}{suffix}": values[:, place] for place, suffix in enumerate(suffixes)})
    return pd.DataFrame(columns)


def blocks(data: xr.Dataset, dims: Sequence[str]) -> Iterator[xr.Dataset]:
    """Cut a dataset along `dims` into the blocks it is stored in, so that each chunk is read once and little is held.

    The order of the blocks is that of the rows, because a stored block spans whole trailing dimensions.
    """
    steps = stored_steps(data)
    cuts = [
        [slice(start, min(start + steps[name], data.sizes[name])) for start in range(0, data.sizes[name], steps[name])]
        for name in dims
    ]
    for pieces in itertools.product(*cuts):
        yield data.isel(dict(zip(dims, pieces, strict=True)))


def stored_steps(data: xr.Dataset) -> dict[str, int]:
    """Length along each dimension of the blocks a dataset is stored in; all of it where it is in memory."""
    steps = {str(name): max(length, 1) for name, length in data.sizes.items()}
    for variable in data.data_vars.values():
        for name, step in variable.encoding.get("preferred_chunks", {}).items():
            steps[name] = min(step, data.sizes[name])
    return steps


def _labels(data: xr.Dataset, name: str) -> np.ndarray:
    found: np.ndarray = data[name].values if name in data.coords else np.arange(data.sizes[name])
    return found


def _short(label: object) -> str:
    return label if isinstance(label, str) else f"{label:.6g}"


def _words(values: np.ndarray, attributes: Mapping[str, object]) -> np.ndarray:
    """Replace codes by their meanings; other values stay."""
    meanings = str(attributes.get("flag_meanings", "")).split()
    return np.array(meanings, dtype=object)[values] if meanings else values
