"""Commands that look after a store and an installation: progress, verify, compact, selfcheck."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from scanner.cli.options import store_argument
from scanner.cli.terminal import duration, print_columns, progress_bar

if TYPE_CHECKING:
    from scanner.store import SweepProgress


@click.command(short_help="How far a sweep is.")
@store_argument
def progress(store: Path) -> None:
    """Print how far the sweep in PATH is, while it is being written or long after."""
    from scanner.store import read_pulse, sweep_progress

    state = sweep_progress(store)
    share = state.tasks_finished / state.tasks
    click.echo(f"tasks   {state.tasks_finished:,} of {state.tasks:,} ({100 * share:.1f} %), {_activity(state)}")
    click.echo(
        f"tables  {state.settled:,} of {state.tables:,}: {state.done:,} done, "
        f"{state.not_convex:,} not convex, {state.failed:,} failed"
    )
    pulse = read_pulse(store) if state.running else None
    if pulse is not None:
        losses = f"; {pulse.losses}" if pulse.losses else ""
        click.echo(f"now     {pulse.workers:,} workers, {pulse.handed_out:,} tasks handed out to them{losses}")
    if state.bounces_per_second is not None:
        left = "" if not state.running or state.seconds_left is None else f", {duration(state.seconds_left)} left"
        click.echo(f"rate    {state.bounces_per_second / 1e6:,.1f} million bounces/s{left}")
        click.echo(f"spent   {state.core_seconds / 3600:,.3g} core-hours")
    if state.hosts:
        click.echo("hosts   " + ", ".join(f"{host} {100 * part:.0f} %" for host, part in state.hosts.items()))
    for number, (tables, seconds) in enumerate(state.slowest):
        click.echo(f"{'' if number else 'slowest':<8}{seconds:,.1f} s a table: {tables}")
    if state.failed:
        click.echo("failed  list the tables with `scanner summary --failed`")


def _activity(state: SweepProgress) -> str:
    """Say whether somebody is at work, and what to do if nobody is."""
    if state.complete:
        return "complete"
    if state.holder is None:
        return "not running: the same `scanner sweep` carries on"
    client = f"process {state.holder.pid} on {state.holder.host}, last sign of life {duration(state.silent)} ago"
    return f"running ({client})" if state.running else f"its client is dead ({client}): `scanner sweep` carries on"


@click.command(short_help="Look for damage in a store, and clear it.")
@store_argument
@click.option("--repair", is_flag=True, help="Clear damaged blocks, so that the next sweep computes them again.")
def verify(store: Path, repair: bool) -> int:
    """Compare every finished block of the sweep in PATH with its recorded checksum and list damage."""
    from scanner.store import repair as repair_store
    from scanner.store import verify as verify_store

    damaged = repair_store(store) if repair else verify_store(store)
    for damage in damaged:
        click.echo(str(damage))
    if not damaged:
        click.echo("all finished blocks are as they were written")
        return 0
    if repair:
        click.echo(
            f"cleared {len(damaged):,} damaged files and the tasks they belong to: run the same `scanner sweep` to "
            "compute them again"
        )
        return 0
    click.echo(f"{len(damaged):,} files are damaged: clear them with --repair, then sweep again", err=True)
    return 1


@click.command(short_help="A finished store in few large files.")
@store_argument
def compact(store: Path) -> None:
    """Put the finished sweep in PATH into few large files, without changing a value.

    Nobody should read it meanwhile.  Interrupt it at any moment: the store stays as it was.
    """
    from scanner.store import compact_store

    with progress_bar("compacting") as show:
        made = compact_store(store, show)
    if made.already:
        click.echo(f"compacted already: {made.after:,} files")
    else:
        click.echo(f"{made.before:,} files before, {made.after:,} now")


@click.command(short_help="This installation against closed forms.")
def selfcheck() -> int:
    """Compare the numbers of this installation with closed forms, in under a minute."""
    import pandas as pd

    from scanner.selfcheck import run_checks

    checks = list(run_checks())
    rows = [
        (check.name, f"{check.value:.15g}", f"{check.truth:.15g}", f"{check.difference:.1e}", f"{check.bound:.0e}",
         "ok" if check.holds else "FAILED")
        for check in checks
    ]  # fmt: skip
    styles = {(row, "verdict"): "good" if check.holds else "bad" for row, check in enumerate(checks)}
    print_columns(pd.DataFrame(rows, columns=["check", "value", "truth", "difference", "bound", "verdict"]), styles)
    failed = sum(not check.holds for check in checks)
    click.echo(f"\n{len(checks) - failed} of {len(checks)} checks hold")
    return 1 if failed else 0
