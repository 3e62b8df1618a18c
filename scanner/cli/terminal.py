"""How numbers and columns look to people."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

import click

if TYPE_CHECKING:
    import pandas as pd


STYLES: dict[str, dict[str, Any]] = {
    "heading": {"bold": True},
    "name": {"fg": "cyan"},
    "good": {"fg": "green"},
    "doubtful": {"fg": "yellow"},
    "bad": {"fg": "red", "bold": True},
}


def paint(text: str, style: str) -> str:
    """Give text a style for people; pipes get it without, as do terminals without colours and those who want none."""
    plain = os.environ.get("NO_COLOR") or os.environ.get("TERM") == "dumb"
    return text if plain or not style else click.style(text, **STYLES[style])


def align(texts: pd.DataFrame) -> list[str]:
    """Lines of columns aligned to the right, the first line being the headings."""
    return [" ".join(line) for line in _pad(texts)]


def print_columns(texts: pd.DataFrame, styles: Mapping[tuple[int, str], str], gap: int | None = None) -> None:
    """Print aligned columns in colour.

    Parameters
    ----------
    texts
        Columns of text under their headings.
    styles
        Names of styles of single cells, by row and heading.
    gap
        Row before which others have been left out.
    """
    headings, *lines = _pad(texts)
    click.echo(paint(" ".join(headings), "heading"))
    for row, line in enumerate(lines):
        if row == gap:
            click.echo("...")
        click.echo(" ".join(paint(cell, styles.get((row, name), "")) for name, cell in zip(texts, line, strict=True)))


def _pad(texts: pd.DataFrame) -> list[list[str]]:
    """Cells of each line, headings first, as wide as their columns."""
    columns = [[str(name), *map(str, texts[name])] for name in texts]
    widths = [max(map(len, column)) for column in columns]
    return [
        [cell.rjust(width) for cell, width in zip(line, widths, strict=True)] for line in zip(*columns, strict=True)
    ]


def on_terminal() -> bool:
    """Whether people look at standard output."""
    return sys.stdout.isatty()


@contextmanager
def progress_bar(label: str) -> Iterator[Callable[[int, int], None]]:
    """Give a function that shows how many steps of how many are done; silent where nobody looks at standard error."""
    if not sys.stderr.isatty():
        yield lambda done, total: None
        return
    with click.progressbar(length=1, label=label, file=sys.stderr) as bar:

        def show(done: int, total: int) -> None:
            bar.length = total
            bar.update(done - bar.pos)

        yield show


def size(count: float) -> str:
    """Write a count of bytes."""
    for unit in ("bytes", "kB", "MB", "GB"):
        if count < 1000:
            return f"{count:.0f} {unit}" if unit == "bytes" else f"{count:.3g} {unit}"
        count /= 1000
    return f"{count:,.3g} TB"


def duration(seconds: float) -> str:
    """Write a time in the two units that say it best."""
    seconds = round(seconds)
    minutes, hours, days = seconds // 60, seconds // 3600, seconds // 86400
    if days:
        return f"{days} d {hours % 24} h"
    if hours:
        return f"{hours} h {minutes % 60} min"
    return f"{minutes} min {seconds % 60} s" if minutes else f"{seconds} s"
