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


def remembered_core_hours(store: Path) -> float | None:
    """Core-hours that were expected when a store was begun, None where that was not noted."""
    try:
        return float(json.loads(_note(store).read_bytes())["core_hours"])
    except (OSError, ValueError, TypeError, KeyError):
        return None


def expected_core_hours(plan: Plan, store: Path) -> float | None:
    """Core-hours that were expected when a store was begun; asked for the first time, they are estimated.

    None where that would take long, as on a host without compiled kernels, for a large grid or a function of the user's
    own, and where tables take as many rounds of orbits as their errors need.
    """
    known = remembered_core_hours(store)
    orbits = plan.study.orbits
    quick = ":" not in plan.study.family and plan.table_count <= MOST_TABLES and orbits.target_error is None
    if known is not None or not (quick and kernels_are_warm(resonances=bool(plan.rotations))):
        return known
    try:
        hours = estimate_cost(plan, seconds=QUICK_SECONDS).core_hours
    except ScannerError:
        return None
    with contextlib.suppress(OSError):
        _note(store).write_text(json.dumps({"core_hours": hours}))
    return hours


def _note(store: Path) -> Path:
    return Ledger(store).folder / "estimate.json"
