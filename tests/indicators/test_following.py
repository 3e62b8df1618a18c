"""Orbits that are left early say the same as orbits that are not."""

import math
from dataclasses import replace

import numpy as np
import pytest
from maps import run_map, standard_map

from scanner import build_table, measure_orbits
from scanner.indicators.schedule import make_schedule
from scanner.measure import section_points
from scanner.quantities import CHAOTIC, REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL

BOUNCES = 8192
TABLES = [("radial_harmonic", {"amplitude": 0.05, "harmonic": 3}), ("limacon", {"quadratic": 0.15})]


@pytest.fixture(scope="module", params=TABLES, ids=lambda table: table[0])
def both(request):
    """The same orbits of a mixed table, left early and followed to the end."""
    family, parameters = request.param
    table = build_table(family, **parameters)
    s, p = section_points(table, seed=5, replicates=1, orbits=512)
    return tuple(measure_orbits(table, s, p, BOUNCES, adaptive=adaptive) for adaptive in (True, False))


def is_regular(verdict):
    return np.isin(verdict, (REGULAR_ROTATIONAL, REGULAR_LIBRATIONAL))


def test_leaving_early_costs_a_quarter(both):
    early, full = both
    assert np.all(full.bounces_used == BOUNCES)
    # 0.16 and 0.23 on these tables; the regular share of the section decides.
    assert early.bounces_used.mean() < 0.3 * BOUNCES
    assert set(np.unique(early.bounces_used)) <= set(early.horizon.values)


def test_verdicts_are_those_of_orbits_followed_to_the_end(both):
    early, full = both
    left = early.bounces_used < BOUNCES
    assert np.array_equal(is_regular(early.verdict)[left], is_regular(full.verdict)[left])
    assert np.array_equal((early.verdict == CHAOTIC)[left], (full.verdict == CHAOTIC)[left])
    # What is not left early gets the very same bounces.
    assert np.array_equal(early.verdict[~left], full.verdict[~left])


def test_the_fan_of_horizons_is_that_of_orbits_followed_to_the_end(both):
    """A shear stays one and exponential growth cannot be taken back: a verdict that was clear holds later, too."""
    early, full = (is_regular(found.verdict_by_horizon).mean(axis=0) for found in both)
    # Single orbits are called undecided or regular for a horizon or two; nothing may shift on the whole.
    assert early == pytest.approx(full, abs=3 / 512)
    assert early[-1] == full[-1]


def test_a_chaotic_orbit_tells_what_it_did_up_to_the_common_horizon():
    family, parameters = TABLES[0]
    table = build_table(family, **parameters)
    s, p = section_points(table, seed=6, replicates=1, orbits=192)
    found = measure_orbits(table, s, p, BOUNCES)
    chaotic = (found.verdict == CHAOTIC).values
    assert 0.5 < chaotic.mean() < 1.0
    common = make_schedule(BOUNCES).horizons[make_schedule(BOUNCES).common]
    short = measure_orbits(table, s, p, common, adaptive=False)
    for name in ("lyapunov_per_bounce", "rotation_number", "agreement_digits"):
        assert np.array_equal(found[name][chaotic], short[name][chaotic]), name
    # Of an orbit that seems regular the mean chord is a weighted one, and the leading frequency that in its island.
    clear = chaotic & (short.verdict == CHAOTIC).values
    for name in ("mean_chord", "frequency_diffusion"):
        assert np.array_equal(found[name][clear], short[name][clear]), name
    longer = measure_orbits(table, s, p, BOUNCES, exponent_bounces=2 * common)
    assert longer.bounces_used[chaotic].min() == 2 * common


def test_exponents_have_no_bias_from_when_orbits_are_found_out():
    """Those of a common horizon have the mean of long ones; those read when an orbit stands out have a larger one."""
    rng = np.random.default_rng(8)
    steps, size = 8192, 2048
    x, p = rng.random(size), rng.random(size)
    readings, verdicts = run_map(standard_map(1.2), x, p, steps)
    chaotic = verdicts[-1].code == CHAOTIC
    common = readings[make_schedule(steps).common].exponent[chaotic]
    long = readings[-1].exponent[chaotic]
    error = math.hypot(common.std(), long.std()) / math.sqrt(chaotic.sum())
    assert common.mean() == pytest.approx(long.mean(), abs=4 * error)

    # Negative control, with horizons close to where orbits stand out: 32, 64, 128 and 256 steps.
    readings, verdicts = run_map(standard_map(1.2), x, p, 256)
    codes = np.array([verdict.code for verdict in verdicts])[:, chaotic]
    first = np.argmax(codes == CHAOTIC, axis=0)
    found = np.any(codes == CHAOTIC, axis=0)
    biased = np.array([reading.exponent[chaotic] for reading in readings])[first[found], np.flatnonzero(found)]
    assert biased.mean() > long.mean() + 4 * biased.std() / math.sqrt(found.sum())


def test_nothing_depends_on_the_unit_of_length_or_on_the_place():
    """A mixed table in other units and far from the origin: the same bits, chords and exponents in proportion."""
    family, parameters = TABLES[1]
    one = build_table(family, **parameters)
    s, p = section_points(one, seed=7, replicates=1, orbits=256)
    found = measure_orbits(one, s, p, 1024)
    unit = 1024.0
    harmonics = unit * one.harmonics
    harmonics[[0, 2], 0] += 3.0e5
    other = replace(one, harmonics=harmonics, perimeter=unit * one.perimeter, area=unit**2 * one.area)
    there = measure_orbits(other, s, p, 1024)
    assert {CHAOTIC, REGULAR_ROTATIONAL, REGULAR_LIBRATIONAL} <= set(found.verdict.values)
    for name in ("verdict", "bounces_used", "rotation_number", "lyapunov_per_bounce", "island_winding"):
        assert np.array_equal(there[name], found[name], equal_nan=True), name
    assert np.array_equal(there.mean_chord, unit * found.mean_chord, equal_nan=True)
