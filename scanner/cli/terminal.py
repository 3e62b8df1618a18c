"""How numbers and columns look to people."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING

import click

if TYPE_CHECKING:
    import pandas as pd


def align(texts: pd.DataFrame) -> list[str]:
    """Lines of columns aligned to the right, the first line being the headings."""
    lines: list[str] = texts.to_string(index=False).split("\n")
    return lines


def print_lines(lines: list[str]) -> None:
    """Print aligned columns, the headings bold on a terminal."""
    click.echo(click.style(lines[0], bold=True))
    click.echo("\n".join(lines[1:]))


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
