"""Values of swept parameters, as a reader would type them."""

from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st

from scanner.errors import StudyError
from scanner.study.ranges import Listed, Range, list_values, spread_values


def spread(start, stop, count, spacing="linear", whole=False):
    return spread_values(Range(start=start, stop=stop, count=count, spacing=spacing), whole, "table.x")


def test_linear_values_are_the_decimals_one_would_type():
    assert spread(0.0, 0.12, 25) == tuple(float(f"{i * 5}e-3") for i in range(25))
    assert spread(0.0, 1.0, 11)[3] == 0.3 != 3 * 0.1
    assert spread(-0.3, 0.3, 7) == (-0.3, -0.2, -0.1, 0.0, 0.1, 0.2, 0.3)
    assert spread(1, 2, 3) == (1.0, 1.5, 2.0)


def test_log_values_are_the_decimals_one_would_type():
    assert spread(1e-4, 0.1, 4, "log") == (1e-4, 1e-3, 1e-2, 0.1)
    assert spread(1, 4, 3, "log") == (1.0, 2.0, 4.0)


@given(st.floats(-1e6, 1e6), st.floats(1e-3, 1e6), st.integers(2, 300))
def test_linear_values_increase_from_end_to_end(start, width, count):
    values = spread(start, start + width, count)
    assert len(values) == count
    assert (values[0], values[-1]) == (start, start + width)
    assert all(before < after for before, after in pairwise(values))


@given(st.floats(1e-6, 1.0), st.floats(1.5, 1e6), st.integers(2, 60))
def test_log_values_increase_with_even_ratios(start, ratio, count):
    values = spread(start, start * ratio, count, "log")
    assert (values[0], values[-1]) == (start, start * ratio)
    step = (start * ratio / start) ** (1 / (count - 1))
    # Two roundings in the ratio and the power of this check, each 1e-16 times the exponent's size.
    assert all(after / before == pytest.approx(step, rel=1e-13) for before, after in pairwise(values))


def test_whole_values():
    values = spread(2, 10, 5, whole=True)
    assert values == (2, 4, 6, 8, 10)
    assert all(type(value) is int for value in values)
    assert spread(1, 1000, 4, "log", whole=True) == (1, 10, 100, 1000)


def test_a_range_of_one_value():
    assert spread(0.1, 0.1, 1) == (0.1,)
    assert spread(3, 3, 1, whole=True) == (3,)


def test_zero_has_no_sign():
    assert str(spread(-0.0, 0.0, 1)[0]) == "0.0"
    assert str(list_values(Listed(values=[-0.0, 1]), False, "table.x")[0]) == "0.0"


@pytest.mark.parametrize(
    ("start", "stop", "count", "spacing", "whole", "message"),
    [
        (0.2, 0.1, 3, "linear", False, r"x\.stop = 0\.1 must be above start = 0\.2 .* exchange them"),
        (0.1, 0.1, 3, "linear", False, r"x\.stop = 0\.1 must be above start = 0\.1 .* raise stop, or set count = 1"),
        (0.1, 0.2, 1, "linear", False, r"x\.count = 1 needs start = stop"),
        (0.0, 1.0, 3, "log", False, r'x\.start = 0\.0 must be above 0 with spacing = "log"'),
        (-1.0, 1.0, 3, "log", False, r"x\.start = -1\.0 must be above 0"),
        (-1.0, -1.0, 1, "log", False, r"x\.start = -1\.0 must be above 0"),
        (2, 6, 4, "linear", True, r"x\.count = 4 values from 2 to 6 are not all whole numbers: .* count = 5"),
        (1, 10, 3, "log", True, r"x\.count = 3 values from 1 to 10 .* write values = \[\.\.\.\]"),
        (2.0, 6, 3, "linear", True, r"x\.start = 2\.0 must be a whole number; write 2"),
        (1.0, 1.0000000000000004, 9, "linear", False, r"x\.count = 9 is more than the numbers between"),
        (1.0, 1.0000000000000004, 9, "log", False, r"x\.count = 9 is more than the numbers between"),
    ],
)
def test_bad_ranges(start, stop, count, spacing, whole, message):
    with pytest.raises(StudyError, match=message):
        spread(start, stop, count, spacing, whole)


@pytest.mark.parametrize(
    ("values", "whole", "message"),
    [
        ([0.1, 0.1], False, r"x\.values\[1\] = 0\.1 is there twice: keep one"),
        ([0, -0.0], False, r"x\.values\[1\] = 0\.0 is there twice"),
        ([0.1, 0.3, 0.2], False, r"x\.values\[2\] = 0\.2 must be above the value before it, 0\.3"),
        ([1, 2.5], True, r"x\.values\[1\] = 2\.5 must be a whole number"),
    ],
)
def test_bad_lists(values, whole, message):
    with pytest.raises(StudyError, match=message):
        list_values(Listed(values=values), whole, "table.x")
