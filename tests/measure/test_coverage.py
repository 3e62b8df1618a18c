"""Whether errors are what they say: how often 95 % intervals cover the librational part of an ellipse.

It is e / E(e) of the section, and of the shell an integral over the directions of the chords (closed forms).
"""

import numpy as np
import pytest
from librating import section_part, shell_part, start_of
from scipy.stats import t as student

from scanner import build_table
from scanner.indicators import orbit_numbers
from scanner.measure import section_points, table_numbers
from scanner.measure.fractions import ratio
from scanner.quantities import CHAOTIC, REGULAR_LIBRATIONAL

REPLICATES = 8
WIDTH = student.ppf(0.975, REPLICATES - 1)


def test_start_of_an_orbit():
    """A chord through the foci of the ellipse is on the separatrix; the minor axis is a chord of length 2 b."""
    table = build_table("ellipse", eccentricity=0.6)
    librates, chord = start_of(table, np.array([0.25, 0.25, 0.25]), np.array([0.0, 0.5999, 0.6001]))
    assert librates.tolist() == [True, True, False]
    assert chord[0] == pytest.approx(1.6, rel=1e-12)


@pytest.mark.slow
@pytest.mark.parametrize("eccentricity", [0.3, 0.6, 0.9])
def test_intervals_cover_as_often_as_they_say(eccentricity):
    """800 repeats have a standard deviation of 0.8 %: 93 to 97 % is two and a half of them to either side."""
    table = build_table("ellipse", eccentricity=eccentricity)
    hits = np.zeros(2)
    pooled_hits = 0
    for seed in range(800):
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
    assert (0.93 <= hits / 800).all()
    assert (hits / 800 <= 0.97).all()
    assert pooled_hits / 800 > 0.985


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
