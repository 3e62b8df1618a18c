"""One client at a time on a store."""

from __future__ import annotations

import json
import os
import socket
import time
from dataclasses import asdict, dataclass
from pathlib import Path
from types import TracebackType

import psutil

from scanner.errors import StoreError
from scanner.store.ledger import Ledger

BEAT_SECONDS = 15.0
SILENCE_SECONDS = 120.0
SAME_MOMENT_SECONDS = 2.0
"""The start of the machine is known to a second."""


@dataclass(frozen=True)
class Holder:
    """The process that holds a store; ``born`` tells it from a later one with the same number.

    It is counted in seconds from the start of the machine, as the time of day may be set meanwhile.
    """

    host: str
    pid: int
    born: float

    @classmethod
    def here(cls) -> Holder:
        """Describe this process."""
        return cls(socket.gethostname(), os.getpid(), born_at(os.getpid()))


NOBODY = Holder("an unknown host", 0, 0.0)


class StoreLock:
    """Hold a store while workers write to it.

    The holder shows a sign of life from time to time.  On its own host a holder is judged by whether its process
    exists, from other hosts by how long it has been silent, so that a job killed with its node never blocks for long.
    """

    def __init__(self, store: Path) -> None:
        self.store = store
        self._path = Ledger(store).folder / "lock"
        self._own = Holder.here()
        self._last_beat = 0.0
        self._now: float | None = None

    def __enter__(self) -> StoreLock:
        """Take the store.

        Raises
        ------
        StoreError
            Another process is running on it.
        """
        while not self._take():
            holder, silent = self._look()
            if holder is None:
                continue
            if lives(holder, silent):
                raise StoreError(
                    f"{self.store}: in use by process {holder.pid} on {holder.host}, which gave a sign of life "
                    f"{silent:.0f} s ago; wait for it or stop it (silence of {SILENCE_SECONDS:.0f} s frees the store)"
                )
            self._evict(holder)
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Leave the store, unless it was taken over meanwhile."""
        if self._look()[0] == self._own:
            self._path.unlink()

    def beat(self) -> bool:
        """Show a sign of life; cheap enough to be called at every turn of a loop.

        Returns
        -------
        bool
            Whether it was time for one.

        Raises
        ------
        StoreError
            The store was taken over, because this process had been silent (asleep, say) for long.
        """
        if time.monotonic() - self._last_beat < BEAT_SECONDS:
            return False
        holder = self._look()[0]
        if holder != self._own:
            raise StoreError(f"{self.store}: taken over by {holder or 'someone'} while this process was not responding")
        os.utime(self._path)
        self._last_beat = time.monotonic()
        return True

    def _take(self) -> bool:
        """Put the lock in place whole, or find that there is one."""
        offer = self._path.with_name(f".lock.{self._own.host}.{self._own.pid}")
        try:
            offer.write_text(json.dumps(asdict(self._own)))
            self._now = offer.stat().st_mtime
        except OSError as error:
            raise StoreError(
                f"{self.store}: cannot be written ({error.strerror}); mend that and run the same again"
            ) from None
        try:
            os.link(offer, self._path)
        except FileExistsError:
            return False
        finally:
            offer.unlink()
        self._last_beat = time.monotonic()
        return True

    def _look(self) -> tuple[Holder | None, float]:
        return look(self.store, self._now)

    def _evict(self, dead: Holder) -> None:
        """Remove the lock of a dead holder; if another was quicker and took the store meanwhile, give it back."""
        aside = self._path.with_name(f".evicted.{self._own.host}.{self._own.pid}")
        try:
            self._path.rename(aside)
        except FileNotFoundError:
            return
        if _read(aside) != dead:
            os.link(aside, self._path)
        aside.unlink()


def look(store: Path, now: float | None = None) -> tuple[Holder | None, float]:
    """Who holds a store, if anyone, and for how many seconds it has been silent.

    ``now`` is the time by the clock of the disk, which may be that of another host; by default that of this one.
    """
    path = Ledger(store).folder / "lock"
    try:
        return _read(path), max(0.0, (time.time() if now is None else now) - path.stat().st_mtime)
    except FileNotFoundError:
        return None, 0.0


def _read(path: Path) -> Holder:
    """Read who put a lock; one that a power cut left empty is nobody's, and falls free by its silence."""
    try:
        return Holder(**json.loads(path.read_text()))
    except (ValueError, TypeError):
        return NOBODY


def is_running(store: Path) -> bool:
    """Whether a living process holds the store."""
    holder, silent = look(store)
    return holder is not None and lives(holder, silent)


def lives(holder: Holder, silent: float) -> bool:
    """Whether a holder is still there: its process on this host, on another one by its signs of life."""
    if holder.host != socket.gethostname():
        return silent < SILENCE_SECONDS
    try:
        return abs(born_at(holder.pid) - holder.born) < SAME_MOMENT_SECONDS
    except psutil.NoSuchProcess:
        return False


def born_at(pid: int) -> float:
    """Seconds from the start of the machine to that of a process, however the clock has been set since."""
    started: float = psutil.boot_time()
    return float(psutil.Process(pid).create_time()) - started
