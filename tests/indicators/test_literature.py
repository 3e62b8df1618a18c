"""Numbers of the literature that need many orbits or long ones."""

import math

import numpy as np
import pytest
from maps import run_map
from stadium import AREA, PERIMETER, stadium

from scanner import build_table, survey_table
from scanner.quantities import CHAOTIC


def test_exponent_of_the_stadium() -> None:
    """0.43 per unit length for unit half-circles and sides of length 2.

    Benettin and Strelcyn, Phys. Rev. A 17:773, 1978, and Dellago and Posch, Phys. Rev. E 52:2401, 1995 (both from
    memory); 0.937 a bounce and 0.430 per length were computed independently.
    """
    rng = np.random.default_rng(21)
    readings, verdicts = run_map(stadium, PERIMETER * rng.random(512), 2 * rng.random(512) - 1, 4096)
    exponent = readings[-1].exponent
    error = exponent.std() / math.sqrt(512)
    # Four standard errors, and half a unit of the last digit that is known.
    assert exponent.mean() == pytest.approx(0.937, abs=4 * error + 5e-4)
    # Abramov: per length it is the exponent over the mean chord pi A / L of the one component.
    assert exponent.mean() / (math.pi * AREA / PERIMETER) == pytest.approx(0.430, abs=4 * error + 5e-4)
    # A stadium is ergodic (Bunimovich 1979); orbits between its parallel sides stay there for long.
    assert np.mean(verdicts[-1].code == CHAOTIC) >= 0.995


@pytest.mark.slow
def test_regular_part_of_a_limacon_at_a_long_horizon() -> None:
    """Shell fraction 0.175 at lam = 0.15 (Batistic and Robnik, J. Phys. A 43:215101, 2010, from memory)."""
    table = build_table("limacon", quadratic=0.15)
    found = survey_table(table, orbits=2048, bounces=100_000, replicates=8, seed=31)
    error = found.regular_volume_fraction_stderr.item()
    assert error < 0.008
    assert found.regular_volume_fraction.item() == pytest.approx(0.175, abs=2.4 * error)
    # Negative control: a single-orbit box count gave 0.360 for this table, far outside the error.
    assert abs(found.regular_volume_fraction.item() - 0.360) > 10 * error


@pytest.mark.slow
def test_orbits_stick_to_islands() -> None:
    """The regular part falls with the horizon n like n^-(g - 1), g near 1.3 to 1.6 (common practice, no one source)."""
    table = build_table("limacon", quadratic=0.15)
    found = survey_table(table, orbits=8192, bounces=16_000, replicates=8, seed=32)
    fractions = found.regular_area_fraction_by_horizon.values
    assert np.all(np.diff(fractions) < 0.0)
    # The last value, and what is left at infinity, is above 0.19: what still falls does so as a power of n.
    falls = -np.diff(fractions)
    power = np.polyfit(np.log(found.horizon.values[:-1]), np.log(falls), 1)[0]
    # Three differences of a few dozen orbits each: the exponent is known to about 0.4.
    assert -1.2 < power < 0.0
