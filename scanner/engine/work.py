"""What a worker does: compute one task, write its region, leave a receipt, return a few numbers."""

from __future__ import annotations

import ctypes
import socket
import time
from dataclasses import dataclass, field
from functools import lru_cache
from pathlib import Path

from scanner import __version__
from scanner.cells import CellResult, compute, reduce
from scanner.engine.warmth import warm_kernels
from scanner.errors import EngineError
from scanner.quantities import DONE, FAILED, NOT_CONVEX
from scanner.store import Ledger, Receipt, Regions, compare, list_failures, open_regions
from scanner.study import Plan, Task, make_plan, numerics_version, parse_study

# Numbers of the GNU C library (mallopt): what lies free before some goes back, and what never comes from the pool.
_TRIM_THRESHOLD = -1
_MMAP_THRESHOLD = -3
_KEPT = 1 << 30  # bytes, more than a worker ever uses


def code_version() -> str:
    """Name the code that runs here: the version of the package and that of its numbers."""
    return f"scanner {__version__}, numerics {numerics_version()}"


@dataclass(frozen=True)
class Order:
    """All a worker needs to know besides the number of its task; a few hundred bytes."""

    store: str
    text: str
    folder: str
    allow_code: bool
    fingerprint: str
    code: str = field(default_factory=code_version)


@dataclass(frozen=True)
class Outcome:
    """What comes back from a task."""

    task: int
    orbits: int
    bounces: int
    done: int
    not_convex: int
    failed: int
    seconds: float
    host: str


def run_task(order: Order, number: int) -> Outcome:
    """Compute and write one task of a study; doing it twice is harmless, the same bytes are written.

    Raises
    ------
    EngineError
        The worker runs another version of this package, or sees other files than the client.
    """
    plan = _plan(order)
    started = time.monotonic()
    task = plan.tasks[number]
    store = Path(order.store)
    regions = open_regions(store, order.fingerprint)
    ledger = Ledger(store)
    result = _reduce(plan, task, regions, ledger) if task.kind == "reduce" else compute(plan, task)
    seals = regions.write(task, result.groups)
    receipt = Receipt(
        task=number,
        kind=task.kind,
        host=socket.gethostname(),
        finished=time.time(),
        seconds=time.monotonic() - started,
        orbits=0 if task.kind == "reduce" else task.tables * (task.orbits.stop - task.orbits.start),
        bounces=result.bounces,
        done=result.count(DONE),
        not_convex=result.count(NOT_CONVEX),
        failed=result.count(FAILED),
        failures=tuple(result.failures),
        tables=_name_tables(plan, task),
    )
    ledger.write(receipt, seals)
    return Outcome(**{name: getattr(receipt, name) for name in Outcome.__dataclass_fields__})


def _name_tables(plan: Plan, task: Task) -> str:
    """Say which tables a task is about: the values of the swept parameters, from the first to the last."""
    names = []
    for (name, values), part in zip(plan.study.swept.items(), task.box, strict=True):
        first, last = values[part.start], values[part.stop - 1]
        names.append(f"{name} = {first:.6g}" + (f" to {last:.6g}" if last != first else ""))
    return ", ".join(names) or "the table"


def _reduce(plan: Plan, task: Task, regions: Regions, ledger: Ledger) -> CellResult:
    """Sum up a table from the orbits that other tasks have written, once they are seen to be all there."""
    parts = [part for number in task.needs if (part := ledger.read(number))]
    seals = {name: seal for number in task.needs for name, seal in (ledger.seals(number) or {}).items()}
    if len(parts) < len(task.needs) or any(True for _ in compare(ledger.store, seals)):
        raise EngineError(
            f"stored orbits that task {task.number} needs are lost; `scanner verify --repair` clears them"
        )
    return reduce(plan, task, regions.read_orbits(task), list_failures(parts))


@lru_cache(maxsize=4)
def _plan(order: Order) -> Plan:
    """Read a study and have the kernels ready, once a process."""
    host = socket.gethostname()
    if order.code != code_version():
        raise EngineError(
            f"the worker on {host} runs {code_version()}, the client {order.code}; install the same everywhere"
        )
    if not Path(order.store).exists():
        raise EngineError(
            f"the worker on {host} does not see {order.store}; put the store on a disk that all hosts share"
        )
    study = parse_study(order.text, allow_code=order.allow_code, folder=order.folder)
    if study.fingerprint != order.fingerprint:
        raise EngineError(f"the worker on {host} reads other input files than the client; put them on a shared disk")
    warm_kernels(resonances=bool(study.rotations))
    keep_freed_memory()
    return make_plan(study)


def keep_freed_memory() -> None:
    """Have the C library keep what is freed for the next table, where it can be told to.

    Workers of dask are told to give everything back at once: getting it again takes up to a seventh of the time.
    """
    library = ctypes.CDLL(None)
    if hasattr(library, "mallopt"):
        for option in (_TRIM_THRESHOLD, _MMAP_THRESHOLD):
            library.mallopt(option, _KEPT)
