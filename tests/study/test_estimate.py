"""What a study will cost, against what is known of it."""

import numpy as np
import pytest
from sweeps import check_all

from scanner.errors import StudyError
from scanner.study import estimate as estimate_module
from scanner.study import estimate_cost, make_plan, parse_study
from scanner.study.limits import store_bytes

TEXT = """\
[study]
title = "Estimate"
seed = 1
[table]
family = "radial_harmonic"
amplitude = { start = 0.0, stop = 0.12, count = 13 }
harmonic = { values = [2, 3] }
[orbits]
per_table = 64
bounces = 256
replicates = 4
"""
# Convex up to an amplitude of 1/(1 + harmonic^2) (closed form): 0.2, and 0.1, where the curvature is zero at points.
NOT_CONVEX = [(11, 1), (12, 1)]


def test_every_table_is_checked():
    checks = check_all(make_plan(parse_study(TEXT)))
    assert len(checks) == 26
    assert [check.index for check in checks if check.state == "not_convex"] == NOT_CONVEX
    assert all(check.state == "convex" and not check.reason for check in checks if check.index not in NOT_CONVEX)
    assert checks[-1].parameters == {"amplitude": 0.12, "harmonic": 3}
    assert "curvature" in checks[-1].reason


def test_the_estimate_counts_what_will_run():
    plan = make_plan(parse_study(TEXT))
    seen: list[int] = []
    estimate = estimate_cost(plan, seconds=0.05, report=seen.append)
    assert (estimate.tables, estimate.not_convex, estimate.failed) == (26, 2, 0)
    assert [check.index for check in estimate.faults] == NOT_CONVEX
    assert estimate.orbits == 24 * 64
    assert estimate.bounces == 24 * 64 * 256
    assert (estimate.tasks, estimate.store_bytes) == (len(plan.tasks), store_bytes(plan))
    assert seen == sorted(seen)
    assert seen[-1] == 26
    # No machine takes less than a nanosecond or, with the fixed cost of such short orbits, more than 20 microseconds.
    assert estimate.nanoseconds_per_bounce is not None
    assert 1 < estimate.nanoseconds_per_bounce < 20_000
    assert estimate.core_hours >= estimate.bounces * estimate.nanoseconds_per_bounce * 1e-9 / 3600


def test_a_study_without_convex_tables_costs_next_to_nothing():
    text = TEXT.replace("start = 0.0, stop = 0.12", "start = 0.3, stop = 0.42")
    estimate = estimate_cost(make_plan(parse_study(text)), seconds=0.05)
    assert (estimate.not_convex, estimate.orbits, estimate.bounces) == (26, 0, 0)
    assert estimate.nanoseconds_per_bounce is None
    assert len(estimate.faults) == 5
    assert estimate.core_hours < 0.01


def test_a_single_table_can_be_estimated():
    text = TEXT.replace("{ start = 0.0, stop = 0.12, count = 13 }", "0.05").replace("{ values = [2, 3] }", "2")
    estimate = estimate_cost(make_plan(parse_study(text)), seconds=0.01)
    assert (estimate.tables, estimate.orbits, estimate.tasks) == (1, 64, 1)


def test_a_study_in_rounds_costs_from_the_first_to_the_last():
    rounds = TEXT.replace("per_table = 64", "per_table = 64\ntarget_error = 0.01\nmost_per_table = 1024")
    estimate = estimate_cost(make_plan(parse_study(rounds)), seconds=0.05)
    assert (estimate.orbits, estimate.most_orbits) == (24 * 64, 24 * 1024)
    assert (estimate.bounces, estimate.most_bounces) == (24 * 64 * 256, 24 * 1024 * 256)
    more = (estimate.most_bounces - estimate.bounces) * estimate.nanoseconds_per_bounce * 1e-9 / 3600
    assert estimate.most_core_hours - estimate.core_hours == pytest.approx(more, rel=1e-9)
    fixed = estimate_cost(make_plan(parse_study(TEXT)), seconds=0.05)
    assert (fixed.most_orbits, fixed.most_bounces) == (fixed.orbits, fixed.bounces)


def test_a_study_too_large_is_refused_before_its_tables_are_built():
    text = TEXT.replace("per_table = 64", "per_table = 4194304")
    seen: list[int] = []
    with pytest.raises(StudyError, match=r"^orbits\.per_table = 4194304 makes one task hold"):
        estimate_cost(make_plan(parse_study(text)), report=seen.append)
    assert seen == []


def test_the_estimate_knows_of_periodic_orbits():
    """Both orbits of 161 rotations take hundreds of times what 64 orbits of 256 bounces do."""
    without = estimate_cost(make_plan(parse_study(TEXT)), seconds=0.05)
    with_them = estimate_cost(make_plan(parse_study(TEXT + "[resonances]\nperiod_max = 32\n")), seconds=0.05)
    assert with_them.core_hours > 3 * without.core_hours


def test_what_is_compiled_on_the_way_is_not_timed(monkeypatch):
    """A clock that runs 1 us a bounce, and a minute whenever a table is met for the first time."""
    clock, met = [0.0], set()

    def orbit_numbers(table, s, p, bounces, *limits):
        clock[0] += 1e-6 * len(s) * bounces + (0.0 if table.identity in met else 60.0)
        met.add(table.identity)
        return {"bounces_used": np.full(len(s), bounces)}

    monkeypatch.setattr(estimate_module.time, "thread_time", lambda: clock[0])
    monkeypatch.setattr(estimate_module, "orbit_numbers", orbit_numbers)
    estimate = estimate_cost(make_plan(parse_study(TEXT)), seconds=0.05)
    assert len(met) == estimate_module.CALIBRATION_TABLES
    assert estimate.nanoseconds_per_bounce == pytest.approx(1000.0, rel=1e-6)  # rounding of a clock at 240 s
