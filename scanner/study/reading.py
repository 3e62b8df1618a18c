"""From the text of a study file to a Study, or to one line that says what is wrong with it."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping
from pathlib import Path

from scanner.errors import StudyError
from scanner.study.messages import nearest, read_section, shown, written
from scanner.study.model import PATH_KEYS, Heading, Orbits, Resonances, Resources, Study
from scanner.study.parameters import read_parameters
from scanner.study.sources import absolute_path, fault_of_file, read_sources

SECTIONS = {
    "study": (*Heading.model_fields,),
    "table": ("family",),
    "orbits": (*Orbits.model_fields,),
    "resonances": (*Resonances.model_fields,),
    "resources": (*Resources.model_fields,),
}
OPTIONAL = {"resonances", "resources"}


def load_study(path: str | Path, allow_code: bool = False) -> Study:
    """Read a study file.

    Parameters
    ----------
    path
        The TOML file.  Paths inside it are relative to its folder.
    allow_code
        Whether a family ``module:function`` may run.

    Raises
    ------
    StudyError
        One line: the file, the key, the value, the bound and the remedy.
    """
    path = Path(path)
    if fault := fault_of_file(path):
        raise StudyError(f"{path} {fault}; give the path of a study file")
    try:
        text = path.read_bytes().decode("utf-8-sig")
    except OSError as error:
        raise StudyError(f"{path} cannot be read: {error.strerror or error}; give the path of a study file") from None
    except UnicodeDecodeError as error:
        raise StudyError(f"{path} is not UTF-8 text (byte {error.start}); save it as UTF-8") from None
    return parse_study(text, str(path), allow_code, path.parent)


def parse_study(text: str, name: str = "study", allow_code: bool = False, folder: str | Path = ".") -> Study:
    """Read the text of a study.

    Parameters
    ----------
    text
        TOML.
    name
        What to call it in messages.
    allow_code
        Whether a family ``module:function`` may run.
    folder
        Where relative paths inside the study start.

    Raises
    ------
    StudyError
        One line: the name, the key, the value, the bound and the remedy.
    """
    try:
        return _build(_parse(text), text, allow_code, Path(folder))
    except StudyError as error:
        raise StudyError(f"{name}: {error}") from None


def _parse(text: str) -> Mapping[str, object]:
    """Parse TOML; what is wrong comes with its line."""
    try:
        return tomllib.loads(text)
    except RecursionError:
        raise StudyError("it is nested too deeply; write one level of tables only") from None
    except ValueError as error:
        message = " ".join(str(error).split())
        found = re.search(r"\(at line (\d+), column \d+\)$", message)
        if message.startswith(("Cannot overwrite a value", "Duplicate inline table key")) and found:
            line = text.splitlines()[int(found[1]) - 1].strip()
            raise StudyError(f"line {found[1]}, {shown(line)}: a key is given twice; keep one of them") from None
        raise StudyError(f"it is not valid TOML: {message}; correct that line") from None


def _build(document: Mapping[str, object], text: str, allow_code: bool, folder: Path) -> Study:
    """Validate section by section, in the order in which a reader would look."""
    for key, value in document.items():
        if key not in SECTIONS:
            raise _unknown_section(key, value)
    for section, entries in document.items():
        if isinstance(entries, Mapping):
            _refuse_misplaced(section, entries)
    for section, keys in SECTIONS.items():
        if section not in document and section not in OPTIONAL:
            raise StudyError(f"table [{section}] is missing; add it, with {', '.join(keys)}")
    heading = read_section(Heading, document["study"], "study")
    table = document["table"]
    if not isinstance(table, Mapping):
        raise StudyError(f"table = {shown(table)} must be a table; write [table] with family and its parameters")
    family = table.get("family")
    if not isinstance(family, str):
        problem = "is missing" if family is None else f"= {shown(family)} must be text"
        raise StudyError(f'table.family {problem}; write for instance family = "radial_harmonic"')
    entries = {name: entry for name, entry in table.items() if name != "family"}
    parameters = read_parameters(family, entries, allow_code)
    orbits = read_section(Orbits, document["orbits"], "orbits")
    asked = document.get("resonances")
    resonances = None if asked is None else read_section(Resonances, asked, "resonances")
    resources = read_section(Resources, document.get("resources", {}), "resources")
    paths = resources.model_dump(include=set(PATH_KEYS), exclude_none=True)
    resources = resources.model_copy(update={key: str(absolute_path(path, folder)) for key, path in paths.items()})
    fixed, sources = read_sources(family, parameters.fixed, folder)
    return Study(
        title=heading.title,
        seed=heading.seed,
        family=family,
        fixed=fixed,
        swept=parameters.swept,
        orbits=orbits,
        resources=resources,
        text=text,
        folder=str(folder.resolve()),
        allow_code=allow_code,
        sources=sources,
        resonances=resonances,
    )


def _unknown_section(key: str, value: object) -> StudyError:
    """Name a key at the top level that is not a section, and where it belongs if that is known."""
    home = next((section for section, keys in SECTIONS.items() if key in keys), None)
    guess = nearest(key, SECTIONS)
    if home:
        remedy = f"it belongs in [{home}]"
    elif guess:
        remedy = f"did you mean [{guess}]?"
    else:
        remedy = "remove it"
    what = f"table [{written(key)}]" if isinstance(value, Mapping) else f"{written(key)} = {shown(value)}"
    return StudyError(f"{what} is not known: {remedy} (known: {', '.join(f'[{section}]' for section in SECTIONS)})")


def _refuse_misplaced(section: str, entries: Mapping[str, object]) -> None:
    """Refuse a key that belongs in another section."""
    for key, value in entries.items():
        homes = [home for home, keys in SECTIONS.items() if key in keys]
        if homes and section not in homes and section != "table":
            raise StudyError(
                f"{section}.{key} = {shown(value)} is not known: it belongs in [{homes[0]}]; move it there"
            )
