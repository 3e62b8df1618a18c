"""What the studies share: one-line errors, the tables of a store one by one, aligned columns."""

from __future__ import annotations

import argparse
import importlib.util
import sys
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import NoReturn

import numpy as np
import pandas as pd
import xarray as xr

from scanner import open_sweep
from scanner.analysis import check_target, pick_tables
from scanner.errors import ScannerError
from scanner.quantities import DONE, ORBITS


class OneLineParser(argparse.ArgumentParser):
    """Says in one line what is wrong with the arguments."""

    def error(self, message: str) -> NoReturn:
        """Leave with status 2."""
        self.exit(2, f"{self.prog}: {message}; see {self.prog} --help\n")


def answer(
    main: Callable[[Sequence[str] | None], None],
    arguments: Sequence[str] | None = None,
    *,
    example: Sequence[str] | None = None,
) -> None:
    """Run a study; an error meant for the user's eyes becomes one line on standard error and exit status 2.

    Parameters
    ----------
    main
        The study.
    arguments
        What to run it on, by default what stands on the command line.
    example
        What to run it on in a notebook, whose command line is that of the kernel.
    """
    if arguments is None and "ipykernel" in sys.modules:
        arguments = example
    try:
        main(arguments)
    except ScannerError as error:
        print(f"{Path(sys.argv[0]).name}: {error}", file=sys.stderr)
        sys.exit(error.exit_status)


def store_parser(documentation: str) -> OneLineParser:
    """Start the arguments of a study: the store, and the tables that are meant."""
    parser = OneLineParser(description=documentation.strip().splitlines()[0])
    parser.add_argument("store", type=Path, help="a store made by scanner sweep")
    parser.add_argument(
        "--select",
        action="append",
        default=[],
        metavar="NAME=VALUE",
        help="hold a swept parameter at the stored value nearest to this one; may be repeated",
    )
    return parser


def open_selected(store: Path, selections: Sequence[str]) -> xr.DataTree:
    """Open a store and hold the swept parameters that were selected."""
    wanted = {}
    for entry in selections:
        name, sign, value = (part.strip() for part in entry.partition("="))
        if not (name and sign and value):
            raise ScannerError(f"{entry!r} is not NAME=VALUE, for example --select amplitude=0.05")
        wanted[name] = value
    return pick_tables(open_sweep(store), wanted)[0]


@dataclass(frozen=True)
class DoneTable:
    """One table of a sweep that is done: its swept parameters, its numbers and its orbits."""

    parameters: dict[str, float]
    root: xr.Dataset
    orbits: xr.Dataset

    @property
    def replicates(self) -> int:
        """Number of independent replicates that its orbits are shared by."""
        return self.root.sizes["replicate"]

    @property
    def chords(self) -> np.ndarray:
        """Mean chord of each orbit, that of the whole section where it could not be followed."""
        found = self.orbits["mean_chord"].values
        return np.where(np.isfinite(found), found, self.root["mean_chord_exact"].item())


def done_tables(tree: xr.DataTree) -> Iterator[DoneTable]:
    """Go through the tables that are done, in the order of the grid."""
    root, orbits = tree.to_dataset(), tree[ORBITS].to_dataset()
    status = root["table_status"]
    for index in zip(*np.nonzero(np.atleast_1d(status.values == DONE)), strict=True):
        place = dict(zip(map(str, status.dims), map(int, index), strict=False))
        parameters = {name: root[name].values[position].item() for name, position in place.items()}
        yield DoneTable(parameters, root.isel(place).load(), orbits.isel(place).load())


def check_figure(target: Path) -> None:
    """Refuse a figure that cannot be drawn or written, before any work is done for it."""
    check_target(target, (".png", ".pdf", ".svg"))
    if importlib.util.find_spec("matplotlib") is None:
        raise ScannerError("figures need matplotlib, install it with: pip install 'scanner[figures]'")


def print_rows(rows: Sequence[dict[str, object]]) -> None:
    """Print aligned columns; a number that is not there is a dash.

    Raises
    ------
    ScannerError
        There is nothing to print.
    """
    if not rows:
        raise ScannerError("no table of this store is done: let scanner sweep finish some first")
    print(pd.DataFrame(rows).to_string(index=False, na_rep="-", float_format=lambda value: f"{value:.5g}"))
