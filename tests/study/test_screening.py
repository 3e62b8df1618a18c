"""Tables settled many at once, against each of them built."""

import numpy as np
import pytest
from sweeps import check_all

from scanner.errors import TableError
from scanner.study import checking as checking_module
from scanner.study import make_plan, parse_study
from scanner.study.checking import STATES, check_states
from scanner.study.screening import CONVEX, NOT_CONVEX, UNSETTLED, screen_line
from scanner.tables import build_table

# Family, parameters held, parameter along the line and its ends, least share of the line that must be settled.
LINES = {
    "ellipse": ("ellipse", {}, "eccentricity", 0.0, 0.98, 0.9),
    "radial": ("radial_harmonic", {"harmonic": 5}, "amplitude", -0.1, 0.1, 0.98),
    "normal": ("normal_harmonic", {"eccentricity": 0.6, "harmonic": 4, "phase": 0.3}, "amplitude", 0.0, 0.1, 0.98),
    "normal along eccentricity": (
        "normal_harmonic", {"amplitude": 0.05, "harmonic": 3, "phase": 0.0}, "eccentricity", 0.0, 0.9, 0.98,
    ),
    "normal along phase": (
        "normal_harmonic", {"eccentricity": 0.7, "amplitude": 0.05, "harmonic": 3}, "phase", 0.0, 6.0, 0.98,
    ),
    "confocal": ("confocal_harmonic", {"eccentricity": 0.5, "harmonic": 3, "phase": 0.0}, "amplitude", -0.2, 0.2, 0.98),
    "support": ("support_harmonic", {"eccentricity": 0.4, "harmonic": 3, "phase": 0.0}, "amplitude", 0.0, 0.2, 0.7),
    "curvature": ("curvature_harmonic", {"harmonic": 3}, "amplitude", 0.0, 1.0, 0.5),
    "limacon": ("limacon", {}, "quadratic", 0.0, 0.45, 0.98),
    "random": (
        "random_harmonic", {"eccentricity": 0.5, "decay": 3.0, "harmonic_max": 8, "realisation": 2},
        "amplitude", 0.0, 0.2, 0.98,
    ),
}  # fmt: skip


def built_state(family, parameters):
    try:
        return CONVEX if build_table(family, **parameters).is_convex else NOT_CONVEX
    except TableError:
        return None


@pytest.mark.parametrize("line", LINES)
def test_what_is_settled_is_what_building_finds(line):
    """Every twentieth table of a line, and those on both sides of every change of state."""
    family, fixed, name, low, high, share = LINES[line]
    values = np.linspace(low, high, 1000)
    states = screen_line(family, fixed, name, values)
    assert np.mean(states != UNSETTLED) >= share
    changes = np.flatnonzero(np.diff(states))
    for place in {*range(0, 1000, 20), *changes, *(changes + 1)}:
        if states[place] != UNSETTLED:
            assert built_state(family, {**fixed, name: values[place]}) == states[place], values[place]


def test_the_limit_of_convexity_is_left_to_be_built():
    """1/(1 + harmonic^2) in closed form, where the curvature is zero at points and the table is convex still."""
    values = np.array([0.1 + 1e-4 * step for step in range(-10, 11)] + [0.1 * (1.0 - 1e-12)])
    states = screen_line("radial_harmonic", {"harmonic": 3}, "amplitude", values)
    assert list(states[:10]) == [CONVEX] * 10
    assert list(states[10:]) == [UNSETTLED, *[NOT_CONVEX] * 10, UNSETTLED]


def test_tables_that_cannot_be_built_are_not_called_convex():
    """Ellipses so thin that their arc length needs more harmonics than a table may have."""
    values = np.linspace(0.999, 0.99999999, 40)
    states = screen_line("ellipse", {}, "eccentricity", values)
    assert built_state("ellipse", {"eccentricity": values[-1]}) is None
    assert not states[-1:].any()


def test_the_order_of_values_is_kept():
    values = np.random.default_rng(1).permutation(np.linspace(0.0, 0.2, 200))
    states = screen_line("radial_harmonic", {"harmonic": 3}, "amplitude", values)
    assert ((states == CONVEX) == (values < 0.1)).all()


TEXT = """\
[study]
title = "Screened"
seed = 1
[table]
family = "normal_harmonic"
eccentricity = {{ values = [0.0, 0.5] }}
amplitude = {{ start = 0.0, stop = 0.08, count = {count} }}
harmonic = {{ values = [2, 4] }}
phase = 0.0
[orbits]
per_table = 64
bounces = 256
replicates = 4
"""


def test_every_table_of_a_study_is_settled_in_its_place():
    plan = make_plan(parse_study(TEXT.format(count=30)))
    assert [STATES[code] for code in check_states(plan)] == [check.state for check in check_all(plan)]


def test_few_tables_of_a_large_study_are_built(monkeypatch):
    """12,000 tables; those near the limit of convexity on each of the four lines."""
    built, seen = [], []
    check = checking_module.check_table
    monkeypatch.setattr(checking_module, "check_table", lambda *entry: built.append(entry[1]) or check(*entry))
    states = check_states(make_plan(parse_study(TEXT.format(count=3000))), seen.append)
    assert len(states) == 12_000
    assert 0 < (states == NOT_CONVEX).sum() < 12_000
    assert (states != UNSETTLED).all()
    assert len(built) < 60
    assert seen == sorted(seen)
    assert seen[-1] == 12_000
