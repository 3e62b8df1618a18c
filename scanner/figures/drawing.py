"""From a request to a finished figure: which tables, which kind, drawn in one style and saved whole."""

from __future__ import annotations

import io
import warnings
from pathlib import Path

import matplotlib
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from scanner.analysis import average_tables, pick_tables, replace_whole, study_of, swept_parameters, whole_section
from scanner.cards import describe
from scanner.errors import ScannerError
from scanner.figures.curves import MOST_LINES, draw_curve, draw_fractions
from scanner.figures.exponents import draw_exponents
from scanner.figures.frequency import GRID, draw_frequency
from scanner.figures.gaps import draw_gaps
from scanner.figures.heat_map import draw_map
from scanner.figures.inside import FEWEST_BOUNCES, choose_starts, draw_inside
from scanner.figures.letters import families_for
from scanner.figures.one_table import follow_anew, orbits_of, rebuild_table, require_one_table
from scanner.figures.portrait import draw_portrait
from scanner.figures.request import CHORDS, FREQUENCY_BOUNCES, Request, refuse_idle_options
from scanner.figures.style import STYLE, figure_of, write_title

DEFAULT_QUANTITY = "regular_area_fraction"


def draw_figure(tree: xr.DataTree, request: Request) -> tuple[Figure, str]:
    """Draw a figure of a sweep.

    Parameters
    ----------
    tree
        A sweep.
    request
        What to draw; see `Request`.

    Returns
    -------
    figure
        The figure, not tied to any window.
    taken
        The stored tables it shows in words, empty when it shows all of them.

    Raises
    ------
    ScannerError
        The sweep has no such parameter or variable, or has too many or too few dimensions for this kind of figure.
    """
    picked, taken = pick_tables(tree, request.select)
    root = average_tables(picked.to_dataset(), request.average)
    kind = request.kind or _default_kind(root, request)
    refuse_idle_options(request, kind)
    title, notes = study_of(tree).title, _notes(tree, kind, describe(taken), request)
    families = families_for(title + "".join(notes), str(STYLE["font.family"]))
    with matplotlib.rc_context({**STYLE, "font.family": families}):  # type: ignore[dict-item]
        axes = _draw(kind, picked, root, request)
        figure = figure_of(axes)
        write_title(figure, title, notes)
    return figure, describe(taken)


def render_figure(figure: Figure, suffix: str) -> bytes:
    """Return a figure as the content of a file of this suffix; the same figure gives the same bytes."""
    undated = {".pdf": {"CreationDate": None}, ".svg": {"Date": None}}.get(suffix)
    content = io.BytesIO()
    with matplotlib.rc_context(STYLE), warnings.catch_warnings():  # type: ignore[arg-type]
        # a letter of the title that the typeface lacks is drawn as a box, which says enough
        warnings.filterwarnings("ignore", message="Glyph .* missing from font")
        figure.savefig(content, format=suffix.removeprefix("."), metadata=undated)
    return content.getvalue()


def save_figure(figure: Figure, target: Path) -> None:
    """Write a figure as its suffix says, whole or not at all."""
    content = render_figure(figure, target.suffix.lower())
    with replace_whole(target) as partial:
        partial.write_bytes(content)


def _default_kind(root: xr.Dataset, request: Request) -> str:
    count = len(swept_parameters(root))
    further = len(root[request.quantity].dims) - count if request.quantity in root else 0
    if count + further == 2:
        return "map"
    if count == 1:
        return "curve" if request.quantity else "fractions"
    if count == 0:
        return "portrait"
    raise ScannerError(_too_many(swept_parameters(root), 2))


