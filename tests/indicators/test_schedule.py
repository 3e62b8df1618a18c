import math

import numpy as np
import pytest

from scanner.indicators.schedule import horizons, make_schedule, window_weights


def test_horizons_are_an_eighth_a_quarter_a_half_and_all() -> None:
    assert horizons(8192) == (1024, 2048, 4096, 8192)
    assert horizons(1001) == (125, 250, 500, 1001)


@pytest.mark.parametrize("bounces", [64, 1001, 8192])
def test_windows_of_a_horizon_lie_where_they_must(bounces: int) -> None:
    schedule = make_schedule(bounces)
    for end, (whole, first, second) in zip(schedule.horizons, schedule.of_window, strict=True):
        half = end // 2
        assert schedule.windows[whole, :2].tolist() == [0, end]
        assert schedule.windows[first, :2].tolist() == [end - 2 * half, half]
        assert schedule.windows[second, :2].tolist() == [end - half, half]
    for _, length, offset in schedule.windows:
        # A sum of numbers rounded to 1e-16 of their own size.
        assert schedule.weights[offset : offset + length].sum() == pytest.approx(1.0, abs=1e-14)
    for end, (settled, last) in zip(schedule.horizons, schedule.of_mark, strict=True):
        assert schedule.marks[[settled, last]].tolist() == [end // 8, end]


def test_powers_of_two_share_windows() -> None:
    """Nine windows where 12 would be needed: the first half of a horizon is the whole of the one before."""
    assert len(make_schedule(8192).windows) == 9


def test_weighted_average_of_a_rotation_converges_fast() -> None:
    """A plain mean of cos(2 pi n rho) over N terms is of order 1 / N; the weighted one is at rounding (Das et al.)."""
    n = np.arange(2000)
    signal = 0.25 + np.cos(2 * math.pi * n * (math.sqrt(5) - 1) / 2)
    assert abs(signal.mean() - 0.25) > 1e-5
    # 2000 terms of order one, each rounded.
    assert abs(np.sum(window_weights(2000) * signal) - 0.25) < 1e-14
