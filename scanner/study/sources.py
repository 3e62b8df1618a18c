"""Files outside the study that decide a result: they count by what is in them."""

from __future__ import annotations

import hashlib
import sys
from collections.abc import Mapping
from pathlib import Path

from scanner.errors import StudyError, TableError
from scanner.study.messages import shown
from scanner.study.model import Value
from scanner.tables.points import parse_points, read_content
from scanner.tables.user import find_function

LARGEST_FILE = 10_000_000


def absolute_path(written_path: str, folder: Path) -> Path:
    """Absolute path of a file named in a study of that folder."""
    return (folder / Path(written_path).expanduser()).resolve()


def read_sources(family: str, fixed: Mapping[str, Value], folder: Path) -> tuple[dict[str, Value], dict[str, str]]:
    """Find the files that decide a result.

    Returns
    -------
    fixed
        The fixed parameters, the path of an outline made absolute.
    sources
        SHA-256 of the outline under ``file``, or of the file of the user's own module under ``family``.

    Raises
    ------
    StudyError
        One line: the outline cannot be read or is none, or the user's own function cannot be imported.
    """
    if ":" in family:
        return dict(fixed), {"family": _hash(_read_module(family))}
    if "file" in fixed:
        path = absolute_path(str(fixed["file"]), folder)
        return {**fixed, "file": str(path)}, {"file": _hash(_read_outline(path, fixed["file"]))}
    return dict(fixed), {}


def fault_of_file(path: Path) -> str:
    """Say why a file must not even be opened: a device or a pipe may never end; empty where it may."""
    if path.is_file():
        size = path.stat().st_size
        return f"has {size} bytes, must be at most {LARGEST_FILE}" if size > LARGEST_FILE else ""
    return "is a device or a pipe, must be a file" if path.exists() and not path.is_dir() else ""


def _read_outline(path: Path, as_written: Value) -> bytes:
    """Read an outline, and see that it is one."""
    if fault := fault_of_file(path):
        raise StudyError(f"table.file = {shown(as_written)}: {path} {fault}; give a text file of points")
    try:
        content = read_content(str(path))
        parse_points(content)
    except TableError as error:
        raise StudyError(
            f"table.file = {shown(as_written)}: {error}; give a text file of points, relative to the study's folder"
        ) from None
    return content


def _read_module(family: str) -> bytes:
    """Import the user's own function and read the file of its module; what that imports in turn is not looked at."""
    try:
        find_function(family)
    except (TableError, SystemExit) as error:
        reason = error if isinstance(error, TableError) else f"its module ends the program when imported ({error})"
        raise StudyError(
            f"table.family = {shown(family)}: {reason}; correct the name, or run from the folder of the module"
        ) from None
    file = sys.modules[family.partition(":")[0]].__file__
    return Path(file).read_bytes() if file else b""


def _hash(content: bytes) -> str:
    return hashlib.sha256(content).hexdigest()
