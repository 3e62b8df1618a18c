"""The README against the program: what it names is there, what it shows is what comes out."""

from __future__ import annotations

import itertools
import re
import shlex
import tomllib
from pathlib import Path

import pytest
import readme
from sweeps import fill

import scanner
from scanner.cli.program import INTERRUPTED
from scanner.cli.program import scanner as program
from scanner.figures.request import KINDS, WIDTHS
from scanner.quantities import COORDINATES, REGISTER
from scanner.study import Orbits, Plan, Resources, load_study, make_plan, parse_study
from scanner.study.model import Heading, Resonances
from scanner.tables import FAMILIES, build_table

TEXT = readme.README.read_text(encoding="utf-8")
PROSE = re.sub(r"^```.*?^```$", "", TEXT, flags=re.MULTILINE | re.DOTALL)
CODE = re.findall(r"`([^`\n]+)`", PROSE)
BLOCKS = readme.blocks(TEXT)
ROWS = dict(re.findall(r"^\| `scanner ([\w-]+).*?` \| (.*) \|$", TEXT, flags=re.MULTILINE))
FAMILY_ROWS = re.findall(r"^\| `([\w:]+)` \| .* \| (.*) \|$", TEXT, flags=re.MULTILINE)


def options_of(name: str) -> set[str]:
    """Options of a command."""
    return {option for parameter in program.commands[name].params for option in parameter.opts}


def command_lines() -> list[str]:
    """Every command line of the program in the README, in its text and in its blocks."""
    shown = [line for language, body in BLOCKS if language != "python" for line in body.splitlines()]
    return [line for line in [*CODE, *shown] if re.match(r"scanner [a-z]", line)]


def test_the_table_of_commands_is_that_of_the_program():
    assert list(ROWS) == list(program.commands)


def test_options_in_the_table_are_those_of_their_command():
    for name, row in ROWS.items():
        assert set(re.findall(r"--[a-z-]+", row)) <= options_of(name), name
    kinds, widths = ROWS["figure"].split("--width")
    assert re.findall(r"`(?:--kind )?([a-z]+)`", kinds) == list(KINDS)
    assert all(f"{width}`" in widths for width in WIDTHS)


@pytest.mark.parametrize("line", command_lines())
def test_every_command_line_is_understood(line):
    _, name, *words = shlex.split(line.partition(" > ")[0], comments=True)
    command = program.commands[name]
    if any(word.startswith("-") and word not in options_of(name) for word in words):
        pytest.fail(f"{line}: there is no such option")
    if len(words) > 1:  # a whole line, not just the name of a command
        command.make_context(name, list(words))


@pytest.mark.parametrize("body", [body for language, body in BLOCKS if language == "toml"])
def test_studies_are_valid(body):
    make_plan(parse_study(body))


def test_the_table_of_families_is_that_of_the_package():
    listed = {name: re.findall(r"`(\w+)`", parameters) for name, parameters in FAMILY_ROWS if "scanner" not in name}
    known = {name: [parameter.name for parameter in family.parameters] for name, family in FAMILIES.items()}
    assert listed.pop("module:function") == []
    assert listed == known


def test_files_and_sections_that_are_named_exist():
    names = re.findall(r"\]\((?!http)([^)]+)\)", TEXT)
    headings = {f"#{line[3:].lower().replace(' ', '-')}" for line in TEXT.splitlines() if line.startswith("## ")}
    paths = [
        *(name for name in names if not name.startswith("#")),
        *re.findall(r"\b(?:configs|scripts)/[\w./]*\w", TEXT),
    ]
    assert len(paths) > 8
    for path in paths:
        assert (readme.ROOT / path).exists(), path
    assert {name for name in names if name.startswith("#")} <= headings


def test_extras_and_versions_are_those_of_the_package():
    project = tomllib.loads((readme.ROOT / "pyproject.toml").read_text())["project"]
    assert set(re.findall(r"scanner\[(\w+)\]", TEXT)) <= set(project["optional-dependencies"])
    assert f"Python {project['requires-python'].removeprefix('>=')} or newer" in TEXT
    assert f"{INTERRUPTED} interrupted" in TEXT


def test_names_in_the_text_are_known():
    """Words with an underscore in code style are stored variables, keys of a study, parameters or functions."""
    sections = (Heading, Orbits, Resonances, Resources)
    known = {
        *(name for _, name in REGISTER),
        *COORDINATES,
        *(key for section in sections for key in section.model_fields),
        *(parameter.name for family in FAMILIES.values() for parameter in family.parameters),
        *FAMILIES,
    }
    words = {word for word in CODE if re.fullmatch(r"[a-z0-9]+(_[a-z0-9]+)+", word)}
    assert len(words) > 20
    assert words <= known
    for word in re.findall(r"`scanner\.(\w+)[(`]", TEXT):
        assert hasattr(scanner, word) or (readme.ROOT / "scanner" / word).is_dir(), word


def test_the_figures_shown_are_drawn_by_the_commands_beside_them():
    commands = readme.figure_commands(TEXT)
    drawn = {Path(re.search(r"--to (\S+)", command)[1]).name for command in commands}
    assert drawn <= {Path(name).name for name in re.findall(r"\]\((\.pictures/[^)]+)\)", TEXT)}
    assert len(drawn) >= 2


def tables_shown(plan: Plan) -> list[int]:
    """Tasks of the tables that outputs rest on; those that are not convex cost nothing and widen a column."""

    def is_shown(harmonic: int, amplitude: float) -> bool:
        convex = build_table(plan.study.family, harmonic=harmonic, amplitude=amplitude).is_convex
        return not convex or harmonic == 2 or (harmonic == 3 and 0.015 < amplitude < 0.065)

    shown = {index for index, parameters in plan.tables() if is_shown(parameters["harmonic"], parameters["amplitude"])}
    return [
        number
        for number, task in enumerate(plan.tasks)
        if shown & set(itertools.product(*(range(part.start, part.stop) for part in task.box)))
    ]


@pytest.mark.slow
def test_outputs_shown_are_what_comes_out(tmp_path):
    """After a change of the numbers `scripts/readme.py` writes them anew."""
    study = load_study(readme.ROOT / readme.STUDY)
    fill(tmp_path / readme.STORE, study, tables_shown(make_plan(study)))
    assert readme.refresh(TEXT, tmp_path) == TEXT
