"""Figures for a paper, from a sweep; matplotlib is loaded when the first one is drawn."""

from __future__ import annotations

import importlib.util
from pathlib import Path
from typing import TYPE_CHECKING

from scanner.errors import ScannerError
from scanner.figures.request import SUFFIXES, Request

if TYPE_CHECKING:
    import xarray as xr

__all__ = ["Request", "require_matplotlib", "write_figure"]


def write_figure(tree: xr.DataTree, target: Path, request: Request | None = None, *, force: bool = False) -> str:
    """Draw a figure of a sweep and write it to a file, whole or not at all.

    Parameters
    ----------
    tree
        A sweep.
    target
        File to write, ``.png``, ``.pdf`` or ``.svg``.
    request
        What to draw; by default the kind that suits the number of swept parameters.
    force
        Replace a file that exists.

    Returns
    -------
    str
        The stored tables that were selected, in words; empty for all.

    Raises
    ------
    ScannerError
        The file cannot be written, matplotlib is not installed, or the sweep does not fit the request.
    """
    from scanner.analysis import check_target

    check_target(target, SUFFIXES, force=force)
    require_matplotlib()
    from scanner.figures.drawing import draw_figure, save_figure

    figure, taken = draw_figure(tree, request or Request())
    save_figure(figure, target)
    return taken


def require_matplotlib() -> None:
    """Refuse to draw where matplotlib is not installed."""
    if importlib.util.find_spec("matplotlib") is None:
        raise ScannerError("figures need matplotlib, install it with: pip install 'scanner[figures]'")
