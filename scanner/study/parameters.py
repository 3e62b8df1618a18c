"""Parameters of the family, each fixed or swept, against what the family has."""

from __future__ import annotations

import keyword
import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import TypeGuard

from scanner.errors import StudyError
from scanner.quantities import REGISTER
from scanner.study.messages import nearest, read_section, shown, unknown_key, written
from scanner.study.model import Number, Value
from scanner.study.ranges import MOST_TABLES, Listed, Range, as_float, list_values, require_whole, spread_values
from scanner.tables import FAMILIES, Parameter

TAKEN = {
    *(name for entry in REGISTER for name in entry),
    *(dim for quantity in REGISTER.values() for dim in quantity.dims),
    *("rotation", "resonance_period"),
}
"""Names in the store that no dimension of a sweep may have: of groups, variables, dimensions and coordinates."""


@dataclass(frozen=True)
class Parameters:
    """Parameters of a study: one value, or the values of a dimension."""

    fixed: Mapping[str, Value]
    swept: Mapping[str, tuple[Number, ...]]


def read_parameters(family: str, entries: Mapping[str, object], allow_code: bool) -> Parameters:
    """Validate the parameters of table [table], all but ``family`` itself.

    Raises
    ------
    StudyError
        One line: the family is not known or may not run, a parameter is missing, is not the family's, or has a value
        that the family does not take.
    """
    known = find_parameters(family, entries, allow_code)
    for name, entry in entries.items():
        if name not in known:
            raise unknown_key("table", name, entry, known)
    fixed: dict[str, Value] = {}
    swept: dict[str, tuple[Number, ...]] = {}
    for name, entry in entries.items():
        path = f"table.{name}"
        if isinstance(entry, Mapping):
            swept[name] = _read_swept(known[name], entry, path)
        else:
            fixed[name] = _read_fixed(known[name], entry, path)
    for name, parameter in known.items():
        if name not in entries:
            raise StudyError(
                f'table.{name} is missing: family "{family}" needs it; add {name} = ... ({describe_bounds(parameter)})'
            )
    _limit_tables(swept)
    return Parameters(fixed, swept)


def find_parameters(family: str, entries: Iterable[str], allow_code: bool) -> dict[str, Parameter | None]:
    """Find the parameters that a family takes; those of the user's own function are the given ones, of any number."""
    if ":" not in family:
        if family not in FAMILIES:
            guess = nearest(family, FAMILIES)
            remedy = f'did you mean "{guess}"?' if guess else "correct it"
            raise StudyError(f"table.family = {shown(family)} is not known: {remedy} (known: {', '.join(FAMILIES)})")
        return {parameter.name: parameter for parameter in FAMILIES[family].parameters}
    module, _, function = family.partition(":")
    if not all(part.isidentifier() for part in [*module.split("."), function]):
        raise StudyError(f"table.family = {shown(family)} must be module:function; correct the name")
    if not allow_code:
        raise StudyError(
            f"table.family = {shown(family)} runs code of your own: "
            "add --allow-code if you trust it, or use a built-in family"
        )
    for name in entries:
        if not name.isidentifier() or keyword.iskeyword(name):
            raise StudyError(f"table.{written(name)} must be the name of a parameter of {family}; rename it")
    return dict.fromkeys(entries)


def describe_bounds(parameter: Parameter | None) -> str:
    """Say what a parameter takes: "a whole number, 2 or more"."""
    if parameter is None:
        return "a finite number"
    if parameter.kind == "text":
        return "one line of text"
    bounds = [
        f"{'above' if parameter.low_open else 'at least'} {shown(parameter.low)}" if parameter.low > -math.inf else "",
        f"{'below' if parameter.high_open else 'at most'} {shown(parameter.high)}" if parameter.high < math.inf else "",
    ]
    kind = "a whole number" if parameter.kind == "int" else "a number"
    return " ".join([kind, " and ".join(filter(None, bounds))]).strip()


def _read_fixed(parameter: Parameter | None, entry: object, path: str) -> Value:
    """Validate the single value of a parameter."""
    if parameter is not None and parameter.kind == "text":
        if not isinstance(entry, str) or not entry.isprintable() or not entry.strip():
            raise StudyError(f"{path} = {shown(entry)} must be one line of text; write it in quotes")
        return entry
    if isinstance(entry, list):
        raise StudyError(
            f"{path} = {shown(entry)} must be {describe_bounds(parameter)}; to sweep a list write {{ values = [...] }}"
        )
    if not _is_number(entry):
        raise StudyError(
            f"{path} = {shown(entry)} must be {describe_bounds(parameter)}; "
            "write a number, or a range { start = ..., stop = ..., count = ... }"
        )
    _require_within(parameter, entry, path)
    if parameter is None:
        return entry
    if parameter.kind == "int":
        require_whole(entry, path)
        return entry
    return as_float(entry)


def _is_number(entry: object) -> TypeGuard[Number]:
    """Tell whether a value is a finite number that the file format can hold."""
    if isinstance(entry, int):
        return not isinstance(entry, bool) and entry.bit_length() < 64
    return isinstance(entry, float) and math.isfinite(entry)


def _read_swept(parameter: Parameter | None, entry: Mapping[str, object], path: str) -> tuple[Number, ...]:
    """Validate a range or a list of values."""
    if parameter is not None and parameter.kind == "text":
        raise StudyError(
            f"{path} = {shown(entry)} must be one line of text, which cannot be swept: write one study each"
        )
    if path.removeprefix("table.") in TAKEN:
        raise StudyError(
            f"{path} cannot be swept: the store has a variable or group of that name; rename the parameter"
        )
    if "values" in entry:
        listed = read_section(Listed, entry, path)
        for index, value in enumerate(listed.values):
            _require_within(parameter, value, f"{path}.values[{index}]")
        return list_values(listed, _is_whole(parameter, *listed.values), path)
    spread = read_section(Range, entry, path)
    _require_within(parameter, spread.start, f"{path}.start")
    _require_within(parameter, spread.stop, f"{path}.stop")
    return spread_values(spread, _is_whole(parameter, spread.start, spread.stop), path)


def _is_whole(parameter: Parameter | None, *numbers: Number) -> bool:
    """Tell whether values are whole numbers: by the family, or for the user's own function as they are written."""
    if parameter is None:
        return all(isinstance(number, int) for number in numbers)
    return parameter.kind == "int"


def _require_within(parameter: Parameter | None, value: Number, path: str) -> None:
    """Refuse a value beyond the bounds of its parameter."""
    if parameter is None:
        return
    low = value <= parameter.low if parameter.low_open else value < parameter.low
    high = value >= parameter.high if parameter.high_open else value > parameter.high
    if low or high:
        remedy = "raise it" if low else "lower it"
        raise StudyError(f"{path} = {shown(value)} must be {describe_bounds(parameter)}; {remedy}")


def _limit_tables(swept: Mapping[str, tuple[Number, ...]]) -> None:
    """Refuse a grid of more tables than one study can hold."""
    counts = [len(values) for values in swept.values()]
    tables = math.prod(counts)
    if tables > MOST_TABLES:
        raise StudyError(
            f"table: {' x '.join(map(str, counts))} values of {', '.join(swept)} make {tables} tables, "
            f"must be at most {MOST_TABLES}; lower a count, or split the study"
        )
