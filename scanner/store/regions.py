"""What workers do with a store: write the region of one task, read orbits back."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from functools import lru_cache
from itertools import product
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import zarr

from scanner.quantities import ORBITS, REGISTER, ROOT, in_group
from scanner.store.durable import Seal, settle
from scanner.study import Task
from scanner.study.layout import ceil_divide

Arrays = Mapping[str, npt.NDArray[np.generic]]


class Regions:
    """All arrays of one store, kept open.

    Parameters
    ----------
    store
        A store made for the plan whose tasks are passed.
    """

    def __init__(self, store: Path) -> None:
        self._store = store
        root = zarr.open_group(store, mode="r+", use_consolidated=False)
        self._arrays: dict[tuple[str, str], zarr.Array[Any]] = {}
        for group, name in REGISTER:
            if group != ROOT and group not in root:
                continue
            array = root[name if group == ROOT else f"{group}/{name}"]
            assert isinstance(array, zarr.Array)
            # Chunks full of fill value are written too: each finished block then has all its files.
            self._arrays[group, name] = array.with_config({"write_empty_chunks": True})

    def write(self, task: Task, groups: Mapping[str, Arrays]) -> dict[str, Seal]:
        """Write what a task computed and wait until it is on the disk.

        Parameters
        ----------
        task
            Its region is exactly one chunk of every array.
        groups
            Group to name to values; all variables of the groups the task writes.

        Returns
        -------
        dict
            Name of every file written, with its seal.
        """
        files: list[Path] = []
        for group in task.groups:
            for quantity in in_group(group):
                array = self._arrays[group, quantity.name]
                region = task.region(quantity)
                array[region] = groups[group][quantity.name]
                files.append(self._store / array.path / chunk_name(region, array.chunks, array.shape))
        settle(files)
        return {str(file.relative_to(self._store)): Seal.of(file.read_bytes()) for file in files}

    def read(self, task: Task) -> dict[str, dict[str, npt.NDArray[np.generic]]]:
        """Read what a task has written: group to name to values."""
        return {
            group: {
                entry.name: np.asarray(self._arrays[group, entry.name][task.region(entry)]) for entry in in_group(group)
            }
            for group in task.groups
        }

    def files_of(self, task: Task) -> Iterator[str]:
        """Name the files, chunks or shards of chunks, that hold what a task has written."""
        for group in task.groups:
            for entry in in_group(group):
                array = self._arrays[group, entry.name]
                steps = array.shards or array.chunks
                spans = [part.indices(size) for part, size in zip(task.region(entry), array.shape, strict=True)]
                places = [
                    range(start // step, ceil_divide(stop, step))
                    for (start, stop, _), step in zip(spans, steps, strict=True)
                ]
                yield from (f"{array.path}/{'.'.join(['c', *map(str, place)])}" for place in product(*places))

    def read_orbits(self, task: Task) -> dict[str, npt.NDArray[np.generic]]:
        """Read all variables of the group ``orbits`` for the tables and orbits of a task."""
        return {
            quantity.name: np.asarray(self._arrays[ORBITS, quantity.name][task.region(quantity)])
            for quantity in in_group(ORBITS)
        }


@lru_cache(maxsize=4)
def open_regions(store: Path, fingerprint: str) -> Regions:
    """Open the arrays of a store once a process; the fingerprint tells stores apart that take turns at one path."""
    return Regions(store)


def chunk_name(region: tuple[slice, ...], chunks: tuple[int, ...], shape: tuple[int, ...]) -> str:
    """Name the file of the one chunk that is exactly this region.

    Raises
    ------
    ValueError
        The region is not exactly one chunk: another task would then write to the same file and one of them be lost.
    """
    place = []
    for part, chunk, size in zip(region, chunks, shape, strict=True):
        start, stop, _ = part.indices(size)
        if start % chunk or stop != min(start + chunk, size):
            raise ValueError(f"region {region} is not one chunk of {chunks} in an array of shape {shape}")
        place.append(start // chunk)
    return ".".join(["c", *map(str, place)])
