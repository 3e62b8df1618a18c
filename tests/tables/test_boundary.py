import hashlib

import numpy as np
import pytest

from scanner.tables import build_table
from scanner.tables.boundary import evaluate, fourier_series
from scanner.tables.curve import trim


@pytest.mark.parametrize("count", [17, 64, 100, 255])
def test_series_of_samples_gives_back_the_coefficients(count):
    rng = np.random.default_rng(3)
    highest = (count - 1) // 2
    harmonics = np.zeros((4, highest + 1))
    harmonics[:, 1:] = rng.normal(size=(4, highest))
    harmonics[[0, 2], 0] = 5.0, -3.0
    x, y = evaluate(harmonics, np.arange(count) / count)[:2]
    found = np.concatenate([fourier_series(x, highest), fourier_series(y, highest)])
    # Harmonic k is a product of k factors, each rounded to 1e-16.
    assert np.abs(found - harmonics).max() < 4e-16 * count


def test_series_of_samples_keeps_small_harmonics_beside_large_ones():
    turns = np.arange(256) / 256
    samples = 1e6 + 1e-9 * np.cos(2 * np.pi * 3 * turns)
    found = fourier_series(samples, 5)
    assert found[0, 0] == pytest.approx(1e6, rel=1e-15)
    assert found[0, 3] == pytest.approx(1e-9, abs=2e-11)  # samples of 1e6 are rounded to 1.2e-10, 256 of them averaged
    assert np.abs(np.delete(found, 3, axis=1)[:, 1:]).max() < 2e-11


def test_derivatives_are_those_of_differences():
    table = build_table("radial_harmonic", amplitude=0.1, harmonic=3)
    step = 1e-4
    ahead, at, behind = (evaluate(table.harmonics, np.array([0.2 + k * step])) for k in (1, 0, -1))
    angle = 2 * np.pi * step
    # Truncation (64 / 6) angle^2 = 4e-6 for harmonic 4 of size 0.05.
    assert (ahead[:2] - behind[:2]) / (2 * angle) == pytest.approx(at[2:4], abs=1e-6)
    assert (ahead[2:4] - behind[2:4]) / (2 * angle) == pytest.approx(at[4:6], abs=1e-5)


def test_trimming_drops_what_adds_up_to_less_than_the_tolerance():
    harmonics = np.zeros((4, 40))
    harmonics[0, 1:] = 10.0 ** -np.arange(39.0)
    assert trim(harmonics).shape == (4, 16)  # 1e-14 and what follows add up to 1.1e-14: kept, the rest is not


def test_arrays_of_a_table_cannot_be_written():
    table = build_table("ellipse", eccentricity=0.5)
    for array in (table.harmonics, table.arc):
        assert array.flags.c_contiguous
        with pytest.raises(ValueError, match="read-only"):
            array[0, 0] = 1.0


def test_points_have_the_shape_of_the_arc_lengths():
    table = build_table("ellipse", eccentricity=0.6)
    x, y = table.point(np.zeros((2, 3)))
    assert x.shape == y.shape == (2, 3)
    assert table.point(0.0)[0] == 1.0
    assert table.point(0.25)[1] == pytest.approx(0.8, rel=1e-15)  # by symmetry


def test_bits_are_those_of_every_other_processor():
    # computed here; any processor must give the same bits
    table = build_table("random_harmonic", eccentricity=0.6, amplitude=0.01, decay=2.5, harmonic_max=9, realisation=3)
    sizes = repr((table.perimeter, table.area, table.curvature_min, table.curvature_max)).encode()
    digest = hashlib.sha256(table.harmonics.tobytes() + table.arc.tobytes() + sizes)
    assert digest.hexdigest()[:16] == "fb803d351c4e0d89"
