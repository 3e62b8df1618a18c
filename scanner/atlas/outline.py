"""The outline of one table, with the chords of the orbit that is being traced."""

from __future__ import annotations

import numpy as np
from bokeh.models import ColumnDataSource, DataRange1d

from scanner.atlas.dress import INK, TRACED, make_plot
from scanner.atlas.words import lay_title
from scanner.figures.colours import VERMILION
from scanner.tables import Table

POINTS = 721
CORNERS = {"x": [-1.0, 1.0], "y": [-1.0, 1.0]}
"""What the axes reach over where there is no outline."""


class OutlinePlot:
    """The selected table in configuration space."""

    def __init__(self) -> None:
        self._boundary, self._chords, self._start = (ColumnDataSource({"x": [], "y": []}) for _ in range(3))
        self.figure = make_plot("", match_aspect=True, x_range=DataRange1d(), y_range=DataRange1d())
        self.figure.xaxis.axis_label = "x (length)"
        self.figure.yaxis.axis_label = "y (length)"
        self._lines = self.figure.line("x", "y", source=self._chords, line_color=TRACED, line_join="bevel")
        self._curve = self.figure.line("x", "y", source=self._boundary, line_width=2)
        self.figure.scatter("x", "y", source=self._start, size=9, fill_color="white", line_color="black", line_width=2)
        self.figure.x_range.renderers = self.figure.y_range.renderers = [self._curve]
        self.fill(None)

    def fill(self, table: Table | None) -> None:
        """Show a table, None for one that cannot be built; dashed where it is not convex."""
        self._curve.visible = table is not None
        if table is None:
            self._boundary.data = CORNERS
            self.figure.title.text = lay_title("no outline")
            return
        x, y = table.point(np.linspace(0.0, 1.0, POINTS))
        self._boundary.data = {"x": x, "y": y}
        convex = ("solid", INK, "outline")
        dash, colour, title = convex if table.is_convex else ("dashed", VERMILION, "outline, not convex")
        self._curve.glyph.update(line_dash=dash, line_color=colour)
        self.figure.title.text = lay_title(title)

    def show_trace(self, x: np.ndarray, y: np.ndarray) -> None:
        """Draw an orbit's chords, the fainter the more there are, and its start."""
        self._chords.data = {"x": x, "y": y}
        width, alpha = 1.0 if len(x) < 400 else 0.6, float(np.clip(120 / max(len(x), 1), 0.12, 0.9))
        self._lines.glyph.update(line_width=width, line_alpha=alpha)
        self._start.data = {"x": x[:1], "y": y[:1]}
