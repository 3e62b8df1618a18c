"""The look that all plots of the page share."""

from __future__ import annotations

from typing import Any

from bokeh.models import BoxZoomTool, PanTool, ResetTool, WheelZoomTool
from bokeh.plotting import figure

from scanner.figures.colours import PURPLE

FONT = "system-ui, 'DejaVu Sans', sans-serif"
INK, FAINT = "#1a1a1a", "#e4e4e4"
TRACED = PURPLE
HEIGHT = 380
FOCUS = ".bk-events:focus { outline: none; } .bk-events:focus-visible { outline: 3px solid #0072b2; }"


def make_plot(title: str, **options: Any) -> figure:
    """Make an empty plot as wide as its place; dragging scrolls the page until a tool is chosen."""
    made = figure(
        title=title,
        height=HEIGHT,
        sizing_mode="stretch_width",
        toolbar_location="right",
        tools=[PanTool(), BoxZoomTool(), WheelZoomTool(), ResetTool()],
        active_drag=None,
        active_scroll=None,
        border_fill_color="white",
        outline_line_color=INK,
        stylesheets=[FOCUS],
        **options,
    )
    made.toolbar.logo = None
    made.toolbar.autohide = True
    made.title.update(text_font=FONT, text_font_size="13px", text_font_style="bold", text_color=INK)
    for axis in made.axis:
        axis.update(
            axis_label_text_font=FONT,
            axis_label_text_font_size="13px",
            axis_label_text_font_style="normal",
            axis_label_text_color=INK,
            major_label_text_font=FONT,
            major_label_text_font_size="12px",
            major_label_text_color=INK,
        )
    made.grid.grid_line_color = FAINT
    return made
