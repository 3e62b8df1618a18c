import numpy as np
import pytest
from scipy.stats import kstest

from scanner import build_table
from scanner.errors import StudyError
from scanner.measure import section_points

TABLE = build_table("ellipse", eccentricity=0.5)


def test_points_do_not_depend_on_how_they_are_cut() -> None:
    s, p = section_points(TABLE, 7, 4, 400)
    pieces = [section_points(TABLE, 7, 4, 400, start, min(start + 64, 400)) for start in range(0, 400, 64)]
    assert np.array_equal(s, np.concatenate([piece[0] for piece in pieces]))
    assert np.array_equal(p, np.concatenate([piece[1] for piece in pieces]))


def test_points_lie_inside_the_fundamental_part() -> None:
    s, p = section_points(TABLE, 1, 8, 8192)
    assert s.min() > 0.0
    assert s.max() < 0.25
    assert p.min() > 0.0
    assert p.max() < 1.0


@pytest.mark.parametrize(
    ("family", "parameters"),
    [
        ("support_harmonic", {"eccentricity": 0.5, "amplitude": 0.01, "harmonic": 3, "phase": 0.5}),
        ("normal_harmonic", {"eccentricity": 0.0, "amplitude": 0.02, "harmonic": 3, "phase": -2.0}),
        ("limacon", {"quadratic": 0.1}),
    ],
)
def test_points_are_spread_more_evenly_than_chance(family: str, parameters: dict[str, float]) -> None:
    table = build_table(family, **parameters)
    symmetry = table.symmetry
    s, p = section_points(table, 1, 1, 1024)
    # Common practice: the discrepancy of 1024 Sobol' points is a few in a thousand, of random ones 1 / sqrt(1024).
    assert kstest((s - symmetry.start) % 1.0 / symmetry.width, "uniform").statistic < 0.005
    assert kstest(p, "uniform").statistic < 0.005


def test_seed_table_and_replicate_each_change_the_points() -> None:
    other = build_table("ellipse", eccentricity=0.5000001)
    first = section_points(TABLE, 7, 2, 128)[0]
    assert not np.array_equal(first, section_points(TABLE, 8, 2, 128)[0])
    assert not np.array_equal(first, section_points(other, 7, 2, 128)[0])
    assert not np.array_equal(first[:64], first[64:])


def test_unequal_shares_are_refused() -> None:
    with pytest.raises(StudyError, match="multiple of 8"):
        section_points(TABLE, 1, 8, 100)
