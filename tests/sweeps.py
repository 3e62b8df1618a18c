"""Small studies, and stores of them filled in this process, to compare others with."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

from scanner.engine.work import Order, run_task
from scanner.store import prepare_store
from scanner.study import Plan, Study, TableCheck, check_table, make_plan, parse_study

GRID = """
[study]
title = "Grid"
seed = 5
[table]
family = "radial_harmonic"
amplitude = { start = 0.0, stop = 0.24, count = 5 }
harmonic = { values = [2, 3] }
[orbits]
per_table = 256
bounces = 32768
replicates = 4
"""
"""Ten tables, four of them not convex, in five tasks of some tens of milliseconds."""


def order_for(store: Path, study: Study) -> Order:
    """What a worker is told about a study."""
    return Order(str(store), study.text, study.folder, study.allow_code, study.fingerprint)


def fill(store: Path, study: Study, tasks: Iterable[int] | None = None) -> Plan:
    """Make a store and compute tasks of it here, all by default."""
    plan = make_plan(study)
    prepare_store(store, plan)
    for number in range(len(plan.tasks)) if tasks is None else tasks:
        run_task(order_for(store, study), number)
    return plan


def grid(**replaced: str) -> Study:
    """Read the small grid; other values for keys by ``key="value"``."""
    lines = [f"{line.split(' = ')[0]} = {replaced[line.split(' = ')[0]]}" if line.split(" = ")[0] in replaced else line
             for line in GRID.splitlines()]  # fmt: skip
    return parse_study("\n".join(lines))


def check_all(plan: Plan) -> list[TableCheck]:
    """Build every table of a plan."""
    return [check_table(plan, index, parameters) for index, parameters in plan.tables()]


def results(store: Path) -> dict[str, bytes]:
    """All chunk files and metadata of a store but the root's attributes and the ledger, which hold times and hosts."""
    ledger = store / "table_status" / "ledger"
    files = [file for file in store.rglob("*") if file.is_file() and ledger not in file.parents]
    return {str(file.relative_to(store)): file.read_bytes() for file in files if file != store / "zarr.json"}


def everything(folder: Path) -> dict[str, tuple[bytes, int]]:
    """Contents and times of change of all files below a folder."""
    return {
        str(file.relative_to(folder)): (file.read_bytes(), file.stat().st_mtime_ns)
        for file in folder.rglob("*")
        if file.is_file()
    }
