"""Every table of a study, checked before anything runs: which ones there will be no orbits on, and why."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np

from scanner.errors import TableError
from scanner.study.model import Value
from scanner.study.plan import Index, Plan
from scanner.study.screening import FEWEST, UNSETTLED, States, screen_line
from scanner.tables import FAMILIES, Table, build_table

STATES = ("unsettled", "convex", "not_convex", "failed")
"""Meanings of the codes of states, the first three as screening gives them."""


@dataclass(frozen=True)
class TableCheck:
    """What became of one table of a study.

    Attributes
    ----------
    index, parameters
        Its place in the grid and its parameters.
    table
        The table, None if it could not be built.
    state
        "convex", "not_convex", or "failed" if it could not be built.
    reason
        One line, empty if convex.
    """

    index: Index
    parameters: dict[str, Value]
    table: Table | None
    state: Literal["convex", "not_convex", "failed"]
    reason: str = ""


def check_states(plan: Plan, report: Callable[[int], None] = lambda checked: None) -> States:
    """State of every table of a study, in the order of the grid.

    Along a real parameter of many values most tables are settled together; all others are built one by one.

    Parameters
    ----------
    plan
        The plan of the study.
    report
        Called now and then with the number of tables checked so far.

    Returns
    -------
    int8[tables]
        Codes of ``STATES``; none is unsettled.
    """
    states = np.zeros(plan.shape, dtype=np.int8)
    axis = _screened_axis(plan)
    if axis is not None:
        name = plan.dims[axis]
        values = np.array(plan.study.swept[name], dtype=np.float64)
        lines = np.moveaxis(states, axis, -1)
        for place in np.ndindex(lines.shape[:-1]):
            parameters = plan.parameters_at((*place[:axis], 0, *place[axis:]))
            del parameters[name]
            lines[place] = screen_line(plan.study.family, parameters, name, values)
            report(int(np.count_nonzero(states)))
    found = states.ravel()
    unsettled = np.flatnonzero(found == UNSETTLED)
    for done, number in enumerate(unsettled, len(found) - len(unsettled) + 1):
        index = tuple(map(int, np.unravel_index(number, plan.shape))) if plan.shape else ()
        found[number] = STATES.index(check_table(plan, index, plan.parameters_at(index)).state)
        report(done)
    return found


def _screened_axis(plan: Plan) -> int | None:
    """Choose the real parameter of a built-in family with the most values, if there are enough of them."""
    family = FAMILIES.get(plan.study.family)
    kinds = {parameter.name: parameter.kind for parameter in family.parameters} if family else {}
    sizes = [size if kinds.get(name) == "float" else 0 for name, size in zip(plan.dims, plan.shape, strict=True)]
    longest = max(sizes, default=0)
    return sizes.index(longest) if longest >= FEWEST else None


def check_table(plan: Plan, index: Index, parameters: dict[str, Value]) -> TableCheck:
    """Build one table of a study and say what became of it."""
    try:
        table = build_table(plan.study.family, allow_code=plan.study.allow_code, **parameters)
    except TableError as error:
        return TableCheck(index, parameters, None, "failed", str(error))
    except (Exception, SystemExit) as error:  # the user's own function may raise anything
        return TableCheck(index, parameters, None, "failed", " ".join(f"{type(error).__name__}: {error}".split()))
    if table.is_convex:
        return TableCheck(index, parameters, table, "convex")
    return TableCheck(index, parameters, table, "not_convex", table.convexity)
