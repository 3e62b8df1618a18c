"""Speed of the package: the measurement of orbits beside three baselines, and whole sweeps.

The package and the baselines measure the same orbits of the same tables in one run, taking turns, so that they see
the same machine.  Processor time counts, the least of the repeats, which other work on the machine disturbs least.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator
from functools import partial
from pathlib import Path
from typing import Any

import click
import numpy as np
import numpy.typing as npt
from baseline_c import c_targets, measure_in_c
from baselines import measure_scalar, measure_vectorised
from bench_scale import many_tables, many_workers, scheduling_alone
from bench_sweep import compare_memory, compare_workers

from scanner.indicators import orbit_numbers
from scanner.indicators.blocks import Batch
from scanner.indicators.schedule import horizons, make_schedule
from scanner.measure import section_points
from scanner.measure.resonances import survey_resonances
from scanner.quantities import REGULAR_LIBRATIONAL
from scanner.tables import Table, build_table

Floats = npt.NDArray[np.float64]

TABLES: dict[str, dict[str, Any]] = {
    "ellipse": {"eccentricity": 0.6},
    "limacon": {"quadratic": 0.15},
    "radial_harmonic 2": {"amplitude": 0.05, "harmonic": 2},
    "radial_harmonic 3": {"amplitude": 0.03, "harmonic": 3},
    "radial_harmonic 4": {"amplitude": 0.02, "harmonic": 4},
    "radial_harmonic 7": {"amplitude": 0.005, "harmonic": 7},
    "curvature_harmonic 4": {"amplitude": 0.3, "harmonic": 4},
    "support_harmonic 3": {"eccentricity": 0.3, "amplitude": 0.01, "harmonic": 3, "phase": 0.2},
    "normal_harmonic 4": {"eccentricity": 0.6, "amplitude": 0.01, "harmonic": 4, "phase": 0.0},
    "normal_harmonic 3": {"eccentricity": 0.6, "amplitude": 0.01, "harmonic": 3, "phase": 0.4},
    "confocal_harmonic 4": {"eccentricity": 0.6, "amplitude": 0.01, "harmonic": 4, "phase": 1.0},
    "random_harmonic": {
        "eccentricity": 0.5,
        "amplitude": 0.01,
        "decay": 3.0,
        "harmonic_max": 8,
        "realisation": 1,
    },
}

C_COLUMNS = {"native": "C", "avx2": "C, AVX2"}
COLUMNS = ("package", *C_COLUMNS.values(), "NumPy", "scalar")


def interleaved_least(rivals: dict[str, Callable[[], object]], repeats: int) -> dict[str, float]:
    """Least processor seconds of each rival over rounds in which each has one turn, after one that warms up."""
    seconds = dict.fromkeys(rivals, np.inf)
    for number in range(repeats + 1):
        for name, run in rivals.items():
            start = time.process_time()
            run()
            if number > 0:
                seconds[name] = min(seconds[name], time.process_time() - start)
    return seconds


def follow_all(table: Table, turns: Floats, p: Floats, bounces: int) -> None:
    """Follow orbits to the last horizon with all their averages: what the baselines do, without any verdict."""
    schedule = make_schedule(bounces, adaptive=False)
    batch = Batch(table.harmonics, turns, p, schedule)
    for number in range(len(schedule.horizons)):
        batch.advance(number)


def rivals_on(table: Table, orbits: int, bounces: int) -> dict[str, Callable[[], object]]:
    """Make the package and the baselines ready to measure the same orbits of a table: the first pass over them."""
    s, p = section_points(table, seed=1, replicates=1, orbits=orbits)
    turns = np.asarray(table.turns_from_arc(s))
    ends = horizons(bounces)
    found: dict[str, Callable[[], object]] = {"package": partial(follow_all, table, turns, p, bounces)}
    for target in c_targets():
        found[C_COLUMNS[target]] = partial(measure_in_c, table.harmonics, turns, p, ends, target)
    for name, measure in (("NumPy", measure_vectorised), ("scalar", measure_scalar)):
        found[name] = partial(measure, table.harmonics, turns, p, ends)
    return found


def measured_rows(per_table: int, bounces: int, repeats: int) -> Iterator[list[str]]:
    """Rows of the comparison: table, harmonics, nanoseconds a bounce of each rival, and both C over the package."""
    for name, parameters in TABLES.items():
        table = build_table(name.split()[0], **parameters)
        there = int(table.harmonics[:, 1:].any(axis=0).sum())
        seconds = interleaved_least(rivals_on(table, per_table, bounces), repeats)
        spent = {rival: least / (per_table * bounces) * 1e9 for rival, least in seconds.items()}
        cells = [f"{spent[rival]:.0f}" if rival in spent else "-" for rival in COLUMNS]
        ratios = [f"{spent[c] / spent['package']:.2f}" if c in spent else "-" for c in C_COLUMNS.values()]
        yield [name, f"{there} of {table.harmonics.shape[1] - 1}", *cells, *ratios]


def saving_rows(per_table: int, bounces: int, repeats: int) -> Iterator[list[str]]:
    """Rows of what is saved: share of islands, seconds a table in both ways, their ratio, bounces an orbit and more."""
    for name in ("ellipse", "radial_harmonic 2", "radial_harmonic 3", "limacon", "normal_harmonic 4"):
        table = build_table(name.split()[0], **TABLES[name])
        s, p = section_points(table, seed=1, replicates=1, orbits=per_table)
        found = orbit_numbers(table, s, p, bounces)
        rivals: dict[str, Callable[[], object]] = {
            "all": partial(orbit_numbers, table, s, p, bounces, adaptive=False),
            "early": partial(orbit_numbers, table, s, p, bounces),
            "resonances": partial(survey_resonances, table, 8),
        }
        seconds = interleaved_least(rivals, repeats)
        used = np.asarray(found["bounces_used"])
        yield [
            name,
            f"{np.mean(found['verdict'] == REGULAR_LIBRATIONAL):.0%}",
            f"{seconds['all']:.3f}",
            f"{seconds['early']:.3f}",
            f"{seconds['all'] / seconds['early']:.1f}",
            f"{used.mean():.0f}",
            f"{seconds['early'] / used.sum() * 1e9:.0f}",
            f"{seconds['resonances'] * 1e3:.1f} ms",
        ]


def show_table(titles: list[str], rows: Iterator[list[str]], to: Path | None) -> None:
    """Print rows as they come, and write them as Markdown in the end if there is a place for that."""
    lines = [f"| {' | '.join(titles)} |", "|---|" + "---:|" * (len(titles) - 1)]
    print(f"{titles[0]:<22}" + "".join(f"{title:>13}" for title in titles[1:]))
    for row in rows:
        print(f"{row[0]:<22}" + "".join(f"{cell:>13}" for cell in row[1:]), flush=True)
        lines.append(f"| {' | '.join(row)} |")
    if to is not None:
        to.write_text("\n".join(lines) + "\n")
        print(f"written to {to}")


@click.group(invoke_without_command=True)
@click.pass_context
def main(context: click.Context) -> None:
    """Time the measurement of orbits (the default), its parts, whole sweeps, many tables or many workers."""
    if context.invoked_subcommand is None:
        context.invoke(orbits)


@main.command()
@click.option("--per-table", default=512, show_default=True, help="Orbits per table.")
@click.option("--bounces", default=1024, show_default=True, help="Bounces per orbit.")
@click.option("--repeats", default=7, show_default=True, help="Rounds that count.")
@click.option("--to", type=click.Path(dir_okay=False, path_type=Path), help="Write the table there, as Markdown.")
def orbits(per_table: int, bounces: int, repeats: int, to: Path | None) -> None:
    """Compare with C, NumPy and a plain compiled loop: nanoseconds per bounce on one core."""
    if not c_targets():
        print("no gcc or clang here: the columns of the baseline in C stay empty")
    print(f"{per_table} orbits of {bounces} bounces, least of {repeats}; ns per bounce on one core")
    show_table(
        ["table", "harmonics", *COLUMNS, "C ratio", "AVX2 ratio"], measured_rows(per_table, bounces, repeats), to
    )


@main.command()
@click.option("--per-table", default=1024, show_default=True, help="Orbits per table.")
@click.option("--bounces", default=8192, show_default=True, help="Bounces per orbit.")
@click.option("--repeats", default=5, show_default=True, help="Rounds that count.")
@click.option("--to", type=click.Path(dir_okay=False, path_type=Path), help="Write the table there, as Markdown.")
def extras(per_table: int, bounces: int, repeats: int, to: Path | None) -> None:
    """Time what orbits that are left early save, at the same error, and what periodic orbits cost."""
    print(f"{per_table} orbits of up to {bounces} bounces, least of {repeats}; seconds a table on one core")
    titles = ["table", "islands", "all", "left early", "ratio", "bounces", "ns each", "periods <= 8"]
    show_table(titles, saving_rows(per_table, bounces, repeats), to)


@main.command()
@click.option("--tables", default=64, show_default=True, help="Tables of 1024 orbits.")
@click.option("--bounces", default=16384, show_default=True, help="Bounces per orbit.")
def sweep(tables: int, bounces: int) -> None:
    """Time one study with one worker and with two: speed, what comes on top of the bounces, memory by tables."""
    compare_workers(tables, bounces)
    compare_memory(max(tables // 4, 1))


@main.command()
@click.option("--tables", default=100_000, show_default=True, help="Tables of 8 orbits of 512 bounces.")
@click.option("--seconds", default=120.0, show_default=True, help="How long to let the sweep run.")
def scale(tables: int, seconds: float) -> None:
    """Time what people wait for in a study of many tables, and watch the memory of its client and scheduler."""
    many_tables(tables, seconds)


@main.command()
@click.option("--count", "counts", multiple=True, type=int, default=(1, 2, 8, 32), show_default=True)
@click.option("--tasks", default=300, show_default=True, help="Tasks of some tens of milliseconds.")
@click.option("--empty", default=10_000, show_default=True, help="Tasks that do nothing.")
def workers(counts: tuple[int, ...], tasks: int, empty: int) -> None:
    """Measure what a task and a worker cost the scheduler and its client, with ever more workers."""
    scheduling_alone(empty)
    many_workers(counts, tasks)


if __name__ == "__main__":
    main()
