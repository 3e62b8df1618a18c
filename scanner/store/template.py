"""The empty store of a study: all metadata and coordinates, no results; workers then fill disjoint regions of it."""

from __future__ import annotations

import os
import platform
import shutil
import socket
import sys
import warnings
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from datetime import UTC, datetime
from importlib.metadata import version
from pathlib import Path
from typing import Any, NamedTuple
from uuid import uuid4

import numpy as np
import zarr
from zarr.codecs import ZstdCodec

from scanner.errors import StoreError
from scanner.quantities import CURVES, DIRECTIONS, ORBITS, P_BINS, PERIODS, RESONANCES, ROOT
from scanner.store.durable import Seal, settle
from scanner.store.ledger import Charter, Ledger
from scanner.study import Plan
from scanner.tables import FAMILIES

ROOT_METADATA = "zarr.json"
"""The one file of a store that differs between two runs of a study, beside the ledger: it holds times and host."""


def prepare_store(path: Path, plan: Plan) -> None:
    """Make the store of a plan, or see that the one there is of the same study and mend its metadata.

    Raises
    ------
    StoreError
        The path holds something else, or cannot be written; nothing is changed then.
    """
    if is_vacant(path):
        try:
            with _template(path, plan) as template:
                template.rename(path)
            settle([path])
            return
        except OSError as error:
            if not path.exists():
                raise StoreError(f"{path}: cannot be made ({error}); give a place that can be written") from None
    check_fingerprint(path, plan)
    _restore_template(path, plan)


def is_vacant(path: Path) -> bool:
    """Whether nothing is at a path, or an empty folder."""
    return not path.exists() or (path.is_dir() and not any(path.iterdir()))


def check_fingerprint(path: Path, plan: Plan) -> None:
    """See that a store was made for this plan.

    Raises
    ------
    StoreError
        It is not a store, or one of another study.
    """
    found = Ledger(path).charter().fingerprint
    wanted = plan.study.fingerprint
    if found != wanted:
        raise StoreError(
            f"{path}: holds another study (fingerprint {found[:12]}, this one {wanted[:12]}); "
            "give another --store, or the study file it was made from"
        )


def note_finish(path: Path, finished: bool) -> None:
    """Set or remove the time of completion among the root's attributes; once set it stays."""
    root = zarr.open_group(path, mode="r+")
    if finished and "finished" not in root.attrs:
        root.attrs["finished"] = _now()
    elif not finished and "finished" in root.attrs:
        del root.attrs["finished"]


def _restore_template(path: Path, plan: Plan) -> None:
    """Write missing metadata and coordinates again; they follow from the study."""
    missing = [name for name in Ledger(path).charter().template if not (path / name).exists()]
    if not (path / ROOT_METADATA).exists():
        missing.append(ROOT_METADATA)
    if not missing:
        return
    with _template(path, plan) as template:
        for name in missing:
            (path / name).parent.mkdir(parents=True, exist_ok=True)
            (template / name).replace(path / name)
    settle(path / name for name in missing)


@contextmanager
def _template(path: Path, plan: Plan) -> Iterator[Path]:
    """Build the empty store beside its place, whole and on the disk."""
    path.parent.mkdir(parents=True, exist_ok=True)
    folder = path.with_name(f".{path.name}.{uuid4().hex}.partial")
    try:
        _write_arrays(folder, plan)
        files = sorted(file for file in folder.rglob("*") if file.is_file())
        seals = {str(file.relative_to(folder)): Seal.of(file.read_bytes()) for file in files}
        del seals[ROOT_METADATA]
        study = plan.study
        Ledger(folder).found(
            Charter(
                fingerprint=study.fingerprint,
                study=study.text,
                tasks=len(plan.tasks),
                tables=plan.table_count,
                orbits=study.orbits.per_table,
                bounces=study.orbits.bounces,
                template=seals,
            )
        )
        settle(files)
        yield folder
    finally:
        shutil.rmtree(folder, ignore_errors=True)


