"""Which figures fit a store, each drawn and ready to stand in a page."""

from __future__ import annotations

import base64
from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np
import xarray as xr

from scanner.analysis import swept_parameters
from scanner.cards import describe
from scanner.errors import ScannerError
from scanner.figures import Request
from scanner.figures.curves import MOST_LINES
from scanner.figures.drawing import draw_figure, render_figure
from scanner.quantities import DONE, RESONANCES

LEVELS = (0.9, 0.5, 0.1)
"""Regular fractions of the tables whose sections are shown, the nearest ones that there are."""

Selection = dict[str, float | str]


@dataclass(frozen=True)
class Picture:
    """A figure in a page: what it is called, what it shows, and its file as an address without a network."""

    caption: str
    address: str


def draw_pictures(
    tree: xr.DataTree, picked: xr.DataTree, select: Selection, average: tuple[str, ...], *, allow_code: bool
) -> tuple[list[Picture], list[str]]:
    """Draw every figure that fits the tables of a sweep.

    Parameters
    ----------
    tree
        The whole sweep.
    picked
        The tables that are reported.
    select, average
        How they were picked, and what is averaged over.
    allow_code
        Whether the user's own function may run.

    Returns
    -------
    pictures
        The figures.
    left_out
        What could not be drawn, and why, a line for each reason.
    """
    pictures: list[Picture] = []
    left_out: dict[str, list[str]] = {}
    for caption, request in choose_figures(picked, select, average):
        try:
            figure, _ = draw_figure(tree, replace(request, allow_code=allow_code))
        except ScannerError as error:
            left_out.setdefault(str(error), []).append(caption)
            continue
        content = base64.b64encode(render_figure(figure, ".svg")).decode()
        pictures.append(Picture(caption, f"data:image/svg+xml;base64,{content}"))
    return pictures, [f"{'; '.join(captions)}: {reason}" for reason, captions in left_out.items()]


def choose_figures(picked: xr.DataTree, select: Selection, average: tuple[str, ...]) -> Iterator[tuple[str, Request]]:
    """Yield the figures that fit the tables left of a sweep, each with its caption; none where no table is done."""
    root = picked.to_dataset()
    if not (root["table_status"].values == DONE).any():
        return
    free = sorted((name for name in swept_parameters(root) if name not in average), key=lambda name: -root.sizes[name])
    # of more than two parameters the longest stay, the others are held in the middle of their values
    middle: Selection = {name: root[name].values[root.sizes[name] // 2].item() for name in free[2:]}
    held = {**select, **middle}
    names = [name for name in swept_parameters(root) if name in free[:2]]
    note = f", at {describe(middle)}" if middle else ""
    overall = Request(select=held, average=average)
    if len(names) == 1:
        yield from _along_one(picked, names[0], overall)
    elif len(names) == 2:
        yield from _over_two(root, names, overall, note)
    for place in _choose_tables(root):
        yield from _of_one_table({**select, **place})
    if not swept_parameters(root):
        yield "Lyapunov exponents of all orbits", replace(overall, kind="exponents")


def _along_one(picked: xr.DataTree, name: str, overall: Request) -> Iterator[tuple[str, Request]]:
    yield f"Regular fractions against {name}", replace(overall, kind="fractions")
    yield (
        f"Regular fraction by p against {name}",
        replace(overall, kind="map", quantity="regular_area_fraction_by_p"),
    )
    yield (
        f"Mean Lyapunov exponent of the chaotic orbits against {name}",
        replace(overall, kind="curve", quantity="lyapunov_per_length"),
    )
    if not overall.average:
        yield f"Lyapunov exponents of all orbits against {name}", replace(overall, kind="exponents")
        yield f"Islands by period against {name}", replace(overall, kind="map", quantity="island_area_fraction")
        if RESONANCES in picked.children:
            yield f"Length gaps of resonances against {name}", replace(overall, kind="gaps", along=name)


def _over_two(root: xr.Dataset, names: list[str], overall: Request, note: str) -> Iterator[tuple[str, Request]]:
    over = f"over {' and '.join(names)}{note}"
    yield f"Regular fraction of the section {over}", replace(overall, kind="map")
    if min(root.sizes[name] for name in names) <= MOST_LINES:
        yield f"Regular fraction of the section, as lines {over}", replace(overall, kind="curve")
    for quantity, text in (
        ("regular_volume_fraction", "Regular fraction of the energy shell"),
        ("lyapunov_per_length", "Mean Lyapunov exponent of the chaotic orbits"),
        ("undecided_area_fraction", "Part of the section without a verdict"),
    ):
        yield f"{text} {over}", replace(overall, kind="map", quantity=quantity)


def _choose_tables(root: xr.Dataset) -> list[Selection]:
    """Choose tables that are mostly regular, half and mostly chaotic, as far as there are any."""
    area = np.where(root["table_status"].values == DONE, root["regular_area_fraction"].values, np.nan)
    nearest = [int(np.nanargmin(np.abs(area - level))) for level in LEVELS]
    names = swept_parameters(root)
    places = (np.unravel_index(number, area.shape) for number in dict.fromkeys(nearest))
    return [{name: root[name].values[at].item() for name, at in zip(names, place, strict=True)} for place in places]


def _of_one_table(place: Selection) -> Iterator[tuple[str, Request]]:
    where = f" at {describe(place)}" if place else ""
    one = Request(select=place)
    yield f"Orbits in the section{where}, by verdict", replace(one, kind="portrait")
    yield f"Orbits in the section{where}, by frequency diffusion", replace(one, kind="portrait", colour="diffusion")
    yield f"Orbits in the table{where}", replace(one, kind="table")
