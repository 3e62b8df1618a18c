"""Single bounces against an independent solution in 40 digits, on every analytic family, glancing included."""

import numpy as np
import pytest
from slow_bounce import slow_bounce

from scanner.bounce.bracket import bracket_half_advance
from scanner.bounce.chord import divide_out_start
from scanner.bounce.lanes import COSINE, LANES, RAY_X, RAY_Y, STATE_ROWS, TANGENT_X, TANGENT_Y
from scanner.bounce.orbits import start_block
from scanner.bounce.series import make_plan
from scanner.bounce.trace import T_ADVANCE, T_CHORD, T_FAILED, T_P, T_PP, T_PS, T_SP, T_SS, follow
from scanner.tables import build_table

TABLES = {
    "circle": ("ellipse", {"eccentricity": 0.0}),
    "ellipse": ("ellipse", {"eccentricity": 0.9}),
    "radial 2 at its limit": ("radial_harmonic", {"amplitude": 0.2, "harmonic": 2}),
    "radial 5 at its limit": ("radial_harmonic", {"amplitude": 1 / 26, "harmonic": 5}),
    "normal": ("normal_harmonic", {"eccentricity": 0.5, "amplitude": 0.02, "harmonic": 3, "phase": 0.4}),
    "confocal": ("confocal_harmonic", {"eccentricity": 0.6, "amplitude": 0.03, "harmonic": 4, "phase": 1.0}),
    "support": ("support_harmonic", {"eccentricity": 0.3, "amplitude": 0.01, "harmonic": 5, "phase": 0.2}),
    "curvature": ("curvature_harmonic", {"amplitude": 0.7, "harmonic": 4}),
    "limacon at its limit": ("limacon", {"quadratic": 0.25}),
    "lame": ("lame", {"exponent": 2.5, "aspect": 0.8}),
    "random": (
        "random_harmonic",
        {"eccentricity": 0.4, "amplitude": 0.01, "decay": 3.0, "harmonic_max": 12, "realisation": 7},
    ),
}
GLANCING = (1 - 1e-10, -1 + 1e-10, 1 - 1e-6, -1 + 1e-6, 0.999, -0.999)


@pytest.mark.parametrize("name", TABLES)
def test_bounce_agrees_with_forty_digits(name: str) -> None:
    family, parameters = TABLES[name]
    harmonics = build_table(family, **parameters).harmonics
    # A smooth table takes a second to solve in 40 digits for each orbit of its hundreds of harmonics.
    count = 10 if harmonics.shape[1] < 100 else 4
    rng = np.random.default_rng(5)
    turns = rng.random(count)
    # Zero curvature sits at simple fractions of a turn on the tables at their limit.
    turns[:4] = (0.25, 0.5, 0.1, 0.0)
    p = np.resize(GLANCING, count) if count < 10 else np.concatenate([GLANCING, 2 * rng.random(count - 6) - 1])
    fast = follow(harmonics, turns, p, 1)[1]
    assert not fast[T_FAILED].any()
    for i in range(count):
        slow = slow_bounce(harmonics, turns[i], p[i])
        # Ten roundings of numbers of order one, 1e-15, and as many more as curvature is amplified by harmonics.
        assert fast[T_ADVANCE, i] == pytest.approx(slow.advance, abs=1e-13)
        assert fast[T_P, i] == pytest.approx(slow.p, abs=1e-13)
        assert fast[T_CHORD, i] == pytest.approx(slow.chord, abs=1e-13)
        # Relative to its largest entry, the map loses the digits that 1 / cos of a glancing angle takes: 1e-5 of 1.
        found = np.array([[fast[T_SS, i], fast[T_SP, i]], [fast[T_PS, i], fast[T_PP, i]]])
        assert np.abs(found - slow.tangent_map).max() <= 1e-9 * np.abs(slow.tangent_map).max()


def test_the_slow_bounce_notices_a_wrong_answer() -> None:
    """Negative control: the neighbouring table must not pass for this one."""
    harmonics = build_table("limacon", quadratic=0.15).harmonics
    other = build_table("limacon", quadratic=0.15 + 1e-11).harmonics
    fast = follow(harmonics, np.array([0.3]), np.array([0.2]), 1)[1]
    assert abs(fast[T_P, 0] - slow_bounce(other, 0.3, 0.2).p) > 1e-13


def test_orbits_that_newton_cannot_follow_are_bisected() -> None:
    """From a point of zero curvature a glancing chord ends where the fast path's guess is far off."""
    harmonics = build_table("radial_harmonic", amplitude=1 / 37, harmonic=6).harmonics
    p = 1.0 - np.logspace(-14, -1, 64)
    turns = np.full(64, 1 / 12)
    fast = follow(harmonics, turns, p, 1)[1]
    assert not fast[T_FAILED].any()
    assert np.all(np.diff(fast[T_ADVANCE]) > 0.0)
    for i in (0, 8, 24, 40):
        assert fast[T_ADVANCE, i] == pytest.approx(slow_bounce(harmonics, 1 / 12, p[i]).advance, abs=1e-12)


def test_bisection_finds_what_newton_finds() -> None:
    harmonics = build_table("radial_harmonic", amplitude=0.15, harmonic=2).harmonics.copy()
    rng = np.random.default_rng(8)
    turns, p = rng.random(LANES), 2 * rng.random(LANES) - 1
    state, highest = np.empty((STATE_ROWS, LANES)), harmonics.shape[1] - 1
    quotient = np.empty((2 * highest + 4, LANES))
    start_block(harmonics, turns, p, state)
    cosine, (x, y) = state[COSINE], state[[TANGENT_X, TANGENT_Y]]
    state[RAY_X], state[RAY_Y] = x * p - y * cosine, x * cosine + y * p
    divide_out_start(make_plan(harmonics), state, quotient, LANES)
    fast = follow(harmonics, turns, p, 1)[1]
    for lane in range(LANES):
        # The estimate handed over lies outside (0, pi), so that nothing of it can be kept.
        found, half_cos, half_sin = bracket_half_advance(highest, quotient, lane, 0.6, -0.8)
        assert found
        # Both solve the same equation to rounding.
        assert np.arctan2(half_sin, half_cos) / np.pi == pytest.approx(fast[T_ADVANCE, lane], abs=1e-15)


def test_bisection_says_when_there_is_no_chord() -> None:
    """A quotient that does not change sign belongs to no convex table."""
    quotient = np.zeros((6, LANES))
    quotient[2] = -1.0  # g(h) = -cos(h) + ... has the wrong sign at pi once the second term outweighs the first
    quotient[4] = 3.0
    found, _, _ = bracket_half_advance(2, quotient, 0, 0.6, -0.8)
    assert not found
