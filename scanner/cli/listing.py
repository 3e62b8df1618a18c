"""The summary as people and programs read it."""

from __future__ import annotations

import json
import math
import shutil
import sys

import click
import pandas as pd
import xarray as xr

from scanner.analysis import study_of, summarise, swept_parameters
from scanner.analysis.summary import DRIFT, count_statuses, largest_drift
from scanner.analysis.wording import first_and_last, number, write_parameters, write_summary
from scanner.cli.terminal import align, on_terminal, print_columns

DISPENSABLE = ("diffusion", "undecided", "drift", "tables", "Lyapunov/bounce", "regular volume")
"""Columns that make room on a narrow terminal, the first one first."""


def list_tables(root: xr.Dataset, most: int, averaged_from: xr.Dataset | None = None) -> None:
    """Print the summary in aligned columns, with a heading and what to make of them.

    ``averaged_from`` has the tables that the rows are averages of.
    """
    study = study_of(root)
    rows = summarise(root)
    shown = first_and_last(rows, most if on_terminal() else 0)
    texts = write_summary(shown, swept_parameters(root))
    omitted = _fit(texts, shutil.get_terminal_size().columns) if on_terminal() else []
    hidden = len(rows) - len(shown)
    click.echo(f"{study.title}: {study.family}, {study.orbits} orbits of {study.bounces} bounces a table\n")
    print_columns(texts, _mark(shown), (most + 1) // 2 if hidden else None)
    tables = root if averaged_from is None else averaged_from
    counts = ", ".join(f"{count} {name.replace('_', ' ')}" for name, count in count_statuses(tables).items())
    averages = "" if averaged_from is None else f"; {len(rows)} averages over those that are done"
    click.echo(f"\n{tables['table_status'].size} tables: {counts}{averages}")
    error = "± one standard error" + ("" if averaged_from is None else ", from the scatter between tables")
    drift = "drift: regular area judged after a quarter of the bounces less that after all"
    largest = largest_drift(root)
    click.echo(f"{error}; {drift}" + ("" if math.isnan(largest) else f", {number(largest)} at most in size"))
    if hidden:
        click.echo(f"{hidden} rows are not shown: --rows 0 shows all, --format csv writes all")
    if omitted:
        click.echo(f"no room for {', '.join(omitted)}: widen the terminal, or --format csv")


def list_failures(rows: pd.DataFrame) -> None:
    """Print the tables that failed or are not convex."""
    if rows.empty:
        click.echo("no table failed, and all that are done are convex")
        return
    texts = rows.rename(columns={"table_status": "status"})
    texts["status"] = texts["status"].str.replace("_", " ")
    if not any(texts["reason"]):
        del texts["reason"]
    names = [name for name in texts if name not in ("status", "reason")]
    print_columns(write_parameters(texts, names), _mark(rows))
    unexplained = int((rows["reason"] == "").sum())
    if unexplained:
        click.echo(f"\n{unexplained} without a reason: scanner estimate STUDY says why tables are not convex")


def write_rows(rows: pd.DataFrame, form: str) -> None:
    """Write rows in full precision to standard output."""
    if form == "csv":
        rows.to_csv(sys.stdout, index=False)
        sys.stdout.flush()
    else:
        known = rows.astype(object).where(rows.notna(), None)
        click.echo(json.dumps(known.to_dict("records"), indent=1, ensure_ascii=False))


STATUS_STYLES = {"done": "good", "not_convex": "doubtful", "failed": "bad"}


def _mark(rows: pd.DataFrame) -> dict[tuple[int, str], str]:
    """Choose styles for the cells of statuses and of numbers that a reader should doubt."""
    styles = {(row, "status"): STATUS_STYLES.get(status, "") for row, status in enumerate(rows["table_status"])}
    if DRIFT in rows:
        for row, (drift, error) in enumerate(zip(rows[DRIFT].abs(), rows["regular_area_fraction_stderr"], strict=True)):
            if drift > error:
                styles[row, "drift"] = "doubtful"
    return styles


def _fit(texts: pd.DataFrame, width: int) -> list[str]:
    """Take columns away until a line fits; say which."""
    omitted: list[str] = []
    for heading in DISPENSABLE:
        if len(align(texts)[0]) <= width:
            break
        if heading in texts:
            del texts[heading]
            omitted.append(heading)
    return omitted
