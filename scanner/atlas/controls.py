"""What the reader sets: the quantity and its axes, the tables along each parameter, the colours, the orbit."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import xarray as xr
from bokeh.models import CategoricalSlider, Column, Select, Spinner

from scanner.atlas.portrait import COLOUR_NAMES
from scanner.atlas.view import (
    DRAWN_BOUNCES,
    View,
    list_quantities,
    possible_axes,
    show_axes,
    show_quantity,
    shown_dims,
    values_of,
)
from scanner.atlas.words import name_of, plain, write_value

WIDGETS = (Path(__file__).parent / "widgets.css").read_text(encoding="utf-8")
NO_AXIS = "none, a curve"


class Controls:
    """Widgets that show a view and ask for another one.

    Parameters
    ----------
    root
        Root variables of a sweep.
    view
        What to show at first.
    change
        Called with a function from the view to the one asked for.
    """

    def __init__(self, root: xr.Dataset, view: View, change: Callable[[Callable[[View], View]], None]) -> None:
        self._root, self._change = root, change
        self.quantity = self._select("Quantity", {
            group: [(name, name_of(root[name])) for name in names] for group, names in list_quantities(root).items()
        })  # fmt: skip
        self.across = self._select("Across", [])
        self.up = self._select("Up", [])
        self.colour = self._select("Colours", list(COLOUR_NAMES.items()))
        self.bounces = self._select("Bounces drawn", [(str(count), str(count)) for count in DRAWN_BOUNCES])
        self.s = self._spinner("Start s/L", 0.0, 1.0)
        self.p = self._spinner("Start p", -0.999999, 0.999999)
        self.sliders = Column(sizing_mode="stretch_width", name="sliders")
        self._slider_of: dict[str, CategoricalSlider] = {}
        self.show(view)

        self._ask(self.quantity, lambda value, view: show_quantity(view, value, root))
        self._ask(self.across, lambda value, view: show_axes(view, value, view.up, root))
        self._ask(self.up, lambda value, view: show_axes(view, view.across, value, root))
        self._ask(self.colour, lambda value, view: replace(view, colour=value))
        self._ask(self.bounces, lambda value, view: replace(view, bounces=int(value)))
        for spinner in (self.s, self.p):
            spinner.on_change("value", lambda name, old, new: change(self._with_start))

    def show(self, view: View) -> None:
        """Set every widget as the view has it."""
        axes = [(name, plain(name)) for name in possible_axes(self._root, view.quantity)]
        self.across.options = axes
        self.up.options = [("", NO_AXIS), *axes]
        self.across.disabled, self.up.disabled = not axes, len(axes) < 2
        for select, value in (
            (self.quantity, view.quantity),
            (self.across, view.across),
            (self.up, view.up),
            (self.colour, view.colour),
            (self.bounces, str(view.bounces)),
        ):
            select.value = value
        self.s.value, self.p.value = view.start or (None, None)
        self._show_sliders(view)

    def _show_sliders(self, view: View) -> None:
        names = [name for name in shown_dims(view, self._root) if self._root.sizes[name] > 1]
        for name in names:
            if name not in self._slider_of:
                self._slider_of[name] = self._make_slider(name)
            slider = self._slider_of[name]
            slider.value = slider.categories[view.at[name]]
        wanted = [self._slider_of[name] for name in names]
        if self.sliders.children != wanted:
            self.sliders.children = wanted

    def _make_slider(self, name: str) -> CategoricalSlider:
        values = values_of(self._root, name)
        texts = [write_value(value) for value in values]
        if len(set(texts)) < len(texts):
            texts = [str(value) for value in values]
        slider = CategoricalSlider(
            categories=texts,
            value=texts[0],
            title=plain(name),
            sizing_mode="stretch_width",
            margin=0,
            stylesheets=[WIDGETS],
        )

        def moved(_attribute: str, _old: str, new: str) -> None:
            place = texts.index(new)
            self._change(lambda view: replace(view, at={**view.at, name: place}))

        slider.on_change("value_throttled", moved)
        return slider

    def _with_start(self, view: View) -> View:
        s, p = self.s.value, self.p.value
        if s is None and p is None:
            return replace(view, start=None)
        return replace(view, start=(float(s or 0.0), float(p or 0.0)))

    def _select(self, title: str, options: object) -> Select:
        return Select(title=title, options=options, sizing_mode="stretch_width", margin=0, stylesheets=[WIDGETS])

    def _spinner(self, title: str, low: float, high: float) -> Spinner:
        return Spinner(
            title=title,
            low=low,
            high=high,
            step=0.01,
            value=None,
            format="0.[000000]",
            placeholder="click or type",
            sizing_mode="stretch_width",
            margin=0,
            stylesheets=[WIDGETS],
        )

    def _ask(self, select: Select, asked: Callable[[str, View], View]) -> None:
        select.on_change("value", lambda name, old, new: self._change(lambda view: asked(new, view)))
