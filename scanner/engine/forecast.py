"""What a sweep was expected to cost when it began, to compare with what it took."""

from __future__ import annotations

import contextlib
import json
from pathlib import Path

from scanner.engine.warmth import kernels_are_warm
from scanner.errors import ScannerError
from scanner.store import Ledger
from scanner.study import Plan, estimate_cost

QUICK_SECONDS = 0.2
MOST_TABLES = 2000
"""Building more tables than this on the client, before anything runs, would keep the workers waiting."""


def expected_core_hours(plan: Plan, store: Path) -> float | None:
    """Core-hours that were expected when a store was begun; asked for the first time, they are estimated.

    None where that would take long: a host without compiled kernels, a large grid, a function of the user's own.
    """
    note = Ledger(store).folder / "estimate.json"
    try:
        return float(json.loads(note.read_bytes())["core_hours"])
    except (OSError, ValueError, TypeError, KeyError):
        pass
    quick = ":" not in plan.study.family and plan.table_count <= MOST_TABLES
    if not (quick and kernels_are_warm(resonances=bool(plan.rotations))):
        return None
    try:
        hours = estimate_cost(plan, seconds=QUICK_SECONDS).core_hours
    except ScannerError:
        return None
    with contextlib.suppress(OSError):
        note.write_text(json.dumps({"core_hours": hours}))
    return hours
