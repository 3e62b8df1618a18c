"""What of a sweep is on the page: a quantity, its axes, the selected table, an orbit; and the link that says it."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from urllib.parse import urlencode

import numpy as np
import xarray as xr

from scanner.analysis import swept_parameters
from scanner.figures.request import COLOURS
from scanner.quantities import DONE

DEFAULT_QUANTITY = "regular_area_fraction"
DRAWN_BOUNCES = (50, 200, 1000, 5000)
AT = "at."


@dataclass(frozen=True)
class View:
    """One state of the page.

    Attributes
    ----------
    quantity
        Root variable of the curve or heat map.
    across, up
        Dimensions of its axes; no `up` makes a curve, neither a single number.
    at
        Position along every dimension of the root: of the selected table, and of the quantity's further dimensions.
    colour
        What the colours of the portrait mean, one of `COLOURS`.
    start
        s and p where the traced orbit starts; None without one.
    bounces
        Bounces of that orbit that are drawn.
    """

    quantity: str
    across: str
    up: str
    at: Mapping[str, int]
    colour: str = COLOURS[0]
    start: tuple[float, float] | None = None
    bounces: int = DRAWN_BOUNCES[1]

    def moved(self, name: str, steps: int, root: xr.Dataset) -> View:
        """Go some steps along one dimension, as far as there are values."""
        place = min(max(self.at[name] + steps, 0), root.sizes[name] - 1)
        return replace(self, at={**self.at, name: place})

    def table(self, root: xr.Dataset) -> dict[str, int]:
        """Position of the selected table along the swept parameters."""
        return {name: self.at[name] for name in swept_parameters(root)}


def list_quantities(root: xr.Dataset) -> dict[str, list[str]]:
    """List root variables that can be shown, by group; standard errors last, as they are drawn with their quantity."""
    swept = swept_parameters(root)
    groups: dict[str, list[str]] = {"one number a table": [], "over a further dimension": [], "standard errors": []}
    for name, variable in root.data_vars.items():
        if str(name).endswith("_stderr"):
            groups["standard errors"].append(str(name))
        elif name != "table_status":
            further = set(variable.dims) - set(swept)
            groups["over a further dimension" if further else "one number a table"].append(str(name))
    return {group: names for group, names in groups.items() if names}


def possible_axes(root: xr.Dataset, quantity: str) -> list[str]:
    """Dimensions of a quantity that can be an axis: those of more than one number."""
    return [
        str(name)
        for name in root[quantity].dims
        if root.sizes[name] > 1 and (name not in root.coords or root[name].dtype.kind in "iuf")
    ]


def show_quantity(view: View, quantity: str, root: xr.Dataset) -> View:
    """Change the quantity and keep the axes as far as it has them."""
    return _with_axes(replace(view, quantity=quantity), view.across, view.up, root)


def show_axes(view: View, across: str, up: str, root: xr.Dataset) -> View:
    """Change the axes; the same dimension on both swaps them."""
    if across == up:
        across, up = (view.up, view.across) if view.up else (across, "")
    return _with_axes(view, across or up, up if across else "", root)


def _with_axes(view: View, across: str, up: str, root: xr.Dataset) -> View:
    choices = possible_axes(root, view.quantity)
    if across not in choices:
        across = next((name for name in choices if name != up), "")
    return replace(view, across=across, up=up if up in choices and up != across else "")


def default_view(root: xr.Dataset) -> View:
    """What a page without a query shows: a heat map over two parameters, a curve over one, a table in the middle."""
    axes = possible_axes(root, DEFAULT_QUANTITY)
    at = {str(name): 0 for name in root.sizes} | _middle_table(root)
    if "horizon" in at:
        at["horizon"] = int(root["horizon"].values.argmax())
    across, up = (*axes, "", "")[:2]
    return View(DEFAULT_QUANTITY, across, up, at)


def _middle_table(root: xr.Dataset) -> dict[str, int]:
    """Position of the table that is done and nearest to the middle of the grid; of the middle one if none is done."""
    done = np.argwhere(root["table_status"].values == DONE)
    middle = (np.array(root["table_status"].shape) - 1) / 2
    places = done if len(done) else np.floor(middle)[None, :]
    nearest = places[np.abs((places - middle) / (middle + 0.5)).sum(axis=1).argmin()]
    return {name: int(place) for name, place in zip(swept_parameters(root), nearest, strict=True)}


def write_query(view: View, root: xr.Dataset) -> str:
    """Write a view as the query of a link; values rather than positions, so that it holds in a finer sweep too."""
    entries: dict[str, object] = {"quantity": view.quantity, "across": view.across, "up": view.up}
    for name in shown_dims(view, root):
        entries[AT + name] = values_of(root, name)[view.at[name]]
    entries["colour"] = view.colour
    if view.start is not None:
        entries["s"], entries["p"] = (f"{value:.6g}" for value in view.start)
    entries["bounces"] = view.bounces
    return urlencode({name: value for name, value in entries.items() if value != ""})


def read_query(query: Mapping[str, str], root: xr.Dataset) -> View:
    """Read a view from the query of a link; what is missing or does not fit this sweep is as without a query."""
    view = default_view(root)
    known = {name for group in list_quantities(root).values() for name in group}
    if query.get("quantity") in known:
        view = show_quantity(view, query["quantity"], root)
    if "across" in query:
        view = _with_axes(view, query["across"], query.get("up", ""), root)
    at = dict(view.at)
    for name in at:
        if AT + name in query:
            at[name] = _nearest(values_of(root, name), query[AT + name], at[name])
    colour = query.get("colour")
    s, p, bounces = (_number(query.get(name)) for name in ("s", "p", "bounces"))
    return replace(
        view,
        at=at,
        colour=colour if colour in COLOURS else view.colour,
        start=(s % 1.0, p) if s is not None and p is not None and abs(p) < 1.0 else None,
        bounces=int(bounces) if bounces in DRAWN_BOUNCES else view.bounces,
    )


def shown_dims(view: View, root: xr.Dataset) -> Iterator[str]:
    """Dimensions that a view has something to say about: the swept ones and those of its quantity."""
    yield from swept_parameters(root)
    yield from (str(name) for name in root[view.quantity].dims if name not in swept_parameters(root))


def values_of(root: xr.Dataset, name: str) -> list[int | float | str]:
    """Values along a dimension."""
    found = root[name].values if name in root.coords else np.arange(root.sizes[name])
    return [value if isinstance(value, int | float) else str(value) for value in found.tolist()]


def _nearest(values: list[int | float | str], wanted: str, otherwise: int) -> int:
    if wanted in values:
        return values.index(wanted)
    number = _number(wanted)
    if number is None or isinstance(values[0], str):
        return otherwise
    return int(np.abs(np.array(values, dtype=float) - number).argmin())


def _number(text: str | None) -> float | None:
    try:
        number = float(text or "")
    except ValueError:
        return None
    return number if np.isfinite(number) else None