def _draw(kind: str, picked: xr.DataTree, root: xr.Dataset, request: Request) -> Axes:
    if kind == "portrait":
        return _draw_portrait(picked, request)
    if kind == "table":
        return _draw_inside(picked, request)
    if kind == "frequency":
        return _draw_frequency(picked, request)
    if kind == "gaps":
        return draw_gaps(picked, request)
    if kind == "exponents":
        return draw_exponents(picked, request)
    names = swept_parameters(root)
    quantity = request.quantity or DEFAULT_QUANTITY
    if quantity not in root:
        choices = ", ".join(str(name) for name in root.data_vars if name != "table_status")
        raise ScannerError(f"there is no variable {quantity!r} of tables: choose from {choices}")
    further = tuple(str(name) for name in root[quantity].dims if name not in names)
    if kind == "map":
        dims = names + further
        if len(dims) != 2:
            raise ScannerError(_too_many(dims, 2) if len(dims) > 2 else _too_few(dims, 2, "map"))
        return draw_map(root, quantity, (dims[0], dims[1]), request.width)
    if further:
        raise ScannerError(f"{quantity} also runs over {', '.join(further)}: draw it with --kind map")
    along = request.along or (max(names, key=lambda name: root.sizes[name]) if names else "")
    if along not in names:
        raise ScannerError(_too_few(names, 1, kind) if not along else f"--along {along}: not one of {', '.join(names)}")
    if kind == "fractions":
        if len(names) > 1:
            raise ScannerError(_too_many(names, 1))
        return draw_fractions(root, along, request.width)
    if len(names) > 2:
        raise ScannerError(_too_many(names, 2))
    lines = max((root.sizes[name] for name in names if name != along), default=1)
    if lines > MOST_LINES:
        raise ScannerError(f"{lines} lines cannot be told apart, the most is {MOST_LINES}: draw it with --kind map")
    return draw_curve(root, quantity, along, request.width)


def _draw_portrait(picked: xr.DataTree, request: Request) -> Axes:
    require_one_table(picked, "portrait", request)
    orbits = whole_section(picked)
    s, p = orbits["s0"].values[:, None], orbits["p0"].values[:, None]
    if request.bounces:
        table = rebuild_table(picked, allow_code=request.allow_code)
        s, p = follow_anew(table, s[:, 0], p[:, 0], request.bounces)
    return draw_portrait(s, p, orbits, request.colour, request.width)


def _draw_inside(picked: xr.DataTree, request: Request) -> Axes:
    require_one_table(picked, "table", request)
    s, p = ([request.s] * len(request.p), request.p) if request.p else choose_starts(orbits_of(picked))
    table = rebuild_table(picked, allow_code=request.allow_code)
    return draw_inside(table, s, p, request.bounces or CHORDS, _judged(picked), request.width)


def _judged(tree: xr.DataTree) -> int:
    """Bounces by which an orbit in a table is judged: as in the store, but enough for a caustic."""
    return max(study_of(tree).bounces or 0, FEWEST_BOUNCES)


def _draw_frequency(picked: xr.DataTree, request: Request) -> Axes:
    require_one_table(picked, "frequency figure", request)
    bounces = request.bounces or FREQUENCY_BOUNCES
    table = rebuild_table(picked, allow_code=request.allow_code)
    return draw_frequency(table, request.s, request.orbits, bounces, request.width)


def _notes(tree: xr.DataTree, kind: str, taken: str, request: Request) -> list[str]:
    study = study_of(tree)
    notes = [note for note in (study.family.replace("_", " "), describe(study.fixed), taken) if note]
    if request.average:
        notes.append(f"mean over {', '.join(request.average)}")
    if kind == "gaps":
        return notes
    if kind == "frequency":
        return [
            *notes,
            f"measured anew: {request.orbits} orbits at s/L = {request.s:g}",
            f"{GRID[0]} by {GRID[1]} over the section",
            f"{request.bounces or FREQUENCY_BOUNCES} bounces each",
        ]
    if kind == "table":
        return [
            *notes,
            f"{request.bounces or CHORDS} chords of each orbit",
            f"judged by {_judged(tree)} bounces",
        ]
    if study.orbits and study.bounces:
        notes.append(f"{study.orbits} orbits of {study.bounces} bounces a table")
    if request.bounces and kind == "portrait":
        notes.append(f"{request.bounces} bounces drawn")
    if kind == "fractions":
        notes.append("doubt: earlier less final, error, undecided")
    return notes


def _too_many(names: tuple[str, ...], most: int) -> str:
    return (
        f"{', '.join(names)} are too many dimensions for this figure, at most {most}: "
        "hold some with --select NAME=VALUE or average over them with --average NAME"
    )


def _too_few(names: tuple[str, ...], least: int, kind: str) -> str:
    found = ", ".join(names) or "a single table"
    return f"a figure of kind {kind} needs {least} dimensions and this is {found}: choose another --kind"
