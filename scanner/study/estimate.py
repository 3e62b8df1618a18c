"""What a study will cost, before anything runs."""

from __future__ import annotations

import itertools
import time
from collections import Counter
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from scanner.bounce.resonances import resonance_numbers
from scanner.indicators import orbit_numbers
from scanner.measure import section_points
from scanner.study.checking import STATES, TableCheck, check_states, check_table
from scanner.study.limits import check_limits, store_bytes
from scanner.study.plan import Plan
from scanner.study.screening import CONVEX
from scanner.tables import Table

CALIBRATION_SECONDS = 1.0
CALIBRATION_BOUNCES = 65536
CALIBRATION_ORBITS = 512
CALIBRATION_TABLES = 4
TIMED_TABLES = 8
MOST_FAULTS = 5


@dataclass(frozen=True)
class Estimate:
    """What a study will cost.

    Attributes
    ----------
    tables, not_convex, failed
        Tables in all, those that are not convex and those that cannot be built; there are no orbits on these two.
    faults
        The first few of these two, each with its reason.
    orbits, bounces
        On all convex tables together; of the first round only, where tables may get more.  Bounces as expected from
        the calibration: orbits are left when it is clear what they are.
    store_bytes
        Size of the store on disk, at most.
    tasks
        Units of work.
    nanoseconds_per_bounce
        Of one core of this machine, from the calibration; None if no table is convex.
    core_hours
        What these bounces and all tables will take on cores like this machine's.
    most_orbits, most_bounces, most_core_hours
        The same if every table gets all the orbits it can.
    """

    tables: int
    not_convex: int
    failed: int
    faults: tuple[TableCheck, ...]
    orbits: int
    bounces: int
    store_bytes: int
    tasks: int
    nanoseconds_per_bounce: float | None
    core_hours: float
    most_orbits: int
    most_bounces: int
    most_core_hours: float


def estimate_cost(
    plan: Plan,
    store: Path | None = None,
    seconds: float = CALIBRATION_SECONDS,
    report: Callable[[int], None] = lambda checked: None,
) -> Estimate:
    """Check every table of a study and time a few of its orbits.

    Parameters
    ----------
    plan
        The plan of the study.
    store
        Where the store will be, to compare with the free space there; need not exist.
    seconds
        How long to time orbits.
    report
        Called now and then with the number of tables checked so far.

    Raises
    ------
    StudyError
        One line: the study does not fit the memory of a worker or the disk.
    """
    check_limits(plan, store)
    states = check_states(plan, report)
    counts = Counter(STATES[code] for code in states)
    convex = np.flatnonzero(states == CONVEX)
    faults = [_check(plan, int(number)) for number in np.flatnonzero(states != CONVEX)[:MOST_FAULTS]]
    building = plan.table_count * _time_building(plan)
    samples = _pick_tables(plan, convex) if len(convex) else []
    pace = _calibrate(plan, samples, seconds) if samples else None
    resonances = len(convex) * _time_resonances(plan, samples)
    fixed = building + resonances
    asked = plan.study.orbits
    orbits, most_orbits = len(convex) * asked.per_table, len(convex) * asked.room
    expected = pace.bounces if pace else 0.0
    bounces, most_bounces = round(orbits * expected), round(most_orbits * expected)
    seconds_per_bounce = 1e-9 * pace.nanoseconds if pace else 0.0
    return Estimate(
        tables=plan.table_count,
        not_convex=counts["not_convex"],
        failed=counts["failed"],
        faults=tuple(faults),
        orbits=orbits,
        bounces=bounces,
        store_bytes=store_bytes(plan),
        tasks=len(plan.tasks),
        nanoseconds_per_bounce=pace.nanoseconds if pace else None,
        core_hours=(fixed + bounces * seconds_per_bounce) / 3600,
        most_orbits=most_orbits,
        most_bounces=most_bounces,
        most_core_hours=(fixed + most_bounces * seconds_per_bounce) / 3600,
    )


def _check(plan: Plan, number: int) -> TableCheck:
    """Check the table of a number in the order of the grid."""
    index = tuple(map(int, np.unravel_index(number, plan.shape))) if plan.shape else ()
    return check_table(plan, index, plan.parameters_at(index))


def _spread(count: int, wanted: int) -> list[int]:
    """Choose a few places, evenly spread over so many."""
    return sorted({(2 * i + 1) * count // (2 * wanted) for i in range(wanted)})


def _time_building(plan: Plan) -> float:
    """Seconds of a core that building a table takes, the mean over a few of the study."""
    _check(plan, 0)  # compiles, or loads what is compiled
    places = _spread(plan.table_count, TIMED_TABLES)
    begun = time.thread_time()
    for number in places:
        _check(plan, number)
    return (time.thread_time() - begun) / len(places)


def _pick_tables(plan: Plan, convex: npt.NDArray[np.int64]) -> list[Table]:
    """Take a few convex tables, evenly spread over the study."""
    checks = (_check(plan, int(convex[place])) for place in _spread(len(convex), CALIBRATION_TABLES))
    return [check.table for check in checks if check.table is not None]


def _time_resonances(plan: Plan, tables: Sequence[Table]) -> float:
    """Seconds of a core that the periodic orbits of a table take, the mean over tables; 0 where none are wanted."""
    if not (plan.rotations and tables):
        return 0.0
    resonance_numbers(tables[0], plan.rotations)  # compiles, or loads what is compiled
    begun = time.thread_time()
    for table in tables:
        resonance_numbers(table, plan.rotations)
    return (time.thread_time() - begun) / len(tables)


class Pace(NamedTuple):
    """What an orbit takes: nanoseconds of a core for a bounce with all its indicators, and bounces on average."""

    nanoseconds: float
    bounces: float


def _calibrate(plan: Plan, tables: Iterable[Table], seconds: float) -> Pace:
    """Follow a few orbits of each table in turn; orbits that are still on their way at the end are taken to go on."""
    orbits = plan.study.orbits
    count = min(CALIBRATION_ORBITS, orbits.per_table)
    starts = [
        (table, *section_points(table, plan.study.seed, orbits.replicates, orbits.per_table, 0, count))
        for table in tables
    ]
    bounces = min(orbits.bounces, CALIBRATION_BOUNCES)
    common = min(orbits.exponent_bounces, bounces) if orbits.exponent_bounces else None
    # Compiles, or loads, every kernel that the timed rounds use: some only tables with islands do.
    used = [orbit_numbers(*start, bounces, common, orbits.adaptive)["bounces_used"] for start in starts]
    spent: list[float] = []
    for start in itertools.cycle(starts):
        begun = time.thread_time()
        orbit_numbers(*start, bounces, common, orbits.adaptive)
        spent.append(time.thread_time() - begun)
        if len(spent) >= len(starts) and len(spent) % len(starts) == 0 and sum(spent) >= seconds:
            break
    all_used = np.concatenate(used)
    rounds = len(spent) / len(starts)
    going_on = np.where(all_used == bounces, orbits.bounces, all_used)
    return Pace(1e9 * sum(spent) / (rounds * float(all_used.sum())), float(going_on.mean()))
