"""Every table of a study, built before anything runs: which ones there will be no orbits on, and why."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal

from scanner.errors import TableError
from scanner.study.model import Value
from scanner.study.plan import Index, Plan
from scanner.tables import Table, build_table


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


def check_tables(plan: Plan) -> Iterator[TableCheck]:
    """Build every table of a study, one after the other.

    A table that cannot be built is reported, not raised.
    """
    for index, parameters in plan.tables():
        yield check_table(plan, index, parameters)


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
