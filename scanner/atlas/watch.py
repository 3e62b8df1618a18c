"""A store as the atlas sees it: opened to be read, and opened anew now and then while somebody writes it."""

from __future__ import annotations

import time
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

import xarray as xr

from scanner.analysis import study_of
from scanner.analysis.sweep import StudyFacts
from scanner.store import SweepProgress, open_sweep, sweep_progress

REFRESH_SECONDS = 2.0
SHARE_OF_TIME = 0.05
"""Of the server's time, what looking at a store that is being written may take."""


@dataclass(frozen=True)
class Snapshot:
    """A sweep as it was at one moment; values are read when they are used."""

    tree: xr.DataTree
    progress: SweepProgress
    taken: float
    folder: int

    @cached_property
    def root(self) -> xr.Dataset:
        """Root variables, one value a table."""
        return self.tree.to_dataset()

    @cached_property
    def study(self) -> StudyFacts:
        """What the sweep is about."""
        return study_of(self.tree)


class Watch:
    """The newest snapshot of one store, shared by all pages.

    Raises
    ------
    StoreError
        There is no such store.
    """

    def __init__(self, path: Path) -> None:
        self.path = path
        self.snapshot = self._take(sweep_progress(path))
        self._next_look = time.monotonic() + REFRESH_SECONDS

    def look(self) -> Snapshot:
        """Return the newest snapshot: a new one where tasks were finished, or work began or ended, since the last."""
        started = time.monotonic()
        if started > self._next_look:
            state, last = sweep_progress(self.path), self.snapshot.progress
            folder = self.path.stat().st_ino  # another one where the store was compacted
            if (state.finished, state.running, folder) != (last.finished, last.running, self.snapshot.folder):
                self.snapshot = self._take(state)
            spent = time.monotonic() - started
            self._next_look = started + max(REFRESH_SECONDS, spent / SHARE_OF_TIME)
        return self.snapshot

    def _take(self, state: SweepProgress) -> Snapshot:
        snapshot = Snapshot(open_sweep(self.path), state, time.time(), self.path.stat().st_ino)
        snapshot.root["table_status"].load()
        return snapshot
