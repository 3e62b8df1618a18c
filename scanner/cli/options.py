"""Arguments and options that several commands share."""

from __future__ import annotations

from pathlib import Path

import click
from click.core import ParameterSource

PATH = click.Path(path_type=Path)

store_argument = click.argument("store", metavar="PATH", type=PATH)
study_argument = click.argument("study", metavar="STUDY", type=PATH)
allow_code_option = click.option(
    "--allow-code", is_flag=True, help="Let a family module:function run; it is code of whoever wrote the study."
)
force_option = click.option("--force", is_flag=True, help="Replace a file that exists.")
to_option = click.option("--to", "target", required=True, metavar="FILE", type=PATH, help="The file to write.")


def is_given(name: str) -> bool:
    """Whether an option of the running command was written, rather than left at its default."""
    return click.get_current_context().get_parameter_source(name) is ParameterSource.COMMANDLINE


def split_assignments(_: click.Context, option: click.Parameter, entries: tuple[str, ...]) -> dict[str, str]:
    """Read the entries NAME=VALUE of an option that may be repeated."""
    found: dict[str, str] = {}
    for entry in entries:
        name, sign, value = (part.strip() for part in entry.partition("="))
        if not (name and sign and value):
            raise click.BadParameter(f"{entry!r} is not NAME=VALUE, for example {option.opts[0]} amplitude=0.05")
        if name in found:
            raise click.BadParameter(f"{name} is given twice: keep one of them")
        found[name] = value
    return found


def _refuse_repeats(_: click.Context, __: click.Parameter, names: tuple[str, ...]) -> tuple[str, ...]:
    for name in names:
        if names.count(name) > 1:
            raise click.BadParameter(f"{name} is given twice: keep one of them")
    return names


select_option = click.option(
    "--select",
    multiple=True,
    metavar="NAME=VALUE",
    callback=split_assignments,
    help="Hold a swept parameter at the stored value nearest to this one; may be repeated.",
)
average_option = click.option(
    "--average",
    multiple=True,
    metavar="NAME",
    callback=_refuse_repeats,
    help="Average over a swept parameter, such as realisation; may be repeated.",
)
