"""The metadata of a store, told sound or damaged without the library that reads it."""

from __future__ import annotations

import json
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from scanner.store.durable import compare
from scanner.store.ledger import Charter, Ledger

ROOT_METADATA = "zarr.json"
"""The one file of a store that differs between two runs of a study, beside the ledger: it holds times and host."""


def enclosing_store(place: Path) -> Path | None:
    """Find the store, of this tool or another zarr hierarchy, that a place is in or is itself."""
    here = place.absolute()
    return next((folder for folder in (here, *here.parents) if (folder / ROOT_METADATA).exists()), None)


def is_finished(path: Path) -> bool:
    """Whether the time of completion is noted."""
    try:
        return "finished" in json.loads((path / ROOT_METADATA).read_bytes())["attributes"]
    except (OSError, ValueError, TypeError, KeyError):
        return False


def read_root(path: Path) -> dict[str, Any] | None:
    """Read the root's metadata without the time of completion; None where there is none that can be read."""
    try:
        found = json.loads((path / ROOT_METADATA).read_bytes())
        found["attributes"].pop("finished", None)
    except (OSError, ValueError, TypeError, KeyError, AttributeError):
        return None
    return dict(found)


def root_is_sound(path: Path, charter: Charter) -> bool:
    """Whether the root's metadata is as it was made, but for the time of completion."""
    root = read_root(path)
    return root == json.loads(charter.root) if charter.root else root is not None


def damaged_metadata(path: Path) -> Iterator[tuple[str, str]]:
    """Go through the metadata and coordinates that are not as they were written: name and kind of damage.

    Raises
    ------
    StoreError
        The path is not a store of this tool.
    """
    charter = Ledger(path).charter()
    yield from compare(path, charter.template)
    if not root_is_sound(path, charter):
        yield ROOT_METADATA, "unreadable" if (path / ROOT_METADATA).is_file() else "missing"
