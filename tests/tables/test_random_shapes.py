import math

import numpy as np
import pytest

from scanner.tables import build_table
from scanner.tables.boundary import evaluate

SHAPE = {"eccentricity": 0.6, "decay": 2.0, "harmonic_max": 10}


def displacement(table, turns):
    """Distance of the boundary from the ellipse along the ellipse's normal."""
    x, y = evaluate(table.harmonics, turns)[:2]
    cosine, sine = np.cos(2 * np.pi * turns), np.sin(2 * np.pi * turns)
    u, v = 0.8 * cosine, sine
    return ((x - cosine) * u + (y - 0.8 * sine) * v) / np.hypot(u, v)


def slow_displacement(turns, amplitude, decay, harmonic_max, realisation):
    """The same from the generator's bits with plain library functions."""
    bits = np.random.PCG64(np.random.SeedSequence(realisation))
    total, square = np.zeros_like(turns), 0.0
    for k in range(2, harmonic_max + 1):
        first, second = ((int(bits.random_raw()) >> 11) + shift for shift in (1, 0))
        radius = math.sqrt(-2 * math.log(first / 2**53)) * k**-decay
        phase = 2 * math.pi * second / 2**53
        total += radius * np.cos(2 * np.pi * k * turns - phase)
        square += radius**2 / 2
    return amplitude * total / math.sqrt(square)


def test_displacement_is_that_of_the_slow_twin():
    table = build_table("random_harmonic", amplitude=0.01, realisation=7, **SHAPE)
    turns = np.arange(500) / 500
    slow = slow_displacement(turns, 0.01, 2.0, 10, 7)
    assert np.abs(displacement(table, turns) - slow).max() < 2e-14  # harmonics below 1e-14 are left out


def test_amplitude_is_the_root_mean_square_and_scales_one_shape():
    turns = np.arange(500) / 500
    small, large = (
        displacement(build_table("random_harmonic", amplitude=a, realisation=7, **SHAPE), turns) for a in (0.001, 0.02)
    )
    assert np.sqrt((large**2).mean()) == pytest.approx(0.02, rel=1e-11)
    assert np.abs(20 * small - large).max() < 20 * 2e-14


def test_a_shape_has_no_constant_and_no_first_harmonic():
    table = build_table("random_harmonic", amplitude=0.02, realisation=3, **SHAPE)
    spectrum = np.abs(np.fft.rfft(displacement(table, np.arange(64) / 64))) / 32
    assert spectrum[:2].max() < 1e-13
    assert spectrum[2:11].min() > 1e-6
    assert spectrum[11:].max() < 1e-13


def test_realisations_differ_and_repeat():
    shapes = [build_table("random_harmonic", amplitude=0.01, realisation=n, **SHAPE).harmonics for n in (0, 1, 0)]
    assert not np.array_equal(shapes[0][:, :8], shapes[1][:, :8])
    assert np.array_equal(shapes[0], shapes[2])


def test_coefficients_are_gaussian_and_fall_as_they_should():
    # Ratios of harmonics 2 and 3 over many realisations: their squares are exponential with means 1 and (3/2)^-2 decay.
    squares = []
    for realisation in range(400):
        table = build_table(
            "random_harmonic", eccentricity=0.0, amplitude=0.01, decay=1.0, harmonic_max=3, realisation=realisation
        )
        spectrum = np.abs(np.fft.rfft(np.hypot(*evaluate(table.harmonics, np.arange(16) / 16)[:2]) - 1)) ** 2
        squares.append(spectrum[2] / (spectrum[2] + spectrum[3] * 9 / 4))
    # The share of one of two equal exponential variables is uniform: mean 1/2, standard error 1 / sqrt(12 * 400).
    assert np.mean(squares) == pytest.approx(0.5, abs=4 / math.sqrt(12 * 400))
    assert np.mean(np.square(squares)) == pytest.approx(1 / 3, abs=4 * math.sqrt(4 / 45 / 400))
