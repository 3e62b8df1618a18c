"""Which code makes the numbers: a study gives the same bits only where this is the same."""

from __future__ import annotations

import hashlib
from functools import lru_cache
from pathlib import Path

PACKAGE = Path(__file__).parents[1]

DECIDING = (
    "compiled.py",
    "vectors.py",
    "elementary.py",
    "quantities.py",
    "cells.py",
    "tables",
    "bounce",
    "indicators",
    "measure",
    "study/layout.py",
    "study/plan.py",
)
"""Sources that decide a number or the shape of what is stored."""


@lru_cache(maxsize=1)
def numerics_version() -> str:
    """Hash of the sources that decide a result.

    No number kept by hand, as that would be forgotten; a change of a comment there counts as well, which only means
    that a store begun before is finished by the code that began it.
    """
    digest = hashlib.sha256()
    for room in DECIDING:
        path = PACKAGE / room
        for source in sorted(path.rglob("*.py")) if path.is_dir() else [path]:
            digest.update(str(source.relative_to(PACKAGE)).encode())
            digest.update(source.read_bytes())
    return digest.hexdigest()[:12]
