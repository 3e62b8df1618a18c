"""The version of the numbers covers every source that has a say in them."""

import ast

from scanner.compiled import KERNEL_ROOMS
from scanner.study.numerics import DECIDING, PACKAGE

WITHOUT_NUMBERS = {"scanner.errors", "scanner.cards"}
THE_REQUEST = {"scanner.study", "scanner.study.model"}
"""What a study asks for is told from others by its own fingerprint."""


def imports_of(room: str) -> set[str]:
    """Modules of this package that a file, or the files of a folder, import."""
    path = PACKAGE / room
    found = set()
    for source in path.rglob("*.py") if path.is_dir() else [path]:
        for node in ast.walk(ast.parse(source.read_text())):
            if isinstance(node, ast.ImportFrom) and node.module:
                found.add(node.module)
            elif isinstance(node, ast.Import):
                found.update(name.name for name in node.names)
    return {module for module in found if module.startswith("scanner.")}


def test_what_deciding_sources_import_decides_too() -> None:
    deciding = [f"scanner.{room.removesuffix('.py').replace('/', '.')}" for room in DECIDING]
    imported = set().union(*(imports_of(room) for room in DECIDING))
    elsewhere = {
        module for module in imported if not any(module == room or module.startswith(f"{room}.") for room in deciding)
    }
    assert elsewhere == WITHOUT_NUMBERS | THE_REQUEST


def test_kernels_decide() -> None:
    assert set(KERNEL_ROOMS) <= set(DECIDING)