def _write_arrays(folder: Path, plan: Plan) -> None:
    root = zarr.create_group(folder, zarr_format=3, attributes=_root_attributes(plan))
    groups = {ROOT: root, ORBITS: root.create_group(ORBITS)}
    if plan.rotations:
        # Without this attribute readers take what has not the name of a dimension for a variable.
        names = " ".join(found.name for found in _coordinates(plan) if found.dim == "resonance")
        groups[RESONANCES] = root.create_group(RESONANCES, attributes={"coordinates": names})
    for quantity in plan.quantities:
        _create_array(
            groups[quantity.group],
            quantity.name,
            plan.array_dims(quantity),
            plan.array_shape(quantity),
            plan.chunk_shape(quantity),
            np.dtype(quantity.dtype),
            quantity.fill_value,
            quantity.attributes(),
        )
    for group, dim, name, values, meaning in _coordinates(plan):
        attributes: dict[str, Any] = {"long_name": meaning, "units": "1"}
        fill: float | str = np.nan
        if values.dtype.kind == "i":
            fill = 0
        elif values.dtype.kind == "T":
            # The only kind of text that the format specifies: others give a warning.
            fill = ""
            del attributes["units"]
        shape = values.shape
        array = _create_array(groups[group], name, (dim,), shape, shape, values.dtype, fill, attributes)
        array[:] = values
    with warnings.catch_warnings():
        # Not yet in the specification, as zarr warns; without it plain xarray warns at every opening instead.
        warnings.filterwarnings("ignore", "Consolidated metadata", category=UserWarning)
        zarr.consolidate_metadata(folder)


def _create_array(
    group: zarr.Group,
    name: str,
    dims: tuple[str, ...],
    shape: tuple[int, ...],
    chunks: tuple[int, ...],
    dtype: np.dtype[np.generic],
    fill_value: float | int | str,
    attributes: dict[str, Any],
) -> zarr.Array[Any]:
    return group.create_array(
        name,
        shape=shape,
        chunks=chunks,
        dtype=dtype,
        fill_value=fill_value,
        dimension_names=dims,
        attributes=attributes,
        # The checksum lets every reader notice a flipped byte; "." keeps all chunks of an array in one folder.
        compressors=ZstdCodec(level=3, checksum=True),
        chunk_key_encoding={"name": "default", "separator": "."},
        config={"write_empty_chunks": True},
    )


class Coordinate(NamedTuple):
    """One coordinate: the group it is in, its dimension, its name, values and meaning."""

    group: str
    dim: str
    name: str
    values: np.ndarray[tuple[int], np.dtype[np.generic]]
    meaning: str


def _coordinates(plan: Plan) -> Iterable[Coordinate]:
    """All coordinates."""
    family = FAMILIES.get(plan.study.family)
    meanings = {parameter.name: parameter.meaning for parameter in family.parameters} if family else {}
    for name, values in plan.study.swept.items():
        yield Coordinate(ROOT, name, name, np.array(values), meanings.get(name, name))
    sizes = plan.sizes
    for name, numbers, meaning in (
        ("replicate", np.arange(sizes["replicate"]), "independent scrambling of the initial conditions"),
        ("horizon", np.array(plan.horizons), "bounces after which the verdict is given"),
        ("p_bin", (2 * np.arange(P_BINS) + 1) / P_BINS - 1, "centre of the bin of p"),
        ("period", np.array(PERIODS), "period q of the island"),
        ("direction", np.array(DIRECTIONS, np.dtypes.StringDType()), "along the boundary, p > 0, or against it"),
    ):
        yield Coordinate(ROOT, name, name, numbers, meaning)
    number = np.arange(sizes["orbit"])
    yield Coordinate(ORBITS, "orbit", "orbit", number, "number of the orbit, replicate after replicate")
    if plan.rotations:
        # Not "period": the root has a dimension of that name, whose index every group inherits, over 63 values instead
        # of these.  Plain xarray opens such a store, but then isel() of the group and the tree's HTML view fail, as the
        # index has lost its coordinate; with an index of its own the group cannot be part of the tree at all.
        p, q = np.array(plan.rotations).T
        yield Coordinate(RESONANCES, "resonance", "rotation", p, "rounds p of the orbits with rotation p/q")
        yield Coordinate(RESONANCES, "resonance", "resonance_period", q, "bounces q of the orbits with rotation p/q")
        yield Coordinate(RESONANCES, "curve", "curve", np.array(CURVES), "rotation number of the curve")


def _root_attributes(plan: Plan) -> dict[str, str]:
    libraries = ("numpy", "numba", "scipy", "zarr", "distributed")
    return {
        "Conventions": "CF-1.11",
        "title": plan.study.title,
        "study": plan.study.text,
        "fingerprint": plan.study.fingerprint,
        "versions": ", ".join(f"{name} {version(name)}" for name in ("scanner", *libraries)),
        "python": sys.version.split()[0],
        "platform": platform.platform(),
        "processor": platform.machine(),
        "host": socket.gethostname(),
        "cores": str(os.cpu_count()),
        "started": _now(),
    }


def _now() -> str:
    return datetime.now(UTC).isoformat(timespec="seconds")
