"""What people are shown of tables: parameter values in a line, and cards for notebooks, a drawing beside numbers."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from html import escape
from typing import NamedTuple

SIDE = 200.0
"""Pixels of the longer side of a drawing."""
MARGIN = 4.0


class Line(NamedTuple):
    """A closed line of a drawing; dashed where it is no table to be swept, faint where it is one among others."""

    x: list[float]
    y: list[float]
    dashed: bool
    faint: bool


def draw(lines: list[Line]) -> str:
    """SVG of closed lines on one scale, in the colour of the text around it; empty if there are none."""
    if not lines:
        return ""
    left, right = min(min(line.x) for line in lines), max(max(line.x) for line in lines)
    low, high = min(min(line.y) for line in lines), max(max(line.y) for line in lines)
    scale = SIDE / max(right - left, high - low)
    width, height = (scale * extent + 2.0 * MARGIN for extent in (right - left, high - low))

    def path(line: Line) -> str:
        places = zip(line.x, line.y, strict=True)
        steps = (f"{MARGIN + scale * (x - left):.2f},{MARGIN + scale * (high - y):.2f}" for x, y in places)
        dashes = ' stroke-dasharray="6 4"' if line.dashed else ""
        return f'<path d="M{" L".join(steps)} Z" opacity="{0.45 if line.faint else 1}"{dashes}/>'

    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" role="img" width="{width:.0f}" height="{height:.0f}" '
        f'viewBox="0 0 {width:.2f} {height:.2f}" fill="none" stroke="currentColor" stroke-width="1.5">'
        f"<title>outline</title>{''.join(map(path, lines))}</svg>"
    )


def lay_card(heading: str, facts: Mapping[str, str], picture: str) -> str:
    """Lay a heading, facts and a drawing beside each other; texts are escaped, the drawing is not."""
    rows = "".join(_row(name, text) for name, text in facts.items())
    return (
        '<div style="display: flex; flex-wrap: wrap; gap: 1.5em; align-items: center">'
        f"{picture}<div><strong>{escape(heading)}</strong><table><tbody>{rows}</tbody></table></div></div>"
    )


def _row(name: str, text: str) -> str:
    cells: Iterable[tuple[str, str]] = (("th", name), ("td", text))
    return (
        "<tr>"
        + "".join(f'<{tag} style="text-align: left; padding-right: 1em">{escape(cell)}</{tag}>' for tag, cell in cells)
        + "</tr>"
    )


def describe(parameters: Mapping[str, float | str]) -> str:
    """Write parameter values as people do: ``amplitude = 0.05, harmonic = 2``."""
    return ", ".join(
        f"{name} = {value:.6g}" if isinstance(value, float) else f"{name} = {value}"
        for name, value in parameters.items()
    )
