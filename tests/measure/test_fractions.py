"""The reductions against formulas of elementary statistics."""

import math

import numpy as np
import pytest

from scanner import build_table
from scanner.measure import table_numbers
from scanner.measure.fractions import ratio
from scanner.quantities import CHAOTIC, PERIODS, REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL, UNDECIDED, in_group


def test_error_of_a_mean_is_the_textbook_one() -> None:
    values = np.random.default_rng(1).random(80)
    found = ratio(values, np.ones(80), 8)
    means = values.reshape(8, 10).mean(axis=1)
    assert found.value == pytest.approx(values.mean(), rel=1e-14)
    assert found.replicates == pytest.approx(means, rel=1e-14)
    assert found.stderr == pytest.approx(means.std(ddof=1) / math.sqrt(8), rel=1e-12)


def test_error_of_a_ratio_covers_the_truth() -> None:
    """95 % intervals by Student's t with 7 degrees of freedom (2.365) over 400 seeded repeats of a known ratio."""
    rng = np.random.default_rng(2)
    hits = 0
    for _ in range(400):
        below = 1.0 + rng.random(160)
        above = below * (rng.random(160) < 0.3)
        found = ratio(above, below, 8)
        hits += abs(found.value - 0.3) <= 2.365 * found.stderr
    # 400 trials of probability 0.95 have a standard deviation of 1.1 %: three of them.
    assert hits / 400 == pytest.approx(0.95, abs=0.033)


def test_nothing_counted_is_not_a_number() -> None:
    found = ratio(np.zeros(4), np.zeros(4), 2)
    assert math.isnan(found.value)
    assert math.isnan(found.stderr)


def orbits(verdict: list[int]) -> dict[str, np.ndarray]:
    size = len(verdict)
    return {
        "verdict": np.array(verdict, dtype=np.int8),
        "verdict_by_horizon": np.array([[REGULAR_ROTATIONAL, code] for code in verdict], dtype=np.int8),
        "island_period": np.where(np.array(verdict) == REGULAR_LIBRATIONAL, 3, 0).astype(np.int16),
        "lyapunov_per_bounce": np.linspace(0.1, 0.8, size),
        "mean_chord": np.linspace(1.0, 2.0, size),
        "bounces_used": np.full(size, 512),
        "frequency_diffusion": -np.arange(size, dtype=float),
        "p0": np.linspace(-0.99, 0.99, size),
        "rotation_number": np.linspace(0.9, 0.1, size),
    }


def test_numbers_of_a_table_by_hand() -> None:
    table = build_table("ellipse", eccentricity=0.3)
    verdict = [
        REGULAR_ROTATIONAL,
        CHAOTIC,
        REGULAR_LIBRATIONAL,
        UNDECIDED,
        CHAOTIC,
        CHAOTIC,
        REGULAR_ROTATIONAL,
        CHAOTIC,
    ]
    given = orbits(verdict)
    found = table_numbers(table, given, 2)
    chord, exponent = given["mean_chord"], given["lyapunov_per_bounce"]
    chaotic = np.array(verdict) == CHAOTIC
    regular = np.isin(verdict, (REGULAR_ROTATIONAL, REGULAR_LIBRATIONAL))
    assert found["regular_area_fraction"] == 3 / 8
    assert found["regular_area_fraction_replicates"] == pytest.approx([2 / 4, 1 / 4])
    assert found["regular_area_fraction_stderr"] == pytest.approx(1 / 8)
    assert found["regular_volume_fraction"] == pytest.approx(chord[regular].sum() / chord.sum())
    assert found["regular_area_fraction_by_horizon"] == pytest.approx([1.0, 3 / 8])
    assert found["chaotic_area_fraction"] == 4 / 8
    assert found["undecided_area_fraction"] == 1 / 8
    assert found["rotational_area_fraction"] == 2 / 8
    assert found["librational_area_fraction"] == 1 / 8
    assert found["island_area_fraction"][PERIODS.index(3)] == 1 / 8
    assert found["island_area_fraction"].sum() == 1 / 8
    assert found["island_area_fraction_stderr"][PERIODS.index(3)] == pytest.approx(1 / 8)
    assert found["island_volume_fraction"].sum() == pytest.approx(chord[2] / chord.sum())
    assert found["lyapunov_per_bounce"] == pytest.approx(exponent[chaotic].mean())
    assert found["lyapunov_per_length"] == pytest.approx(exponent[chaotic].sum() / chord[chaotic].sum())
    assert found["entropy_per_bounce"] == pytest.approx(exponent[chaotic].sum() / 8)
    assert found["diffusion_median"] == np.median([-1, -4, -5, -7])
    assert found["mean_chord"] == pytest.approx(1.5)
    assert found["bounces_used"] == 8 * 512
    # Bins of |p|, a tenth each; 0.99 is shared by the first and the last orbit, 0.707 by a chaotic and a regular one.
    by_p = found["regular_area_fraction_by_p"]
    np.testing.assert_array_equal(by_p[10:], [np.nan, 0.0, np.nan, np.nan, 0.5, np.nan, np.nan, 0.5, np.nan, 0.5])
    np.testing.assert_array_equal(by_p, by_p[::-1])
    assert (found["symmetry_order"], found["mirror_s"]) == (2, 0.0)
    assert set(found) == {entry.name for entry in in_group("root")} - {"table_status"}


def test_an_orbit_that_was_lost_still_takes_up_room() -> None:
    table = build_table("ellipse", eccentricity=0.3)
    given = orbits([REGULAR_ROTATIONAL, UNDECIDED])
    given["mean_chord"] = np.array([1.0, np.nan])
    found = table_numbers(table, given, 2)
    assert found["regular_volume_fraction"] == pytest.approx(1.0 / (1.0 + table.mean_chord_exact))
