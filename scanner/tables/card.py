"""What a notebook shows of a table: its outline and its numbers with their units."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from scanner.cards import Line, draw, lay_card

if TYPE_CHECKING:
    from scanner.tables.table import Table

POINTS = 240
"""Of an outline."""


def table_card(table: Table) -> str:
    """HTML of a table: its outline, its parameters and its numbers with their units."""
    facts = {name: str(value) for name, value in table.parameters.items()}
    facts |= {
        "perimeter": f"{table.perimeter:.6g} length",
        "area": f"{table.area:.6g} length²",
        "curvature": f"{table.curvature_min:.6g} to {table.curvature_max:.6g} per length",
        "mean chord": f"{table.mean_chord_exact:.6g} length (πA/L)",
        "boundary error": f"{table.boundary_error:.1e} of the size",
    }
    if table.residual:
        facts["residual"] = f"{table.residual:.3g} length, r.m.s. of the points"
    facts["shape"] = "convex" if table.is_convex else f"not convex: {table.convexity}"
    return lay_card(table.family, facts, draw([outline(table)]))


def outline(table: Table, faint: bool = False) -> Line:
    """The outline of a table as a line of a drawing."""
    x, y = table.point(np.arange(POINTS) / POINTS)
    return Line(x.tolist(), y.tolist(), not table.is_convex, faint)
