"""Swept parameters: from what is written to the values.

Values are spaced in exact arithmetic on the decimals as written and rounded once, so that 0 to 0.12 in 25 values holds
the same 0.015 that a reader would type, on every processor.
"""

from __future__ import annotations

from decimal import Context, Decimal, localcontext
from fractions import Fraction
from itertools import accumulate, pairwise, repeat
from operator import mul
from typing import Annotated, Literal

from pydantic import Field

from scanner.errors import StudyError
from scanner.study.messages import Section, shown
from scanner.study.model import Number

MOST_TABLES = 1_000_000
LOG_DIGITS = 40
WHOLE_TOLERANCE = Decimal("1e-30")

_Written = Annotated[int, Field(ge=-(2**63), le=2**63 - 1)] | float
_FINITE = "a finite number"


class Range(Section):
    """A range as written: ``count`` values from ``start`` to ``stop``, both included."""

    start: _Written = Field(description=_FINITE, examples=[0.0])
    stop: _Written = Field(description=_FINITE, examples=[0.1])
    count: int = Field(ge=1, le=MOST_TABLES, description=f"a whole number from 1 to {MOST_TABLES}", examples=[11])
    spacing: Literal["linear", "log"] = Field("linear", description='"linear" or "log"', examples=["linear"])


class Listed(Section):
    """A list of values as written."""

    values: Annotated[tuple[_Written, ...], Field(strict=False)] = Field(
        min_length=1, max_length=MOST_TABLES, description="a list of one or more finite numbers", examples=[[0.0, 0.1]]
    )


def list_values(listed: Listed, whole: bool, path: str) -> tuple[Number, ...]:
    """Take the values of a list: increasing, without duplicates, whole where the parameter is.

    Raises
    ------
    StudyError
        One line.
    """
    values: tuple[Number, ...]
    if whole:
        for index, value in enumerate(listed.values):
            require_whole(value, f"{path}.values[{index}]")
        values = listed.values
    else:
        values = tuple(map(as_float, listed.values))
    for index, (before, after) in enumerate(pairwise(values), start=1):
        if before == after:
            raise StudyError(f"{path}.values[{index}] = {shown(after)} is there twice: keep one of them")
        if before > after:
            raise StudyError(
                f"{path}.values[{index}] = {shown(after)} must be above the value before it, {shown(before)}: "
                "write the values in increasing order"
            )
    return values


def spread_values(written: Range, whole: bool, path: str) -> tuple[Number, ...]:
    """Spread the values of a range.

    Raises
    ------
    StudyError
        One line: a reversed or empty range, a logarithmic one with an end that is not positive, values that are not
        whole where they must be, or more values than there are numbers between the ends.
    """
    start, stop, count = written.start, written.stop, written.count
    if whole:
        require_whole(start, f"{path}.start")
        require_whole(stop, f"{path}.stop")
    if written.spacing == "log" and start <= 0:
        raise StudyError(
            f'{path}.start = {shown(start)} must be above 0 with spacing = "log": raise it, or use spacing = "linear"'
        )
    if count == 1:
        if start != stop:
            raise StudyError(
                f"{path}.count = 1 needs start = stop, but they are {shown(start)} and {shown(stop)}: "
                "raise count to 2 or more, or make them equal"
            )
        return (start if whole else as_float(start),)
    if stop <= start:
        raise StudyError(
            f"{path}.stop = {shown(stop)} must be above start = {shown(start)} when count = {count}: "
            + ("exchange them" if stop < start else "raise stop, or set count = 1")
        )
    values = (_spread_log if written.spacing == "log" else _spread_linear)(written, whole, path)
    if any(before >= after for before, after in pairwise(values)):
        raise StudyError(
            f"{path}.count = {count} is more than the numbers between start = {shown(start)} and "
            f"stop = {shown(stop)}: lower count"
        )
    return values


def _spread_linear(written: Range, whole: bool, path: str) -> tuple[Number, ...]:
    """Space evenly; the quotient of two integers is rounded correctly, once."""
    first, last = (Fraction(Decimal(repr(end))) for end in (written.start, written.stop))
    steps = written.count - 1
    scale = first.denominator * last.denominator
    low, high = int(first * scale), int(last * scale)
    if not whole:
        return tuple((low * (steps - i) + high * i) / (scale * steps) for i in range(steps + 1))
    span = high - low
    if span % steps:
        example = span + 1 if span < MOST_TABLES else 2
        raise StudyError(
            f"{path}.count = {written.count} values from {low} to {high} are not all whole numbers: "
            f"count - 1 must divide {span}; write for instance count = {example}, or values = [...]"
        )
    return tuple(range(low, high + 1, span // steps))


def _spread_log(written: Range, whole: bool, path: str) -> tuple[Number, ...]:
    """Space evenly in the logarithm, in decimal arithmetic."""
    with localcontext(Context(prec=LOG_DIGITS)):
        first, last = Decimal(repr(written.start)), Decimal(repr(written.stop))
        steps = written.count - 1
        ratio = ((last / first).ln() / steps).exp()
        # A million products lose 6 of the 40 digits, a double holds 17.
        inner = list(accumulate(repeat(ratio, steps - 1), mul, initial=first))[1:]
        if not whole:
            return (as_float(written.start), *map(float, inner), as_float(written.stop))
        if any(abs(value - round(value)) > WHOLE_TOLERANCE * value for value in inner):
            raise StudyError(
                f'{path}.count = {written.count} values from {first} to {last} with spacing = "log" are not all whole '
                "numbers: write values = [...] instead"
            )
        return (int(first), *map(round, inner), int(last))


def require_whole(value: Number, path: str) -> None:
    """Refuse a number with a decimal point where a whole number is needed."""
    if not isinstance(value, int):
        remedy = f"write {int(value)}" if value.is_integer() else "write it without a decimal point"
        raise StudyError(f"{path} = {shown(value)} must be a whole number; {remedy}")


def as_float(value: Number) -> float:
    """Make a float of a number; minus zero becomes zero, which is the same table."""
    return float(value) + 0.0
