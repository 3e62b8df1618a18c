"""The log file beside a store."""

from __future__ import annotations

import logging
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from logging.handlers import MemoryHandler
from pathlib import Path

from scanner.errors import ScannerError


class LogFile(logging.FileHandler):
    """A file whose disk may be full: what cannot be written is left out, and stops nothing."""

    def handleError(self, record: logging.LogRecord) -> None:
        """Leave it out."""

    def close(self) -> None:
        """Give up what is still to be written if it cannot be."""
        with suppress(OSError):
            super().close()


def beside(store: Path, suffix: str) -> Path:
    """Name a file or folder beside a store like the store, without its .zarr."""
    return store.with_name(store.name.removesuffix(".zarr") + suffix)


@contextmanager
def log_beside(store: Path) -> Iterator[None]:
    """Write all that this package logs, and the warnings of the task queue, to a file beside the store."""
    to_file = LogFile(beside(store, ".log"))
    to_file.setFormatter(logging.Formatter("%(asctime)s %(levelname)s %(message)s"))
    # Passed on, as a local cluster silences every handler of its own loggers that writes to a stream.
    passed_on = MemoryHandler(1, target=to_file)
    package = logging.getLogger("scanner")
    level = package.level
    on_screen = {logger: logger.handlers[:] for logger in _task_queue_loggers()}
    package.addHandler(to_file)
    package.setLevel(logging.INFO)
    for logger in on_screen:
        logger.handlers[:] = [passed_on]
    try:
        yield
    except ScannerError as error:
        package.error("%s", error)
        raise
    finally:
        for logger, handlers in on_screen.items():
            logger.handlers[:] = handlers
        package.setLevel(level)
        package.removeHandler(to_file)
        to_file.close()


def _task_queue_loggers() -> list[logging.Logger]:
    """Loggers of the task queue that write on their own."""
    known = logging.root.manager.loggerDict.items()
    return [
        logger
        for name, logger in known
        if name.partition(".")[0] == "distributed" and isinstance(logger, logging.Logger) and logger.handlers
    ]
