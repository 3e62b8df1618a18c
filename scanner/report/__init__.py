"""One page about a sweep, for a group meeting or a supplement: a file that needs nothing beside it."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import xarray as xr

    from scanner.store.progress import SweepProgress

__all__ = ["SUFFIXES", "write_report"]

SUFFIXES = (".html", ".htm")
MOST_ROWS = 400


def write_report(
    tree: xr.DataTree,
    progress: SweepProgress,
    target: Path,
    *,
    select: Mapping[str, float | str] | None = None,
    average: tuple[str, ...] = (),
    rows: int = MOST_ROWS,
    allow_code: bool = False,
    force: bool = False,
) -> str:
    """Write a report of a sweep as one HTML file, whole or not at all.

    Parameters
    ----------
    tree
        A sweep, finished or not.
    progress
        How far it is, and why tables failed.
    target
        File to write, ``.html``.
    select
        Values at which to hold swept parameters, the nearest stored one is taken.
    average
        Swept parameters to average over.
    rows
        Most rows of the table of numbers, the first and the last ones; 0 for all.
    allow_code
        Whether the user's own function may run, for the figures that follow orbits anew.
    force
        Replace a file that exists.

    Returns
    -------
    str
        The stored tables that were selected, in words; empty for all.

    Raises
    ------
    ScannerError
        The file cannot be written, matplotlib is not installed, or a parameter is not swept.
    """
    from scanner.analysis import check_target, replace_whole
    from scanner.figures import require_matplotlib

    check_target(target, SUFFIXES, force=force)
    require_matplotlib()
    from scanner.report.page import make_page

    page, taken = make_page(tree, progress, select or {}, average, rows=rows, allow_code=allow_code)
    with replace_whole(target) as partial:
        partial.write_text(page, encoding="utf-8")
    return taken
