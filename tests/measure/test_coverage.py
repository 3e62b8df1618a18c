"""Whether errors are what they say: how often 95 % intervals cover the librational part of an ellipse.

It is e / E(e) of the section, and of the shell an integral over the directions of the chords (closed forms).
"""

import math

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import ellipe
from scipy.stats import t as student

from scanner import build_table
from scanner.indicators import orbit_numbers
from scanner.measure import section_points, table_numbers
from scanner.measure.fractions import ratio
from scanner.quantities import CHAOTIC, REGULAR_LIBRATIONAL

REPLICATES = 8
WIDTH = student.ppf(0.975, REPLICATES - 1)


def section_part(eccentricity):
    return eccentricity / ellipe(eccentricity**2)


def shell_part(eccentricity):
    def across(psi):
        u = eccentricity * abs(math.cos(psi)) / math.hypot(math.cos(psi), minor * math.sin(psi))
        return 2 / math.pi * (u * math.sqrt(1 - u * u) + math.asin(u))

    minor = math.sqrt(1 - eccentricity**2)
    return quad(across, 0, 2 * math.pi)[0] / (2 * math.pi)


def start_of(table, s, p):
    """Whether an orbit of an ellipse librates, and the mean of its chords before and after the start.

    It does where (1 - p^2)(sin^2 phi + b^2 cos^2 phi) exceeds b^2, phi the eccentric angle.
    """
    squared = 1.0 - table.parameters["eccentricity"] ** 2
    phi = 2 * np.pi * table.turns_from_arc(s)
    x, y = np.cos(phi), np.sqrt(squared) * np.sin(phi)
    along_x, along_y = -np.sin(phi), np.sqrt(squared) * np.cos(phi)
    speed, cosine = np.hypot(along_x, along_y), np.sqrt(1 - p**2)
    chord = np.zeros_like(p)
    for q in (p, -p):
        dx, dy = (q * along_x - cosine * along_y) / speed, (q * along_y + cosine * along_x) / speed
        chord -= (x * dx + y * dy / squared) / (dx**2 + dy**2 / squared)
    return (1 - p**2) * speed**2 > squared, chord


def test_start_of_an_orbit():
    """A chord through the foci of the ellipse is on the separatrix; the minor axis is a chord of length 2 b."""
    table = build_table("ellipse", eccentricity=0.6)
    librates, chord = start_of(table, np.array([0.25, 0.25, 0.25]), np.array([0.0, 0.5999, 0.6001]))
    assert librates.tolist() == [True, True, False]
    assert chord[0] == pytest.approx(1.6, rel=1e-12)


@pytest.mark.slow
@pytest.mark.parametrize("eccentricity", [0.3, 0.6, 0.9])
def test_intervals_cover_as_often_as_they_say(eccentricity):
    """1000 repeats have a standard deviation of 0.7 %: 93 to 97 % is three of them to either side."""
    table = build_table("ellipse", eccentricity=eccentricity)
    hits = np.zeros(2)
    pooled_hits = 0
    for seed in range(1000):
        s, p = section_points(table, seed, REPLICATES, 128)
        librates, chord = start_of(table, s, p)
        for number, (weight, truth) in enumerate(
            [(np.ones(128), section_part(eccentricity)), (chord, shell_part(eccentricity))]
        ):
            found = ratio(np.where(librates, weight, 0.0), weight, REPLICATES)
            hits[number] += abs(found.value - truth) <= WIDTH * found.stderr
        # The negative control: pieces of one sequence are not independent, and their spread is not the error.
        librates, _ = start_of(table, *section_points(table, seed, 1, 128))
        pooled = ratio(librates.astype(float), np.ones(128), REPLICATES)
        pooled_hits += abs(pooled.value - section_part(eccentricity)) <= WIDTH * pooled.stderr
    assert (0.93 <= hits / 1000).all()
    assert (hits / 1000 <= 0.97).all()
    assert pooled_hits / 1000 > 0.985


@pytest.mark.slow
def test_stored_errors_of_followed_orbits_cover_as_often_as_they_say():
    """Librating orbits, told by their measured rotation number of 1/2, are put in the place of the regular ones.

    200 repeats have a standard deviation of 1.5 %: two of them to either side.  After 512 bounces no orbit of 8192
    was on the wrong side of the separatrix.
    """
    table = build_table("ellipse", eccentricity=0.6)
    hits = np.zeros(2)
    for seed in range(200):
        orbits = orbit_numbers(table, *section_points(table, seed, REPLICATES, 128), 512)
        librates = abs(orbits["rotation_number"] - 0.5) < 0.005
        orbits |= {"verdict": np.where(librates, REGULAR_LIBRATIONAL, CHAOTIC), "island_period": 2 * librates}
        found = table_numbers(table, orbits, REPLICATES)
        for number, (name, truth) in enumerate([("area", section_part(0.6)), ("volume", shell_part(0.6))]):
            value, stderr = (found[f"regular_{name}_fraction{suffix}"] for suffix in ("", "_stderr"))
            hits[number] += abs(value - truth) <= WIDTH * stderr
    np.testing.assert_allclose(hits / 200, 0.95, atol=0.03)
