import math

import numpy as np
import pytest

from scanner.indicators.schedule import horizons, make_schedule, quick_weights, window_weights

WEIGHTS = (quick_weights, window_weights)


def test_horizons_double_up_to_all_the_bounces() -> None:
    assert horizons(8192) == (512, 1024, 2048, 4096, 8192)
    assert horizons(100_000) == (781, 1562, 3125, 6250, 12500, 25000, 50000, 100_000)
    # An eighth, a quarter, a half and all of them, however few.
    assert horizons(1001) == (125, 250, 500, 1001)


def test_exponents_are_measured_over_an_eighth_or_what_is_asked_for() -> None:
    assert make_schedule(8192).common == 1
    assert make_schedule(65536).common == horizons(65536).index(8192)
    assert make_schedule(8192, 3000).common == horizons(8192).index(4096)
    assert make_schedule(700).common == 3
    assert make_schedule(8192, adaptive=False).common == 4


@pytest.mark.parametrize("bounces", [64, 1001, 8192])
def test_windows_of_a_horizon_lie_where_they_must(bounces: int) -> None:
    schedule = make_schedule(bounces)
    for end, of_horizon in zip(schedule.horizons, schedule.of_window, strict=True):
        half, most = end // 2, end - end // 4
        halves = [[0, half], [end - half, half]]
        spans = schedule.windows[list(of_horizon), :2].tolist()
        assert spans == [*halves, [0, end], *halves, [0, most], [end - most, most]]
    for _, length, offset in schedule.windows:
        # A sum of numbers rounded to 1e-16 of their own size.
        assert schedule.weights[offset : offset + length].sum() == pytest.approx(1.0, abs=1e-14)
    for end, (settled, last) in zip(schedule.horizons, schedule.of_mark, strict=True):
        assert schedule.marks[[settled, last]].tolist() == [end // 8, end]


@pytest.mark.parametrize("bounces", [1001, 8192, 100_000])
def test_the_first_half_is_the_whole_of_the_horizon_before(bounces: int) -> None:
    of_window = make_schedule(bounces).of_window
    assert [windows[3] for windows in of_window[1:]] == [windows[2] for windows in of_window[:-1]]


def test_weighted_average_of_a_rotation_converges_fast() -> None:
    """A plain mean of cos(2 pi n rho) over N terms is of order 1 / N; the weighted one is at rounding (Das et al.)."""
    n = np.arange(2000)
    signal = 0.25 + np.cos(2 * math.pi * n * (math.sqrt(5) - 1) / 2)
    assert abs(signal.mean() - 0.25) > 1e-5
    # 2000 terms of order one, each rounded.
    assert abs(np.sum(window_weights(2000) * signal) - 0.25) < 1e-14


def test_quick_weights_make_more_of_few_bounces() -> None:
    """Hann windows of order h have errors that fall like T^-(2 h + 2) (Laskar 2003): a slope of -10 for h = 4."""
    errors = []
    for length in (256, 512, 1024):
        n = np.arange(length)
        # The oscillation under the envelope is averaged out over frequencies a side lobe apart.
        lines = [np.exp(2j * math.pi * (0.06 + step / (8 * length)) * n) for step in range(8)]
        errors.append([np.mean([abs(np.sum(weigh(length) * line)) for line in lines]) for weigh in WEIGHTS])
    (quick, smooth), *_, (last, _) = errors
    assert quick < 0.1 * smooth
    # Lobes that are ten or more from the centre: the law to a tenth of its power.
    assert math.log(last / quick) / math.log(4) == pytest.approx(-10.0, abs=1.0)
