"""Nanoseconds per bounce and core of the whole measurement of orbits, the package beside two baselines.

All three measure the same orbits of the same tables in one run, taking turns, so that they see the same machine;
the median of the repeats counts.  Ratios are of medians: how many times longer the baseline takes.
"""

from __future__ import annotations

import statistics
import time
from collections.abc import Callable
from functools import partial
from typing import Any

import click
import numpy as np
from baselines import measure_scalar, measure_vectorised

from scanner.indicators import orbit_numbers
from scanner.indicators.schedule import horizons
from scanner.measure import section_points
from scanner.tables import Table, build_table

TABLES: dict[str, dict[str, Any]] = {
    "ellipse": {"eccentricity": 0.6},
    "radial_harmonic 2": {"amplitude": 0.05, "harmonic": 2},
    "radial_harmonic 3": {"amplitude": 0.03, "harmonic": 3},
    "radial_harmonic 4": {"amplitude": 0.02, "harmonic": 4},
    "limacon": {"quadratic": 0.15},
    "normal_harmonic 4": {"eccentricity": 0.6, "amplitude": 0.01, "harmonic": 4, "phase": 0.0},
    "random_harmonic": {
        "eccentricity": 0.5,
        "amplitude": 0.01,
        "decay": 3.0,
        "harmonic_max": 8,
        "realisation": 1,
    },
}


def interleaved_medians(rivals: dict[str, Callable[[], object]], repeats: int) -> dict[str, float]:
    """Median seconds of each rival over ``repeats`` rounds in which each has one turn, after a round that warms up."""
    seconds: dict[str, list[float]] = {name: [] for name in rivals}
    for number in range(repeats + 1):
        for name, run in rivals.items():
            start = time.perf_counter()
            run()
            if number > 0:
                seconds[name].append(time.perf_counter() - start)
    return {name: statistics.median(values) for name, values in seconds.items()}


def rivals_on(table: Table, orbits: int, bounces: int) -> dict[str, Callable[[], object]]:
    """Make the package and the baselines ready to measure the same orbits of a table."""
    s, p = section_points(table, seed=1, replicates=1, orbits=orbits)
    turns = np.asarray(table.turns_from_arc(s))
    ends = horizons(bounces)
    return {
        "package": partial(orbit_numbers, table, s, p, bounces),
        "numpy": partial(measure_vectorised, table.harmonics, turns, p, ends),
        "scalar": partial(measure_scalar, table.harmonics, turns, p, ends),
    }


@click.command(help=__doc__)
@click.option("--orbits", default=1024, show_default=True, help="Orbits per table.")
@click.option("--bounces", default=2048, show_default=True, help="Bounces per orbit.")
@click.option("--repeats", default=5, show_default=True, help="Rounds that count.")
def main(orbits: int, bounces: int, repeats: int) -> None:
    """Print one line a table."""
    print(f"{orbits} orbits of {bounces} bounces, median of {repeats}; ns per bounce on one core")
    print(f"{'table':<20}{'K':>4}{'package':>10}{'NumPy':>10}{'scalar':>10}{'NumPy/package':>16}{'scalar/package':>16}")
    for name, parameters in TABLES.items():
        table = build_table(name.split()[0], **parameters)
        seconds = interleaved_medians(rivals_on(table, orbits, bounces), repeats)
        package, vectorised, scalar = (seconds[rival] / (orbits * bounces) * 1e9 for rival in seconds)
        print(
            f"{name:<20}{table.harmonics.shape[1] - 1:>4}{package:>10.1f}{vectorised:>10.1f}{scalar:>10.1f}"
            f"{vectorised / package:>16.1f}{scalar / package:>16.1f}",
            flush=True,
        )


if __name__ == "__main__":
    main()
