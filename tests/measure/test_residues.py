import math

import numpy as np
import pytest
from scipy.linalg import solve_banded
from scipy.optimize import brentq

from scanner.bounce.resonances import residue
from scanner.measure.residues import CRITICAL, convergents, judge_residues

GOLDEN = 0.5 * (math.sqrt(5.0) - 1.0)


def standard_residue(strength, rounds, period):
    """Residue of the minimax orbit of p' = p + K / (2 pi) sin(2 pi x), x' = x + p', carried over from K = 0.

    It has a point on the line of symmetry x = 1/2; each other point has the mean of its neighbours but for the kick.
    """
    x = 0.5 + np.arange(period + 1) * rounds / period
    bands = np.ones((3, period - 1))
    for part in np.linspace(0.0, strength, 15)[1:]:
        for _ in range(20):
            amiss = np.diff(x, 2) - part / (2.0 * math.pi) * np.sin(2.0 * math.pi * x[1:-1])
            bands[1] = -2.0 - part * np.cos(2.0 * math.pi * x[1:-1])
            change = solve_banded((1, 1), bands, amiss)
            x[1:-1] -= change
            if np.abs(change).max() < 1e-14:
                break
    matrix = np.eye(2)
    for kick in strength * np.cos(2.0 * math.pi * x[:-1]):
        matrix = np.array([[1.0 + kick, 1.0], [kick, 1.0]]) @ matrix
    return float(residue(np.trace(matrix)))


def test_convergents_of_the_golden_mean_are_fibonacci_numbers():
    assert convergents(GOLDEN, 34) == [(1, 2), (2, 3), (3, 5), (5, 8), (8, 13), (13, 21), (21, 34)]
    assert convergents(1.0 / (3.0 + GOLDEN), 11) == [(1, 3), (1, 4), (2, 7), (3, 11)]
    assert convergents(0.375, 100) == [(1, 2), (1, 3), (3, 8)]
    with pytest.raises(ValueError, match="between 0 and 1"):
        convergents(1.5, 10)


def test_critical_strength_of_the_standard_map():
    """K = 0.971635406 (Greene 1979): the last curve, of golden rotation; where residues pass 1/4 tends to it."""
    errors = [
        brentq(lambda strength, p=p, q=q: standard_residue(strength, p, q) - CRITICAL, 0.969, 0.973, xtol=1e-11)
        - 0.971635406
        for p, q in convergents(GOLDEN, 1597)
        if q >= 89
    ]
    # They fall by 1.63 from one orbit to the next (Greene), not evenly: the residue tends to 1/4 by turns.
    assert abs(errors[-1]) < 2e-7
    assert abs(errors[-1]) < abs(errors[0]) * 1.63 ** -len(errors[1:])


@pytest.mark.parametrize(
    ("strength", "fate"),
    [
        (0.2, "survives"),
        (0.5, "survives"),
        (0.9, "survives"),
        (0.966, "survives"),
        (0.9716, "undecided"),
        (0.977, "broken"),
        (1.05, "broken"),
        (2.0, "broken"),
    ],
)
def test_golden_curve_of_the_standard_map(strength, fate):
    """It breaks at 0.971635 (Greene 1979); orbits up to 55 leave 0.968 to 0.975 undecided (computed here)."""
    orbits = convergents(GOLDEN, 55)
    assert judge_residues([q for _, q in orbits], [standard_residue(strength, p, q) for p, q in orbits]).fate == fate


def test_longer_orbits_leave_less_undecided():
    orbits = convergents(GOLDEN, 377)
    for strength, fate in ((0.9708, "survives"), (0.9725, "broken")):
        residues = [standard_residue(strength, p, q) for p, q in orbits]
        assert judge_residues([q for _, q in orbits], residues).fate == fate
        assert judge_residues([q for _, q in orbits[:-4]], residues[:-4]).fate == "undecided"


def test_growth_is_that_of_the_residues():
    periods = [5, 8, 13, 21]
    exact = judge_residues(periods, [0.25 * math.exp(-0.3 * q) for q in periods])
    # The logarithm is right to 1e-15.
    assert exact.growth == pytest.approx(-0.3, abs=1e-13)
    assert exact.error < 1e-13
    # Where all are rounding nothing else is known; one alone is taken to go on like the others.
    below = judge_residues([*periods, 34, 55, 89], [0.25 * math.exp(-1.5 * q) for q in [*periods, 34, 55, 89]])
    assert math.isnan(below.growth)
    assert below.fate == "survives"
    partly = judge_residues(periods, [0.25 * math.exp(-1.1 * q) for q in periods])
    assert partly.growth == pytest.approx(-1.1, abs=1e-12)


@pytest.mark.parametrize(
    ("periods", "residues", "fate"),
    [
        ([], [], "undecided"),
        ([2, 3], [1e-14, -1e-13], "undecided"),
        ([2, 3, 5], [1e-14, -1e-13, 2e-13], "survives"),
        # Every other orbit sees a symmetry: both kinds fall.
        ([13, 21, 34, 55], [3e-4, 1e-5, 2e-4, 5e-13], "survives"),
        # All are below 1/4, but they grow.
        ([5, 8, 13, 21], [1e-4, 1e-3, 1e-2, 0.1], "undecided"),
        # All are above it, but they fall.
        ([5, 8, 13, 21], [40.0, 30.0, 20.0, 10.0], "undecided"),
        ([5, 8, 13, 21], [0.26, 0.24, 0.26, 0.26], "undecided"),
        ([5, 8, 13, 21], [0.3, 3.0, 0.1, 9.0], "undecided"),
        ([2, 3, 5], [0.5, 2.0, 40.0], "broken"),
        ([2, 3, 5], [0.5, math.nan, 40.0], "undecided"),
    ],
)
def test_verdicts_on_residues(periods, residues, fate):
    assert judge_residues(periods, residues).fate == fate
