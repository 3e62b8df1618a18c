"""Checks what the package imports against what pyproject.toml declares, and lists the lowest versions declared.

``python scripts/dependencies.py`` fails if a module imported anywhere in the package comes from a distribution
that is not declared.  ``python scripts/dependencies.py --lowest`` prints one ``name==version`` a line.
"""

import ast
import re
import sys
import tomllib
from collections.abc import Iterator
from importlib.metadata import packages_distributions
from pathlib import Path

ROOT = Path(__file__).parent.parent
TOOLS = ("test", "lint")
REQUIREMENT = re.compile(r"(?P<name>[A-Za-z0-9._-]+)(\[.*\])?>=(?P<lowest>[0-9.]+)(,<[0-9.]+)?")


def declared(without: tuple[str, ...] = ()) -> dict[str, str]:
    """Lowest version of every requirement in pyproject.toml, by normalised name, without these extras."""
    project = tomllib.loads((ROOT / "pyproject.toml").read_text())["project"]
    requirements = list(project["dependencies"])
    for extra, entries in project["optional-dependencies"].items():
        if extra not in without:
            requirements += entries
    found = {}
    for requirement in requirements:
        match = REQUIREMENT.fullmatch(requirement)
        if match is None:
            sys.exit(f"pyproject.toml: {requirement!r} is not of the form name>=version or name>=version,<version")
        found[normalised(match["name"])] = match["lowest"]
    return found


def normalised(name: str) -> str:
    """Name of a distribution as package indexes compare it."""
    return re.sub(r"[-_.]+", "-", name).lower()


def imported_modules(source: Path) -> Iterator[str]:
    """Top-level names of the modules that a file imports, wherever in it."""
    for node in ast.walk(ast.parse(source.read_text())):
        if isinstance(node, ast.Import):
            yield from (alias.name.partition(".")[0] for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.level == 0 and node.module:
            yield node.module.partition(".")[0]


def undeclared_imports() -> Iterator[str]:
    """One line for every import in the package whose distribution is not declared."""
    allowed = set(declared(without=TOOLS))
    homes = packages_distributions()
    own = {"scanner", *sys.stdlib_module_names}
    for source in sorted((ROOT / "scanner").rglob("*.py")):
        for module in sorted(set(imported_modules(source)) - own):
            distributions = {normalised(name) for name in homes.get(module, [module])}
            if not distributions & allowed:
                yield f"{source.relative_to(ROOT)}: {module} comes from {', '.join(distributions)}, not declared"


if __name__ == "__main__":
    if sys.argv[1:] == ["--lowest"]:
        print("\n".join(f"{name}=={lowest}" for name, lowest in declared().items()))
    else:
        sys.exit("\n".join(undeclared_imports()) or 0)
