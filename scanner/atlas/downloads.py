"""Files of what a view shows: the slice of the sweep, and the orbits of the selected table."""

from __future__ import annotations

import tempfile
from pathlib import Path

import xarray as xr
from tornado.escape import url_escape
from tornado.web import RequestHandler

from scanner.analysis import export_sweep, swept_parameters
from scanner.atlas.view import View, read_query
from scanner.atlas.watch import Watch
from scanner.errors import ScannerError
from scanner.quantities import ORBITS, ROOT


class Download(RequestHandler):
    """Answers ``slice.csv``, ``slice.nc``, ``orbits.csv`` and ``orbits.nc`` with the query of a view."""

    def initialize(self, watch: Watch) -> None:
        """Take what the pattern of the address was registered with."""
        self._watch = watch

    def get(self, part: str, suffix: str) -> None:
        """Send the file."""
        snapshot = self._watch.look()
        query = {name: self.get_query_argument(name) for name in self.request.query_arguments}
        view = read_query(query, snapshot.root)
        picked = pick_part(snapshot.tree, view, part)
        with tempfile.TemporaryDirectory() as folder:
            target = Path(folder) / f"{part}.{suffix}"
            try:
                export_sweep(picked, target, rows=ORBITS if part == ORBITS else ROOT)
            except ScannerError as error:
                self.send_error(500, reason=str(error))
                return
            content = target.read_bytes()
        name = f"{self._watch.path.stem}-{part}.{suffix}"
        self.set_header("Content-Type", "text/csv; charset=utf-8" if suffix == "csv" else "application/x-netcdf")
        self.set_header("Content-Disposition", f"attachment; filename*=UTF-8''{url_escape(name, plus=False)}")
        self.finish(content)


def pick_part(tree: xr.DataTree, view: View, part: str) -> xr.DataTree:
    """Take what a file is about: all numbers of the tables along the view's axes, or the one table with its orbits.

    Parameters that are held stay dimensions, of length one, so that rows say their values.
    """
    root = tree.to_dataset()
    axes = () if part == ORBITS else (view.across, view.up)
    held = {name: slice(view.at[name], view.at[name] + 1) for name in swept_parameters(root) if name not in axes}
    picked = tree.isel(held)
    if part == ORBITS:
        return picked
    return xr.DataTree.from_dict({"/": picked.to_dataset()}, name=tree.name)
