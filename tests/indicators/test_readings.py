import numpy as np
import pytest

from scanner import build_table, measure_orbits
from scanner.indicators.readings import digits_of


def test_digits_of_a_change() -> None:
    assert digits_of(np.array([1e-3, -1e-7, 0.0, 2.0])) == pytest.approx([3.0, 7.0, 16.0, -np.log10(2.0)], abs=1e-12)


def test_an_unknown_change_has_no_digits() -> None:
    assert np.isnan(digits_of(np.array([np.nan, np.inf]))).all()


def test_diffusion_is_unknown_where_the_winding_is() -> None:
    rng = np.random.default_rng(12)
    table = build_table("radial_harmonic", amplitude=0.054, harmonic=2)
    found = measure_orbits(table, rng.random(1500), 2 * rng.random(1500) - 1, bounces=1024)
    lost = (found.island_period > 0) & np.isnan(found.island_winding)
    assert lost.sum() > 0
    assert np.isnan(found.frequency_diffusion.where(lost, drop=True)).all()
    known = found.frequency_diffusion.where(~lost, drop=True)
    # A rotation number lies in (0, 1) and a winding in a turn: their changes are below one.
    assert ((known >= -16) & (known < 0.0)).all()
