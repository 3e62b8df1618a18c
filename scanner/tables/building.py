"""From a family's name and parameters to a table, refusing in one line what cannot be."""

from __future__ import annotations

import math
import numbers
from collections.abc import Callable, Mapping
from functools import partial

from scanner.errors import TableError
from scanner.tables.curve import Curve
from scanner.tables.families import FAMILIES, Family, Parameter
from scanner.tables.table import Table, Value, make_table
from scanner.tables.user import user_curve


def build_table(family: str, *, allow_code: bool = False, **parameters: object) -> Table:
    """Build one table of a family.

    Parameters
    ----------
    family : str
        Name of a built-in family (see ``FAMILIES``), or ``module:function`` of the user's own.
    allow_code : bool
        Whether the user's own function may run.
    **parameters
        Every parameter of the family.

    Returns
    -------
    Table
        A shape that is not convex still makes a table, with ``is_convex`` False and the reason in ``convexity``.

    Raises
    ------
    TableError
        One line: the family is not known, a parameter is missing, unknown or out of bounds, or the curve needs
        more harmonics than a table may have.
    """
    curve: Callable[..., Curve]
    if ":" in family:
        if not allow_code:
            raise TableError(f"family {family} runs code of your own: allow it with --allow-code (allow_code=True)")
        values = _check_numbers(family, parameters)
        curve = partial(user_curve, family)
    elif family in FAMILIES:
        values = check_parameters(FAMILIES[family], parameters)
        curve = FAMILIES[family].curve
    else:
        raise TableError(f"family {family!r} is not known: use one of {', '.join(FAMILIES)}, or module:function")
    try:
        return make_table(family, values, curve(**values))
    except TableError as error:
        shown = ", ".join(f"{name} = {value!r}" for name, value in values.items())
        raise TableError(f"{family} ({shown}): {error}") from None


def check_parameters(family: Family, parameters: Mapping[str, object]) -> dict[str, Value]:
    """Check a family's parameters by name, type and bounds; whole numbers are taken for real ones.

    Raises
    ------
    TableError
        One line naming the parameter, its value and what it must be.
    """
    known = {parameter.name: parameter for parameter in family.parameters}
    for name, value in parameters.items():
        if name not in known:
            raise TableError(f"{family.name} has no parameter {name} (given {value!r}): it takes {', '.join(known)}")
    for name in known:
        if name not in parameters:
            raise TableError(f"{family.name} needs parameter {name}: it takes {', '.join(known)}")
    return {name: _check_value(family.name, parameter, parameters[name]) for name, parameter in known.items()}


def _check_numbers(family: str, parameters: Mapping[str, object]) -> dict[str, Value]:
    """Check that the parameters of the user's own function are finite numbers, and keep whole ones whole."""
    checked: dict[str, Value] = {}
    for name, value in parameters.items():
        number = _as_number(value, whole=isinstance(value, numbers.Integral))
        if number is None or not math.isfinite(number):
            raise TableError(f"{family}: {name} = {value!r} must be a finite number")
        checked[name] = number
    return checked


def _check_value(family: str, parameter: Parameter, value: object) -> Value:
    where = f"{family}: {parameter.name} = {value!r}"
    if parameter.kind == "text":
        if not isinstance(value, str):
            raise TableError(f"{where} must be text")
        return value
    number = _as_number(value, whole=parameter.kind == "int")
    if number is None:
        raise TableError(f"{where} must be a {'whole ' if parameter.kind == 'int' else ''}number")
    above = number > parameter.low if parameter.low_open else number >= parameter.low
    below = number < parameter.high if parameter.high_open else number <= parameter.high
    if not (above and below and math.isfinite(number)):
        raise TableError(f"{where} must be in {_interval(parameter)}")
    return number


def _as_number(value: object, whole: bool) -> float | int | None:
    """Give the plain number that a value is, of Python or NumPy, or None."""
    if isinstance(value, bool):
        return None
    if isinstance(value, numbers.Integral):
        return int(value) if whole else _as_float(int(value))
    return float(value) if isinstance(value, numbers.Real) and not whole else None


def _as_float(whole: int) -> float:
    """Round to a double; infinite beyond their range."""
    try:
        return float(whole)
    except OverflowError:
        return math.inf if whole > 0 else -math.inf


def _interval(parameter: Parameter) -> str:
    left = "(" if parameter.low_open or parameter.low == -math.inf else "["
    right = ")" if parameter.high_open or parameter.high == math.inf else "]"
    return f"{left}{parameter.low:g}, {parameter.high:g}{right}"
