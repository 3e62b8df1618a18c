"""The empty store of a study: all metadata and coordinates, no results; workers then fill disjoint regions of it."""

from __future__ import annotations

import json
import os
import platform
import shutil
import socket
import sys
import warnings
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from dataclasses import replace
from datetime import UTC, datetime
from importlib.metadata import version
from pathlib import Path
from typing import Any, NamedTuple
from uuid import uuid4

import numpy as np
import zarr
from zarr.codecs import ZstdCodec

from scanner import __version__
from scanner.errors import StoreError
from scanner.quantities import COORDINATES, CURVES, DIRECTIONS, ORBITS, P_BINS, PERIODS, RESONANCES, ROOT
from scanner.store.durable import Seal, compare, make_way, settle, write_durably
from scanner.store.ledger import CHARTER, LAYOUT, LEDGER, Charter, Ledger
from scanner.store.metadata import ROOT_METADATA, enclosing_store, read_root, root_is_sound
from scanner.store.swap import refuse_left_aside
from scanner.study import Plan, numerics_version
from scanner.tables import FAMILIES


def prepare_store(path: Path, plan: Plan) -> None:
    """Make the store of a plan, or see that the one there is of the same study and mend its metadata.

    Raises
    ------
    StoreError
        The path holds something else, or cannot be written; nothing is changed then.
    """
    around = enclosing_store(path.parent)
    if around is not None:
        raise StoreError(f"{path}: lies inside the store {around}; give a place outside")
    refuse_left_aside(path)
    if is_vacant(path):
        try:
            with _template(path, plan) as template:
                template.rename(path)
            settle([path])
            return
        except OSError as error:
            if not path.exists():
                raise StoreError(f"{path}: cannot be made ({error}); give a place that can be written") from None
    _mend_charter(path, plan)
    check_fingerprint(path, plan)
    _mend_template(path, plan)


def is_vacant(path: Path) -> bool:
    """Whether nothing is at a path, or an empty folder."""
    return not path.exists() or (path.is_dir() and not any(path.iterdir()))


def stored_title(path: Path) -> str:
    """Title that a store was made with; it stays when that of the study file is changed, as no result depends on it."""
    root = read_root(path)
    return "" if root is None else str(root["attributes"].get("title", ""))


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


def check_numerics(path: Path) -> None:
    """See that what is still to be computed would come from the same code as what is there.

    Raises
    ------
    StoreError
        The store was begun with another version of it.
    """
    charter = Ledger(path).charter()
    if charter.numerics != numerics_version():
        raise StoreError(
            f"{path}: begun by scanner {charter.version or '0.1.0'} with numerics {charter.numerics or 'unknown'}, "
            f"this is scanner {__version__} with {numerics_version()}, and a store must not mix the two; "
            "finish it with that version, or give another --store"
        )


def note_finish(path: Path, finished: bool) -> None:
    """Set or remove the time of completion among the root's attributes; once set it stays."""
    root = zarr.open_group(path, mode="r+")
    if finished and "finished" not in root.attrs:
        root.attrs["finished"] = _now()
    elif not finished and "finished" in root.attrs:
        del root.attrs["finished"]


def _mend_charter(path: Path, plan: Plan) -> None:
    """Write a damaged charter again, where the root's metadata says that the store is this study's."""
    ledger, root = Ledger(path), read_root(path)
    if root is None or ledger.is_founded() or root["attributes"].get("fingerprint") != plan.study.fingerprint:
        return
    if ledger.is_gathered():
        raise StoreError(
            f"{path}: the charter of this compacted store is damaged; take {LEDGER / CHARTER} from a backup"
        )
    own = root["attributes"]
    make_way(path, f"{LEDGER}/{CHARTER}")
    with _template(path, plan) as template:
        made = Ledger(template).charter()
    ledger.found(replace(made, root=json.dumps(root), version=own.get("version", ""), numerics=own.get("numerics", "")))


def _mend_template(path: Path, plan: Plan) -> None:
    """Write damaged metadata and coordinates again; they follow from the study."""
    charter = Ledger(path).charter()
    damaged = [name for name, _ in compare(path, charter.template)]
    if damaged:
        with _template(path, plan) as template:
            for name, _ in compare(template, {name: charter.template[name] for name in damaged}):
                raise StoreError(
                    f"{path / name}: damaged, and this version would write it otherwise; "
                    f"mend it with scanner {charter.version or '0.1.0'}, which made the store"
                )
            for name in damaged:
                make_way(path, name)
                (path / name).parent.mkdir(parents=True, exist_ok=True)
                (template / name).replace(path / name)
        settle(path / name for name in damaged)
    if charter.root and not root_is_sound(path, charter):
        make_way(path, ROOT_METADATA)
        write_durably(path / ROOT_METADATA, charter.root.encode())


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
                orbits=study.orbits.room,
                bounces=study.orbits.bounces,
                template=seals,
                root=(folder / ROOT_METADATA).read_text(),
                version=__version__,
                numerics=numerics_version(),
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
        create_array(
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
        array = create_array(groups[group], name, (dim,), shape, shape, values.dtype, fill, attributes)
        array[:] = values
    consolidate(folder)


def consolidate(folder: Path) -> None:
    """Gather all metadata in that of the root."""
    with warnings.catch_warnings():
        # Not yet in the specification, as zarr warns; without it plain xarray warns at every opening instead.
        warnings.filterwarnings("ignore", "Consolidated metadata", category=UserWarning)
        zarr.consolidate_metadata(folder)


def create_array(
    group: zarr.Group,
    name: str,
    dims: tuple[str, ...],
    shape: tuple[int, ...],
    chunks: tuple[int, ...],
    dtype: np.dtype[np.generic],
    fill_value: float | int | str,
    attributes: dict[str, Any],
    shards: tuple[int, ...] | None = None,
) -> zarr.Array[Any]:
    """Make one array as all of a store are made."""
    return group.create_array(
        name,
        shape=shape,
        chunks=chunks,
        shards=shards,
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
    for name, numbers in (
        ("replicate", np.arange(sizes["replicate"])),
        ("horizon", np.array(plan.horizons)),
        ("p_bin", (2 * np.arange(P_BINS) + 1) / P_BINS - 1),
        ("period", np.array(PERIODS)),
        ("direction", np.array(DIRECTIONS, np.dtypes.StringDType())),
    ):
        yield Coordinate(ROOT, name, name, numbers, COORDINATES[name])
    yield Coordinate(ORBITS, "orbit", "orbit", np.arange(sizes["orbit"]), COORDINATES["orbit"])
    if plan.rotations:
        # Not "period": the root has a dimension of that name, whose index every group inherits, over 63 values instead
        # of these.  Plain xarray opens such a store, but then isel() of the group and the tree's HTML view fail, as the
        # index has lost its coordinate; with an index of its own the group cannot be part of the tree at all.
        p, q = np.array(plan.rotations).T
        for dim, name, numbers in (
            ("resonance", "rotation", p),
            ("resonance", "resonance_period", q),
            ("curve", "curve", np.array(CURVES)),
        ):
            yield Coordinate(RESONANCES, dim, name, numbers, COORDINATES[name])


def _root_attributes(plan: Plan) -> dict[str, str]:
    libraries = ("numpy", "numba", "scipy", "zarr", "distributed")
    return {
        "Conventions": "CF-1.11",
        "title": plan.study.title,
        "study": plan.study.text,
        "fingerprint": plan.study.fingerprint,
        "version": __version__,
        "numerics": numerics_version(),
        "layout": str(LAYOUT),
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
