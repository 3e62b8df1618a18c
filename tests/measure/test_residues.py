import math

import numpy as np
import pytest
from scipy.linalg import solve_banded

from scanner.bounce.resonances import residue
from scanner.measure.residues import convergents, critical_parameters, judge_residues

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
    """K = 0.971635406 (Greene 1979): the last curve, of golden rotation."""
    orbits = [(p, q) for p, q in convergents(GOLDEN, 1597) if q >= 89]
    errors = np.array(critical_parameters(standard_residue, orbits, 0.969, 0.973, tolerance=1e-11)) - 0.971635406
    # They fall by 1.63 from one orbit to the next (Greene), not evenly: the residue tends to 1/4 by turns.
    assert abs(errors[-1]) < 2e-7
    assert abs(errors[-1]) < abs(errors[0]) * 1.63 ** -len(errors[1:])


@pytest.mark.parametrize(("strength", "fate"), [(0.5, "survives"), (0.9, "survives"), (1.1, "broken"), (2.0, "broken")])
def test_golden_curve_of_the_standard_map_below_and_above(strength, fate):
    residues = [standard_residue(strength, p, q) for p, q in convergents(GOLDEN, 89)]
    assert judge_residues(residues) == fate


def test_near_the_break_there_is_no_verdict():
    residues = [standard_residue(0.9716, p, q) for p, q in convergents(GOLDEN, 55)]
    assert judge_residues(residues) == "undecided"


@pytest.mark.parametrize(
    ("residues", "fate"),
    [
        ([], "undecided"),
        ([1e-14, -1e-13], "undecided"),
        ([1e-14, -1e-13, 2e-13], "survives"),
        ([0.2, 0.3, 0.1, 0.01, 0.001, 0.01], "survives"),
        ([0.2, 0.3, 0.01, 0.001, 0.01, 0.3], "undecided"),
        ([0.3, 0.2, 0.3, 0.4, 0.6, 0.5], "broken"),
        ([0.3, 2.0, 40.0], "broken"),
        ([0.3, math.nan, 2.0], "undecided"),
    ],
)
def test_verdicts_on_residues(residues, fate):
    assert judge_residues(residues) == fate
