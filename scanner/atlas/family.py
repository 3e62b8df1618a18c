"""The family: one quantity of all tables as a curve or a heat map, tables without numbers marked, one selected."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import xarray as xr
from bokeh.events import Tap
from bokeh.models import ColorBar, ColumnDataSource, HoverTool, LinearColorMapper, Range1d
from bokeh.palettes import Viridis256
from bokeh.plotting import figure

from scanner.atlas.dress import make_plot
from scanner.atlas.view import View, shown_dims, values_of
from scanner.atlas.words import plain, title_of, write_number, write_value
from scanner.figures.colours import BLUE, MISSING
from scanner.figures.labels import starts_at_zero
from scanner.figures.scale import Scale, scale_of, spans_without_numbers
from scanner.quantities import DONE, TABLE_STATUS


class FamilyPlot:
    """A plot of one quantity along given axes, and where in it the selected table is.

    Parameters
    ----------
    root
        Root variables of a sweep.
    view
        The quantity and its axes; `across` must not be empty.
    select
        Called with positions by dimension when a table is clicked.
    """

    def __init__(self, root: xr.Dataset, view: View, select: Callable[[dict[str, int]], None]) -> None:
        self._dims = (view.across, view.up) if view.up else (view.across,)
        self._scales = [scale_of(root, name) for name in self._dims]
        self._values, self._gaps, self._mark, self._fan = (ColumnDataSource() for _ in range(4))
        self.figure = self._make_figure(root[view.quantity])
        if view.up:
            self._draw_cells(root[view.quantity])
        else:
            self._draw_curve()
        self.figure.on_event(Tap, lambda event: select(self._place_of(event.x, event.y)))

    def fill(self, root: xr.Dataset, view: View) -> list[str]:
        """Show what the tables hold now and which one is selected; returns the statuses of those without numbers."""
        slice_ = root.isel({name: view.at[name] for name in shown_dims(view, root) if name not in self._dims})
        values = slice_[view.quantity].transpose(*self._dims).values
        error_name = f"{view.quantity}_stderr"
        has_errors = error_name in slice_ and set(slice_[error_name].dims) == set(self._dims)
        errors = slice_[error_name].transpose(*self._dims).values if has_errors else np.full(values.shape, np.nan)
        status = slice_["table_status"].broadcast_like(slice_[view.quantity]).transpose(*self._dims).values
        texts = [
            write_number(value, error) if code == DONE else plain(TABLE_STATUS[code])
            for value, error, code in zip(values.ravel(), errors.ravel(), status.ravel(), strict=True)
        ]
        if view.up:
            self._fill_cells(view.quantity, values, status, texts)
        else:
            self._fill_curve(slice_, view.quantity, values, errors, status, texts)
        self._values.data["place"] = self._write_places(root)
        self.selected = texts[np.ravel_multi_index([view.at[name] for name in self._dims], values.shape)]
        self._move_mark(view)
        return [TABLE_STATUS[code] for code in np.unique(status) if code != DONE]

    def _move_mark(self, view: View) -> None:
        places = [view.at[name] for name in self._dims]
        if view.up:
            (left, right), (bottom, top) = (s.edges[[n, n + 1]] for s, n in zip(self._scales, places, strict=True))
            self._mark.data = {"left": [left], "right": [right], "bottom": [bottom], "top": [top]}
        else:
            (n,) = places
            height = self._values.data["y"][n]
            self._mark.data = {"x": [self._scales[0].positions[n]], "y": [height]}

    def _make_figure(self, variable: xr.DataArray) -> figure:
        across, *up = self._scales
        made = make_plot(
            title_of(variable),
            x_axis_type="log" if across.logarithmic else "linear",
            y_axis_type="log" if up and up[0].logarithmic else "linear",
            x_range=Range1d(*map(float, across.edges[[0, -1]])),
            y_range=Range1d(*map(float, up[0].edges[[0, -1]])) if up else Range1d(0.0, 1.0),
        )
        made.xaxis.axis_label = plain(across.name)
        if up:
            made.yaxis.axis_label = plain(up[0].name)
            made.grid.visible = False
        for axis, scale in zip((made.xaxis, made.yaxis), self._scales, strict=False):
            if scale.whole and len(scale.positions) <= 12:
                axis.ticker = scale.positions.tolist()
        return made

    def _draw_curve(self) -> None:
        self._draw_gaps("vstrip", x0="left", x1="right")
        self.figure.multi_line("xs", "ys", source=self._fan, line_color=BLUE, line_width=0.8, line_alpha=0.45)
        self.figure.segment("x", "low", "x", "high", source=self._values, line_color=BLUE, line_width=1.5)
        self.figure.line("x", "y", source=self._values, line_color=BLUE, line_width=1.5)
        dots = self.figure.scatter("x", "y", source=self._values, color=BLUE, size=5)
        self._add_hover(dots)
        self.figure.vspan("x", source=self._mark, line_color="black", line_dash="dotted", line_width=1)
        self.figure.scatter("x", "y", source=self._mark, size=15, fill_color=None, line_color="black", line_width=2)

    def _draw_cells(self, variable: xr.DataArray) -> None:
        self._colours = LinearColorMapper(palette=Viridis256, low=0.0, high=1.0, nan_color="rgba(0, 0, 0, 0)")
        colour: Any = {"field": "value", "transform": self._colours}
        edges = {name: name for name in ("left", "right", "bottom", "top")}
        cells = self.figure.quad(**edges, source=self._values, fill_color=colour, line_color=colour)
        self._draw_gaps("quad", **edges)
        self._add_hover(cells)
        self.figure.add_layout(ColorBar(color_mapper=self._colours, width=12, padding=4), "right")
        for line, width in (("black", 5.0), ("white", 2.0)):
            self.figure.quad(**edges, source=self._mark, fill_color=None, line_color=line, line_width=width)

    def _draw_gaps(self, glyph: str, **edges: str) -> None:
        getattr(self.figure, glyph)(
            **edges,
            source=self._gaps,
            fill_color="face",
            line_color=None,
            hatch_pattern="hatch",
            hatch_color="edge",
            hatch_scale=10,
            level="underlay",
        )

    def _add_hover(self, renderer: Any) -> None:
        tip = "<div>@place</div><div><b>@text</b></div>"
        self.figure.add_tools(HoverTool(renderers=[renderer], tooltips=tip))

    def _fill_curve(
        self,
        slice_: xr.Dataset,
        quantity: str,
        values: np.ndarray,
        errors: np.ndarray,
        status: np.ndarray,
        texts: list[str],
    ) -> None:
        (scale,) = self._scales
        x = scale.positions
        reach = np.nan_to_num(errors)
        self._values.data = {"x": x, "y": values, "low": values - reach, "high": values + reach, "text": texts}
        earlier = np.empty((0, len(x)))
        if f"{quantity}_by_horizon" in slice_:
            earlier = _earlier(slice_[f"{quantity}_by_horizon"])
        self._fan.data = {"xs": [x] * len(earlier), "ys": list(earlier)}
        spans = list(spans_without_numbers(status, scale))
        self._gaps.data = {
            "left": [left for _, left, _ in spans],
            "right": [right for _, _, right in spans],
            **_marks([name for name, _, _ in spans]),
        }
        low, high = limits_of(quantity, np.concatenate([values - reach, values + reach, earlier.ravel()]))
        margin = 0.03 * (high - low)
        ends = {"start": low - margin if low else low, "end": high + margin}
        self.figure.y_range.update(**ends, reset_start=ends["start"], reset_end=ends["end"])

    def _fill_cells(self, quantity: str, values: np.ndarray, status: np.ndarray, texts: list[str]) -> None:
        across, up = self._scales
        count = len(up.positions)
        cells = {
            "left": np.repeat(across.edges[:-1], count),
            "right": np.repeat(across.edges[1:], count),
            "bottom": np.tile(up.edges[:-1], len(across.positions)),
            "top": np.tile(up.edges[1:], len(across.positions)),
        }
        self._values.data = {**cells, "value": values.ravel(), "text": texts}
        missing = status.ravel() != DONE
        names = [TABLE_STATUS[code] for code in status.ravel()[missing]]
        self._gaps.data = {**{side: edges[missing] for side, edges in cells.items()}, **_marks(names)}
        low, high = limits_of(quantity, values)
        self._colours.update(low=low, high=high)

    def _write_places(self, root: xr.Dataset) -> list[str]:
        """Say where each value stands: the labels of its dimensions."""
        labels = [[f"{plain(name)} {write_value(value)}" for value in values_of(root, name)] for name in self._dims]
        first, *second = labels
        return [f"{left}, {right}" for left in first for right in second[0]] if second else first

    def _place_of(self, x: float, y: float) -> dict[str, int]:
        return {scale.name: position_of(scale, value) for scale, value in zip(self._scales, (x, y), strict=False)}


def position_of(scale: Scale, place: float) -> int:
    """Position of the value that is nearest to a place of the axis."""
    if not scale.logarithmic:
        return int(np.abs(scale.positions - place).argmin())
    return int(np.abs(np.log(scale.positions / place)).argmin()) if place > 0.0 else 0


def _earlier(by_horizon: xr.DataArray) -> np.ndarray:
    """Return the same numbers as judged after fewer bounces: a row for each earlier horizon."""
    earlier: np.ndarray = by_horizon.transpose("horizon", ...).values[:-1]
    return earlier


def _marks(names: list[str]) -> dict[str, list[str]]:
    """How tables without numbers are marked, by their status."""
    faces, edges, hatches = zip(*(MISSING[name] for name in names), strict=True) if names else ((), (), ())
    return {"face": list(faces), "edge": list(edges), "hatch": [hatch[0] for hatch in hatches]}


def limits_of(quantity: str, values: np.ndarray) -> tuple[float, float]:
    """Ends of the axis or the colours: fractions up to one unless all are small, others as far as there are numbers."""
    finite = values[np.isfinite(values)]
    if not finite.size:
        return 0.0, 1.0
    low, high = float(finite.min()), float(finite.max())
    if starts_at_zero(quantity):
        low = min(low, 0.0)
        if "_fraction" in quantity and high > 0.5:
            high = max(high, 1.0)
    return low, high if high > low else low + (abs(low) or 1.0)
