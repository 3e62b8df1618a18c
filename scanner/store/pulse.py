"""What a running sweep says of itself to other terminals, beside what its receipts tell."""

from __future__ import annotations

import contextlib
import json
from dataclasses import asdict, dataclass
from pathlib import Path

from scanner.store.ledger import Ledger


@dataclass(frozen=True)
class Pulse:
    """State of a run that no receipt holds.

    Attributes
    ----------
    workers
        Workers that are there.
    handed_out
        Tasks given to them, being computed or next in line.
    losses
        What was lost and made good so far, in words; empty for nothing.
    """

    workers: int
    handed_out: int
    losses: str


def write_pulse(store: Path, pulse: Pulse) -> None:
    """Leave the state of a run for others, its latest alone; where that cannot be written, the run is worth more."""
    path = _path(store)
    partial = path.with_name(f".{path.name}.partial")
    with contextlib.suppress(OSError):
        partial.write_text(json.dumps(asdict(pulse)))
        partial.replace(path)


def read_pulse(store: Path) -> Pulse | None:
    """Read the latest state that a run left, None where there is none."""
    try:
        return Pulse(**json.loads(_path(store).read_bytes()))
    except (OSError, ValueError, TypeError):
        return None


def _path(store: Path) -> Path:
    return Ledger(store).folder / "pulse.json"
