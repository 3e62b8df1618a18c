"""Commands about families: what there is, how far it stays convex, and a study to start from."""

from __future__ import annotations

from typing import TYPE_CHECKING

import click
from click.shell_completion import CompletionItem

from scanner.cli.options import split_assignments
from scanner.cli.starting import STARTS, require_known, starting_study
from scanner.cli.terminal import paint
from scanner.errors import ScannerError

if TYPE_CHECKING:
    from scanner.tables import Family


def _complete_family(_: click.Context, __: click.Parameter, begun: str) -> list[CompletionItem]:
    return [CompletionItem(name) for name in STARTS if name.startswith(begun)]


@click.command(short_help="The families, their parameters and how far they stay convex.")
@click.argument("family", metavar="[FAMILY]", required=False, shell_complete=_complete_family)
@click.option(
    "--at",
    "given",
    multiple=True,
    metavar="NAME=VALUE",
    callback=split_assignments,
    help="Say how far FAMILY stays convex when its other parameters have these values; repeated for each.",
)
def families(family: str | None, given: dict[str, str]) -> None:
    """List the families with their parameters, or FAMILY alone; with --at, how far it stays convex.

    scanner families normal_harmonic --at eccentricity=0.6 --at harmonic=4 --at phase=0
    """
    if family is None:
        if given:
            raise click.UsageError("--at gives parameters of one family: name it, as in scanner families limacon")
    else:
        require_known(family)
    from scanner.tables import FAMILIES

    if family is not None:
        limits = _limits(family, given) if given else ""
        _describe(FAMILIES[family])
        click.echo(limits or f"\nscanner new {family} > study.toml writes a study to start from")
        return
    for known in FAMILIES.values():
        _describe(known)
        click.echo()
    click.echo(f"{paint('module:function', 'heading')}: your own, from parameters to points or Fourier coefficients")
    click.echo("\nscanner new FAMILY > study.toml writes a study to start from")


def _describe(family: Family) -> None:
    """Print a family: its formula, its parameters with their bounds, and when it is convex."""
    from scanner.study.convexity import CONVEXITY
    from scanner.study.parameters import describe_bounds

    click.echo(f"{paint(family.name, 'heading')}: {family.formula}")
    for parameter in family.parameters:
        click.echo(f"    {paint(f'{parameter.name:<14}', 'name')}{parameter.meaning}; {describe_bounds(parameter)}")
    click.echo(f"    {paint('convex        ', 'good')}{CONVEXITY[family.name].rule}")


def _limits(family: str, given: dict[str, str]) -> str:
    """Say between which values tables with these parameters are convex."""
    from scanner.study.convexity import CONVEXITY, find_limits
    from scanner.tables import FAMILIES

    name = CONVEXITY[family].parameter
    if not name:
        raise click.UsageError(f"{family} is convex for all its parameters: leave out --at")
    if name in given:
        raise click.UsageError(f"{name} is what the limit is sought for: leave out --at {name}={given[name]}")
    known = {parameter.name: parameter for parameter in FAMILIES[family].parameters}
    kinds = {key: parameter.kind for key, parameter in known.items()}
    low, high = find_limits(family, {key: _read(kinds.get(key, "text"), key, value) for key, value in given.items()})
    low, high = max(low, known[name].low), min(high, known[name].high)
    shown = ", ".join(f"{key} = {value}" for key, value in given.items())
    return f"    at {shown}: convex for {name} from {low:.6g} to {high:.6g}"


def _read(kind: str, name: str, text: str) -> float | int | str:
    """Read a parameter from the command line; the family says whether the number is one that it takes."""
    try:
        if kind == "text":
            return text
        return int(text) if kind == "int" else float(text)
    except ValueError:
        wanted = "a whole number" if kind == "int" else "a number"
        raise ScannerError(f"--at {name}={text}: {name} must be {wanted}; correct it") from None


@click.command(short_help="A commented study to start from.")
@click.argument("family", metavar="FAMILY", shell_complete=_complete_family)
def new(family: str) -> None:
    """Print a commented study of FAMILY to start from, or of a function of your own, module:function.

    scanner new radial_harmonic > study.toml
    """
    click.echo(starting_study(family), nl=False)
    if family == "outline_file":
        click.echo("before you run it: put your outline beside the study, as its comments say", err=True)
    elif ":" in family:
        click.echo("before you run it: write your function, as its comments say", err=True)
