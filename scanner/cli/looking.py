"""The command that serves a page to look at a store."""

from __future__ import annotations

from pathlib import Path

import click

from scanner.atlas import LOOPBACK, PORT, serve_atlas
from scanner.cli.options import allow_code_option, store_argument


@click.command(short_help="Look at a sweep in the browser.")
@store_argument
@click.option(
    "--port",
    type=click.IntRange(0, 65535),
    default=PORT,
    show_default=True,
    metavar="N",
    help="Port to listen on; 0 for any that is free.",
)
@click.option(
    "--address",
    default=LOOPBACK,
    show_default=True,
    metavar="HOST",
    help="Address to listen on; with another than the default, whoever reaches this machine can look.",
)
@click.option("--open", "open_browser", is_flag=True, help="Open the page in the browser of this desktop.")
@allow_code_option
def atlas(store: Path, port: int, address: str, open_browser: bool, allow_code: bool) -> None:
    """Serve a page on the sweep in PATH: the family, the portrait of each table, orbits traced on a click.

    The store is only read, and may still be being written. Ctrl-C ends it.
    """

    def announce(url: str) -> None:
        click.echo(f"{store} is at {url} (Ctrl-C ends this)")
        if open_browser:
            click.launch(url)

    serve_atlas(store, address=address, port=port, allow_code=allow_code, announce=announce)
