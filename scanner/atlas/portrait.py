"""The phase portrait of one table: its stored orbits, p against s, and the orbit that is being traced."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import xarray as xr
from bokeh.events import Tap
from bokeh.models import ColorBar, ColumnDataSource, LinearColorMapper, Range1d
from bokeh.palettes import Viridis256

from scanner.analysis import whole_section
from scanner.atlas.dress import TRACED, make_plot
from scanner.atlas.words import lay_title, list_colours
from scanner.figures.colours import GREY, VERDICT_COLOURS
from scanner.figures.labels import VERDICTS
from scanner.figures.request import COLOURS
from scanner.quantities import VERDICTS as VERDICT_NAMES

COLOURINGS = dict(
    zip(COLOURS, ("verdict", "lyapunov_per_bounce", "frequency_diffusion", "rotation_number"), strict=True)
)
"""Variable of the group ``orbits`` behind each colouring."""
COLOUR_NAMES = {
    "verdict": "verdict",
    "exponent": "Lyapunov exponent per bounce",
    "diffusion": "frequency diffusion (log10)",
    "rotation": "rotation number",
}

SNAP = 0.01
"""A click takes a stored orbit that is this near, as a share of the plot's width or height."""


def stored_orbits(picked: xr.DataTree) -> xr.Dataset:
    """Read the stored orbits of the one table that is left, and their images all over the section."""
    return whole_section(picked)


class Portrait:
    """The section of the selected table.

    Parameters
    ----------
    trace
        Called with s and p when a place is clicked.
    """

    def __init__(self, trace: Callable[[float, float], None]) -> None:
        self._stored, self._traced = ColumnDataSource(_points()), ColumnDataSource({"s": [], "p": []})
        self._colours = LinearColorMapper(palette=Viridis256, low=0.0, high=1.0)
        self._bar = ColorBar(color_mapper=self._colours, width=12, padding=4, visible=False)
        self.figure = make_plot("", x_range=Range1d(0.0, 1.0), y_range=Range1d(-1.0, 1.0))
        self.figure.xaxis.axis_label = "arc length s/L"
        self.figure.yaxis.axis_label = "p = sin χ"
        self._dots = self.figure.scatter("s", "p", source=self._stored, color="colour", line_color=None, size=3)
        self.figure.scatter(
            "s", "p", source=self._traced, fill_color=TRACED, line_color="black", line_width=0.7, size=5.5
        )
        self.figure.add_layout(self._bar, "right")
        self.figure.on_event(Tap, lambda event: trace(*self._nearest(event.x, event.y)))

    def fill(self, orbits: xr.Dataset | None, colour: str) -> str:
        """Show the orbits of a table, None for one without; returns the legend as HTML."""
        if orbits is None:
            self._stored.data = _points()
            self._bar.visible = False
            self.figure.title.text = lay_title("no orbits")
            return ""
        values = orbits[COLOURINGS[colour]]
        self.figure.title.text = lay_title(f"stored orbits by {COLOUR_NAMES[colour]}")
        self._dots.glyph.size = float(np.clip(np.sqrt(24000 / max(values.size, 1)), 1.5, 7.0))
        colours, legend = self._by_verdict(values.values) if colour == COLOURS[0] else self._by_number(values)
        self._stored.data = _points(orbits["s0"].values, orbits["p0"].values, colours)
        self._bar.visible = colour != COLOURS[0]
        return legend

    def show_trace(self, s: np.ndarray, p: np.ndarray) -> None:
        """Draw the points of the traced orbit."""
        self._traced.data = {"s": s, "p": p}

    def _by_verdict(self, codes: np.ndarray) -> tuple[list[str], str]:
        legend = [
            (VERDICT_COLOURS[name], f"{VERDICTS[name]}: {(codes == code).sum()}")
            for code, name in enumerate(VERDICT_NAMES)
            if name in VERDICT_COLOURS and (codes == code).any()
        ]
        return [VERDICT_COLOURS.get(VERDICT_NAMES[code], GREY) for code in codes], list_colours(legend)

    def _by_number(self, values: xr.DataArray) -> tuple[list[str], str]:
        numbers = values.values
        known = np.isfinite(numbers)
        low, high = (float(numbers[known].min()), float(numbers[known].max())) if known.any() else (0.0, 1.0)
        if values.name == COLOURINGS["exponent"]:
            low = min(low, 0.0)
        high = high if high > low else low + 1.0
        self._colours.update(low=low, high=high)
        shares = np.where(known, (numbers - low) / (high - low), 0.0)
        places = np.clip((shares * len(Viridis256)).astype(int), 0, len(Viridis256) - 1)
        colours = [Viridis256[place] if good else GREY for place, good in zip(places, known, strict=True)]
        return colours, list_colours([] if known.all() else [(GREY, f"no value: {(~known).sum()}")])

    def _nearest(self, s: float, p: float) -> tuple[float, float]:
        """Start of the stored orbit that was clicked on, or the place itself where there is none."""
        x_range, y_range = self.figure.x_range, self.figure.y_range
        data = self._stored.data
        across = (np.asarray(data["s"]) - s) / (x_range.end - x_range.start)
        up = (np.asarray(data["p"]) - p) / (y_range.end - y_range.start)
        distance = np.hypot(across, up)
        if distance.size and distance.min() < SNAP:
            place = int(distance.argmin())
            return float(data["s"][place]), float(data["p"][place])
        return s, p


def _points(s: object = (), p: object = (), colour: object = ()) -> dict[str, object]:
    return {"s": s, "p": p, "colour": colour}
