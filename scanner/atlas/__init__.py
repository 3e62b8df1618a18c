"""The atlas: a page on which a sweep is looked at, table by table and orbit by orbit; bokeh is loaded when it opens."""

from __future__ import annotations

import importlib.util
from collections.abc import Callable
from pathlib import Path

from scanner.errors import ScannerError

__all__ = ["serve_atlas"]

LOOPBACK = "127.0.0.1"
PORT = 8640


def serve_atlas(
    path: Path,
    *,
    address: str = LOOPBACK,
    port: int = PORT,
    allow_code: bool = False,
    announce: Callable[[str], None] = print,
) -> None:
    """Serve the page of a store, finished or still being written, until interrupted; the store is only read.

    Parameters
    ----------
    path
        The store.
    address, port
        Where to listen; port 0 takes any that is free.
    allow_code
        Whether a family ``module:function`` may run, for its outline and for new orbits.
    announce
        Called with the address of the page once it is being served.

    Raises
    ------
    ScannerError
        There is no such store, bokeh is not installed, or the address or port cannot be had.
    """
    if importlib.util.find_spec("bokeh") is None:
        raise ScannerError("the atlas needs bokeh, install it with: pip install 'scanner[atlas]'")
    from scanner.atlas.server import serve

    serve(path, address, port, allow_code, announce)
