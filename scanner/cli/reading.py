"""Commands that read a store: summary, export, figure, report."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING

import click

from scanner.cli.options import (
    allow_code_option,
    average_option,
    force_option,
    is_given,
    select_option,
    store_argument,
    to_option,
)
from scanner.figures.request import CHORDS, COLOURS, FREQUENCY_BOUNCES, KINDS, LINE_ORBITS, WIDTHS

if TYPE_CHECKING:
    import xarray as xr


@contextmanager
def open_store(path: Path) -> Iterator[xr.DataTree]:
    """Open a store; what goes wrong because blocks of it are damaged is said in one line."""
    from scanner.errors import ScannerError, StoreError
    from scanner.store import open_sweep, sweep_progress, verify

    try:
        with open_sweep(path) as tree:
            yield tree
    except (ScannerError, click.ClickException):
        raise
    except Exception as error:
        if damage := verify(path):
            raise StoreError(
                f"{path}: {len(damage)} files are damaged, the first is {damage[0]}; "
                "list them with `scanner verify`, clear them with --repair and run the sweep again"
            ) from error
        if not sweep_progress(path).complete:
            raise StoreError(
                f"{path}: cannot be read ({error}); it is not finished: run the sweep to its end"
            ) from error
        raise


@click.command(short_help="The table of results.")
@store_argument
@select_option
@average_option
@click.option("--failed", is_flag=True, help="List the tables that failed or are not convex, with reasons.")
@click.option(
    "--rows",
    type=click.IntRange(min=0),
    default=40,
    show_default=True,
    help="Most rows to show on a terminal; 0 for all.",
)
@click.option(
    "--format",
    "form",
    type=click.Choice(["text", "csv", "json"]),
    default="text",
    show_default=True,
    help="Aligned columns, or full precision for a pipe.",
)
def summary(store: Path, select: dict[str, str], average: tuple[str, ...], failed: bool, rows: int, form: str) -> None:
    """Print the table of results of the sweep in PATH."""
    from scanner.analysis import average_tables, failures, pick_tables, summarise, why_not_convex
    from scanner.cards import describe
    from scanner.cli.listing import list_failures, list_tables, write_rows
    from scanner.store import sweep_progress

    if failed and (select or average):
        raise click.UsageError("--failed lists all tables without numbers: leave out --select and --average")
    if (failed or form != "text") and is_given("rows"):
        raise click.UsageError("--rows shortens the columns on a terminal, all else is whole: leave it out")
    with open_store(store) as tree:
        picked, taken = pick_tables(tree, select)
        tables = picked.to_dataset().load()
        root = average_tables(tables, average)
        reasons = {**why_not_convex(root), **sweep_progress(store).failures} if failed else {}
        without_numbers = failures(root, reasons) if failed else None
    if taken:
        click.echo(f"tables at {describe(taken)}", err=True)
    if form != "text":
        write_rows(summarise(root) if without_numbers is None else without_numbers, form)
    elif without_numbers is not None:
        list_failures(without_numbers)
    else:
        list_tables(root, rows, tables if average else None)


@click.command(short_help="Write netCDF, csv or parquet.")
@store_argument
@to_option
@click.option("--orbits", is_flag=True, help="One row an orbit instead of one row a table.")
@click.option("--resonances", is_flag=True, help="One row a resonance of each table.")
@force_option
def export(store: Path, target: Path, orbits: bool, resonances: bool, force: bool) -> None:
    """Write the sweep in PATH to a file of another format.

    .nc is the whole sweep as netCDF-4; .csv and .parquet hold one row a table.
    """
    from scanner.analysis import export_sweep
    from scanner.quantities import ORBITS, RESONANCES, ROOT

    if orbits and resonances:
        raise click.UsageError("--orbits and --resonances are rows of different kinds: write a file each")
    if (orbits or resonances) and target.suffix.lower() == ".nc":
        raise click.UsageError("a .nc file has no rows and holds all groups: leave out --orbits and --resonances")
    with open_store(store) as tree:
        export_sweep(tree, target, rows=ORBITS if orbits else RESONANCES if resonances else ROOT, force=force)
    click.echo(f"wrote {target}", err=True)


@click.command(short_help="Draw a figure for print.")
@store_argument
@to_option
@click.option(
    "--kind",
    type=click.Choice(KINDS),
    help="fractions: regular fractions against one parameter. curve: one variable against one parameter. "
    "map: one variable over two dimensions. portrait: the orbits of one table. "
    "table: one table with chosen orbits in it and their caustics. "
    "exponents: how the Lyapunov exponents are distributed, in one table or along one parameter. "
    "frequency: rotation numbers and their diffusion in one table, measured anew. "
    "gaps: length gaps of stored resonances against the amplitude. "
    "By default what suits the number of swept parameters.",
)
@select_option
@average_option
@click.option("--quantity", default="", metavar="VARIABLE", help="Variable of a curve or a map.")
@click.option("--along", default="", metavar="NAME", help="Parameter of the horizontal axis of a curve or of gaps.")
@click.option(
    "--colour", type=click.Choice(COLOURS), default="verdict", show_default=True, help="Colours of a portrait."
)
@click.option(
    "--bounces",
    type=click.IntRange(min=0),
    default=0,
    metavar="N",
    help="Follow each orbit of a portrait anew for N bounces and draw them all, not its start alone; "
    f"for a frequency figure, bounces of each orbit, {FREQUENCY_BOUNCES} unless given; "
    f"for a table, chords drawn of each orbit, {CHORDS} unless given.",
)
@click.option(
    "--s",
    type=click.FloatRange(0.0, 1.0),
    default=0.0,
    show_default=True,
    help="Arc length over the perimeter of the line of a frequency figure, and of the orbits that start at --p.",
)
@click.option(
    "--p",
    type=click.FloatRange(-1.0, 1.0, min_open=True, max_open=True),
    multiple=True,
    help="Start of an orbit to draw in a table; may be repeated. Without it, stored orbits of each sort.",
)
@click.option(
    "--orbits",
    type=click.IntRange(min=1),
    default=LINE_ORBITS,
    show_default=True,
    metavar="N",
    help="Orbits along the line of a frequency figure.",
)
@click.option(
    "--width", type=click.Choice(WIDTHS), default="single", show_default=True, help="Columns of a journal's page."
)
@allow_code_option
@force_option
def figure(
    store: Path,
    target: Path,
    kind: str | None,
    select: dict[str, str],
    average: tuple[str, ...],
    quantity: str,
    along: str,
    colour: str,
    bounces: int,
    s: float,
    p: tuple[float, ...],
    orbits: int,
    width: str,
    allow_code: bool,
    force: bool,
) -> None:
    """Draw the sweep in PATH as a figure for print: PNG, PDF or SVG by the suffix of FILE."""
    from scanner.figures import Request, write_figure

    request = Request(
        kind or "", select, average, quantity, along, colour, bounces, s, p, orbits, width, allow_code=allow_code
    )
    with open_store(store) as tree:
        taken = write_figure(tree, target, request, force=force)
    click.echo(f"wrote {target}" + (f", tables at {taken}" if taken else ""), err=True)


@click.command(short_help="Write one page with figures, numbers and doubts.")
@store_argument
@to_option
@select_option
@average_option
@click.option(
    "--rows",
    type=click.IntRange(min=0),
    default=400,
    show_default=True,
    help="Most rows of the table of numbers; 0 for all.",
)
@allow_code_option
@force_option
def report(
    store: Path,
    target: Path,
    select: dict[str, str],
    average: tuple[str, ...],
    rows: int,
    allow_code: bool,
    force: bool,
) -> None:
    """Write a report of the sweep in PATH: one HTML file that opens without a network and prints well."""
    from scanner.report import write_report
    from scanner.store import sweep_progress

    with open_store(store) as tree:
        taken = write_report(
            tree,
            sweep_progress(store),
            target,
            select=select,
            average=average,
            rows=rows,
            allow_code=allow_code,
            force=force,
        )
    click.echo(f"wrote {target}" + (f", tables at {taken}" if taken else ""), err=True)
