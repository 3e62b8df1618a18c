"""The indicators on the cat map and the standard map, where the answers are known."""

import math

import numpy as np
import pytest
from maps import cat_map, run_map, standard_map

from scanner.quantities import CHAOTIC, REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL

ORBITS = 1024


def start(seed: int) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    return rng.random(ORBITS), rng.random(ORBITS)


def test_cat_map_has_its_exponent() -> None:
    """ln((3 + sqrt 5) / 2) a step, uniformly (closed form)."""
    readings, verdicts = run_map(cat_map, *start(1), 1000)
    for reading in readings:
        # The map is linear: once the vector has turned, after the transient, only rounding is left.
        assert reading.exponent == pytest.approx(0.9624236501192069, abs=1e-12)
    assert all(np.all(verdict.code == CHAOTIC) for verdict in verdicts)


def test_standard_map_has_its_exponent_at_large_strength() -> None:
    """ln(K/2) + 1/(K^2 - 4) a step (Tomsovic and Lakshminarayan, arXiv:0706.1494, from memory)."""
    strength = 10.0
    readings, _ = run_map(standard_map(strength), *start(2), 4096)
    found = readings[-1].exponent
    error = found.std() / math.sqrt(ORBITS)
    # Four standard errors, and the next term of the expansion in 1 / K, which is below 1e-3.
    assert found.mean() == pytest.approx(math.log(strength / 2) + 1 / (strength**2 - 4), abs=4 * error + 1e-3)


def test_a_fully_chaotic_map_is_called_chaotic() -> None:
    """At K = 10 no island is left that a thousand points would find."""
    _, verdicts = run_map(standard_map(10.0), *start(3), 8192)
    for verdict in verdicts:
        assert np.mean(verdict.code == CHAOTIC) >= 0.995


def test_a_weakly_kicked_map_is_called_regular() -> None:
    """At K = 0.1 chaos fills less than 1 in 1e4 of the torus (width of the separatrix layer, exp(-pi^2 / sqrt K))."""
    _, verdicts = run_map(standard_map(0.1), *start(4), 8192)
    regular = np.isin(verdicts[-1].code, (REGULAR_ROTATIONAL, REGULAR_LIBRATIONAL))
    assert regular.mean() >= 0.99
    # The island about (1/2, 0) has half-width sqrt(K) / pi in p: area 4 sqrt(K) / pi^2 of the torus (pendulum); but
    # its rotation number is a whole one, which the register's periods do not hold: here all are rotational.
    assert np.mean(verdicts[-1].code == REGULAR_ROTATIONAL) >= 0.95


def test_a_mixed_map_is_neither() -> None:
    """Negative control: near its last invariant circle (Greene 1979) the map is mixed, and called so."""
    _, verdicts = run_map(standard_map(1.2), *start(5), 8192)
    chaotic = np.mean(verdicts[-1].code == CHAOTIC)
    assert 0.3 < chaotic < 0.7
