"""The server of the atlas: bokeh's, on one address and port, with the downloads beside the page."""

from __future__ import annotations

import errno
import logging
import socket
from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from pathlib import Path

from bokeh.application import Application
from bokeh.application.handlers.function import FunctionHandler
from bokeh.document import Document
from bokeh.server.server import BaseServer
from bokeh.server.tornado import BokehTornado
from tornado.httpserver import HTTPServer
from tornado.ioloop import IOLoop

from scanner.atlas import LOOPBACK
from scanner.atlas.downloads import Download
from scanner.atlas.orbit import warm_up
from scanner.atlas.page import Page
from scanner.atlas.watch import Watch
from scanner.errors import ScannerError


def serve(path: Path, address: str, port: int, allow_code: bool, announce: Callable[[str], None]) -> None:
    """Serve the page until interrupted; parameters and errors as for ``serve_atlas``."""
    watch = Watch(path)
    listening = _bind(address, port)
    # a page that is closed in the middle of something is no news
    logging.getLogger("bokeh.server.views.ws").setLevel(logging.ERROR)
    port = listening.getsockname()[1]
    with ThreadPoolExecutor(1, "tracer") as tracer:
        tracer.submit(warm_up)

        def open_page(document: Document) -> None:
            Page(document, watch, read_arguments(document), allow_code, tracer)

        application = BokehTornado(
            {"/": Application(FunctionHandler(open_page))},
            extra_websocket_origins=[address, "localhost"] if address == LOOPBACK else ["*"],
            extra_patterns=[(r"/(slice|orbits)\.(csv|nc)", Download, {"watch": watch})],
            ico_path="none",
        )
        http = HTTPServer(application)
        http.add_sockets([listening])
        server = BaseServer(IOLoop.current(), application, http)
        with _until_interrupted(server):
            announce(f"http://{address}:{port}/")
            server.io_loop.start()


def read_arguments(document: Document) -> dict[str, str]:
    """Read the query of the link by which a page was opened; the first of repeated entries counts."""
    context = document.session_context
    arguments = context.request.arguments if context is not None and context.request is not None else {}
    return {name: values[0].decode("utf-8", "replace") for name, values in arguments.items()}


def _bind(address: str, port: int) -> socket.socket:
    try:
        listening = socket.create_server((address, port))
    except OSError as error:
        if error.errno == errno.EADDRINUSE:
            said = f"port {port} is in use: give another one with --port, 0 for any that is free"
        elif error.errno == errno.EACCES:
            said = f"port {port} is not for everybody: give one above 1023 with --port"
        else:
            said = f"cannot listen at {address} ({error.strerror}): give an address of this machine"
        raise ScannerError(said) from None
    listening.setblocking(False)
    return listening


@contextmanager
def _until_interrupted(server: BaseServer) -> Iterator[None]:
    server.start()
    try:
        yield
    except KeyboardInterrupt:
        pass  # the usual end of a server
    finally:
        server.stop()
