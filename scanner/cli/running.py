"""Commands that run a study: estimate, sweep."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING

import click

from scanner.cli.options import PATH, allow_code_option, study_argument
from scanner.cli.terminal import duration, progress_bar, size
from scanner.errors import ScannerError

if TYPE_CHECKING:
    from scanner.study import Study
    from scanner.study.estimate import Estimate

QUEUES = ("slurm", "pbs", "lsf", "sge")


@click.command(short_help="What a study will cost; checks every table first.")
@study_argument
@click.option("--store", type=PATH, metavar="PATH", help="Where the store will be, to compare with the free space.")
@allow_code_option
def estimate(study: Path, store: Path | None, allow_code: bool) -> None:
    """Check every table of STUDY and print what the sweep will cost, from a short calibration on this machine."""
    from scanner.study import load_study

    asked = load_study(study, allow_code)
    found = _estimate(asked, store)
    click.echo(f"{asked.title}: {asked.family}")
    for name, value in (
        ("tables", f"{found.tables:,}"),
        ("not convex", f"{found.not_convex:,}"),
        ("cannot be built", f"{found.failed:,}"),
        ("orbits", _span(found.orbits, found.most_orbits, ",")),
        ("bounces", _span(found.bounces, found.most_bounces, ",")),
        ("tasks", f"{found.tasks:,}"),
        ("store, at most", size(found.store_bytes)),
        ("one bounce", f"{found.nanoseconds_per_bounce:.0f} ns" if found.nanoseconds_per_bounce else "-"),
        ("core-hours", _span(found.core_hours, found.most_core_hours, ",.3g")),
        ("that is", f"{_spell(found)} on one core like this one"),
    ):
        click.echo(f"{name:>16}  {value}")
    if found.most_orbits > found.orbits:
        click.echo("first round, and what it is at most if no table meets target_error before its last one")
    _list_faults(found)


@click.command(short_help="Run a study, or carry on with it.")
@study_argument
@click.option("--store", required=True, type=PATH, metavar="PATH", help="Folder of the store; made if there is none.")
@click.option("--workers", type=click.IntRange(min=1), metavar="N", help="Processes on this machine; one a core.")
@click.option("--scheduler", metavar="ADDRESS", help="A scheduler that is running, such as tcp://host:8786.")
@click.option("--scheduler-file", metavar="FILE", type=PATH, help="The file in which a running scheduler is named.")
@allow_code_option
@click.option("--yes", is_flag=True, help="Submit jobs to the queue of a cluster without asking.")
def sweep(
    study: Path,
    store: Path,
    workers: int | None,
    scheduler: str | None,
    scheduler_file: Path | None,
    allow_code: bool,
    yes: bool,
) -> int:
    """Run STUDY and write its store; on a store that holds part of it, carry on.

    Ctrl-C lets the tasks in flight finish, a second one stops at once; what is finished is kept.
    """
    from scanner.engine import run_study
    from scanner.study import load_study

    if scheduler is not None and scheduler_file is not None:
        raise click.UsageError("--scheduler and --scheduler-file exclude each other: give one of them")
    if workers is not None and (scheduler or scheduler_file):
        raise click.UsageError("--workers starts processes here, a scheduler has its own workers: leave one out")
    asked = load_study(study, allow_code)
    if asked.resources.runner in QUEUES and not (scheduler or scheduler_file or yes):
        _confirm(asked, store, workers)
    report = run_study(
        asked,
        store,
        workers=workers,
        scheduler=scheduler,
        scheduler_file=str(scheduler_file) if scheduler_file else None,
        allow_code=allow_code,
    )
    click.echo(str(report))
    for line in report.failures:
        click.echo(f"failed: {line}", err=True)
    return report.exit_status


@click.command(short_help="A batch script for a cluster, to look at and submit.")
@study_argument
@click.option("--store", required=True, type=PATH, metavar="PATH", help="Folder of the store, seen by all hosts.")
@click.option("--for", "system", required=True, type=click.Choice(["slurm", "pbs"]), help="Whose script to write.")
@click.option("--workers", type=click.IntRange(min=1), metavar="N", help="Jobs of one worker each.")
@allow_code_option
def jobscript(study: Path, store: Path, system: str, workers: int | None, allow_code: bool) -> None:
    """Print a script that sweeps STUDY as an array of jobs, with what its [resources] ask for.

    It needs no package for clusters: one job holds the scheduler, every other one a worker.
    """
    from scanner.engine.jobscript import job_script
    from scanner.study import load_study

    resources = load_study(study, allow_code).resources
    click.echo(job_script(system, resources, study, store, workers, allow_code), nl=False)
    if not (resources.interface or resources.host):
        click.echo(
            'all elements must run on one host, as nothing else is said: interface = "ib0" in [resources] (the name of '
            "the cluster's network) lets them run anywhere",
            err=True,
        )


def _estimate(asked: Study, store: Path | None) -> Estimate:
    from scanner.study import make_plan
    from scanner.study.estimate import estimate_cost

    plan = make_plan(asked)
    with progress_bar("checking tables") as show:
        return estimate_cost(plan, store, report=lambda checked: show(checked, plan.table_count))


def _span(least: float, most: float, form: str) -> str:
    """Write a number, or the range it is in where that depends on how many rounds the tables take."""
    return f"{least:{form}}" if least == most else f"{least:{form}} to {most:{form}}"


def _spell(found: Estimate) -> str:
    times = [duration(3600 * hours) for hours in (found.core_hours, found.most_core_hours)]
    return " to ".join(dict.fromkeys(times))


def _list_faults(found: Estimate) -> None:
    """Name the first tables on which there will be no orbits, and why."""
    from scanner.cards import describe

    for fault in found.faults:
        click.echo(f"{fault.state.replace('_', ' ')}: {describe(fault.parameters)}: {fault.reason}")
    hidden = found.not_convex + found.failed - len(found.faults)
    if hidden:
        click.echo(f"... and {hidden:,} more")


def _confirm(asked: Study, store: Path, workers: int | None) -> None:
    """Say what will be asked of the cluster and have it confirmed; where nobody can answer, refuse."""
    found = _estimate(asked, store)
    runner = asked.resources.runner
    click.echo(
        f"{found.tables:,} tables ({found.not_convex:,} not convex), {found.tasks:,} tasks, "
        f"{_span(found.core_hours, found.most_core_hours, ',.3g')} core-hours, "
        f"store at most {size(found.store_bytes)}; "
        f"{workers or asked.resources.workers or 'no number of'} workers from {runner}",
        err=True,
    )
    if not sys.stdin.isatty():
        raise ScannerError(f'runner = "{runner}" submits jobs to a queue: confirm it with --yes')
    click.confirm("submit?", abort=True, err=True)
